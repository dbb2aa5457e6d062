"""Rule files to records: the layout of clauses by indentation, then each item through :mod:`carboy.text.rule_grammar`.

The comments of a file are blanked out and an item that goes over several lines is read as one line of the same length,
so that a place in the item is a place in the file.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field
from typing import NoReturn, TypeVar, cast, get_args

import msgspec

from carboy.errors import RuleError
from carboy.model.rule import Condition, Example, Flag, Place, Reaction, Rule, Speed
from carboy.span import Span
from carboy.text.rule_grammar import COVERS, MOMENTS, closest, parse_condition, parse_flag, parse_reaction

SPEEDS: tuple[str, ...] = get_args(Speed)
_SINGLE = ("title", "speed", "says", "moment", "off")  # once in a rule; deeper lines continue the text
_ONE_LINE = ("title", "speed", "moment")
_LISTS = (
    "needs",
    "does",
    "flags",
    "guard",
    "cites",
    "fires",
    "silent",
)  # each line at the depth of the item is one more item
CLAUSES = (*_SINGLE, *_LISTS)

Record = TypeVar("Record")

_IDENTIFIER = re.compile(r"[a-z0-9]+(?:-[a-z0-9]+)*")
_WAIT = re.compile(r"wait\s+(\d+(?:\.\d+)?\s*(?:s|min|h|d))")
_TEMPERATURE = re.compile(r"-?\d+(?:\.\d+)?\s*(?:degC|K)")
_VOLUME = re.compile(r"\d+(?:\.\d+)?\s*(?:mL|L)")
_VESSEL = re.compile(rf"([A-Za-z][\w-]*(?:\s+[A-Za-z][\w-]*)*?)(?:\s+({_VOLUME.pattern}))?")


@dataclass(slots=True)
class _Item:
    """Characters ``start`` to ``end`` of the blanked text; ``column`` (from 0) is where its first line begins."""

    start: int
    end: int
    column: int


@dataclass(slots=True)
class _Clause:
    word: str
    start: int
    column: int
    items: list[_Item] = field(default_factory=list)


@dataclass(slots=True)
class _Block:
    """One rule: its header and clauses."""

    start: int
    column: int
    header: _Item
    clauses: list[_Clause] = field(default_factory=list)


class _Source:
    """The text of one file, with its comments blanked, and places in it."""

    def __init__(self, text: str, file: str) -> None:
        self.text = text
        self.file = file
        # '#' begins a comment only at the start of a line or after a space: a triple bond of a SMILES stays
        self.blank = re.sub(r"(?m)(?:^|(?<=[ \t]))#.*$", lambda found: " " * len(found[0]), text)

    def fail(
        self, message: str, start: int, end: int, suggestions: Sequence[str] = (), other: Span | None = None
    ) -> NoReturn:
        raise RuleError(message, span=self.span(start, end), suggestions=tuple(suggestions), other=other)

    def span(self, start: int, end: int) -> Span:
        return Span(self.text, start, end, self.file)

    def place(self, start: int) -> Place:
        span = self.span(start, start + 1)
        return Place(self.file, span.line, span.column)

    def line_of(self, item: _Item) -> str:
        """The item as one line of the same length."""
        return self.blank[item.start : item.end].replace("\n", " ").replace("\r", " ")

    def words_of(self, item: _Item) -> str:
        return " ".join(self.line_of(item).split())


def read_rules(text: str, file: str = "") -> tuple[Rule, ...]:
    """The rules of one text, in order. ``file`` is the name shown in places. Raises RuleError."""
    source = _Source(text, file)
    rules: dict[str, Rule] = {}
    for block in _blocks(source):
        rule = _rule(source, block)
        if rule.id in rules:
            first = rules[rule.id].place
            message = f"there are two rules '{rule.id}'" + (f", the first on line {first.line}" if first else "")
            source.fail(message, block.header.start, block.header.end, other=_span_of(rules[rule.id], source))
        rules[rule.id] = rule
    return tuple(rules.values())


def read_rule_files(files: Iterable[tuple[str, bytes]]) -> tuple[Rule, ...]:
    """The rules of several files, given as (name to show, content); ids are unique over all. Raises RuleError."""
    rules: dict[str, Rule] = {}
    for name, content in files:
        try:
            text = content.decode("utf-8").removeprefix("\ufeff")
        except UnicodeDecodeError as error:
            raise RuleError(f"{name} is not a UTF-8 text (byte {error.start})") from None
        for rule in read_rules(text.replace("\r\n", "\n"), name):
            if rule.id in rules:
                places = [f"{one.file}:{one.line}:{one.column}" for one in (rules[rule.id].place, rule.place) if one]
                raise RuleError(f"{places[1]}: there are two rules '{rule.id}'; the other is at {places[0]}")
            rules[rule.id] = rule
    return tuple(rules.values())


def _span_of(rule: Rule, source: _Source) -> Span | None:
    if rule.place is None:
        return None
    lines = source.text.split("\n")
    start = sum(len(line) + 1 for line in lines[: rule.place.line - 1]) + rule.place.column - 1
    return source.span(start, start + len("rule ") + len(rule.id))


def _blocks(source: _Source) -> list[_Block]:
    """Headers, clauses and items by indentation."""
    blocks: list[_Block] = []
    offset = 0
    for line in source.blank.split("\n"):
        start, offset = offset, offset + len(line) + 1
        body = line.strip()
        if not body:
            continue
        column = len(line) - len(line.lstrip())
        begin, end = start + column, start + len(line.rstrip())
        if "\t" in line:
            source.fail(
                "a tab stands here; rules are laid out with spaces",
                start + line.index("\t"),
                start + line.index("\t") + 1,
            )
        block = blocks[-1] if blocks else None
        if block is None or column <= block.column:
            blocks.append(_header(source, begin, end, column))
        elif not block.clauses or column <= block.clauses[-1].column:
            if block.clauses and column != block.clauses[0].column:
                source.fail(
                    "this line is at no depth that the rule uses; clauses of a rule begin in one column", begin, end
                )
            block.clauses.append(_clause(source, begin, end, column))
        else:
            _continue(source, block.clauses[-1], begin, end, column)
    return blocks


def _header(source: _Source, begin: int, end: int, column: int) -> _Block:
    word, _, identifier = source.blank[begin:end].partition(" ")
    if word != "rule":
        message = f"a rule begins with 'rule' and its id, but '{word}' stands there"
        if word in CLAUSES:
            message = f"the clause '{word}' belongs to a rule and is indented further than it"
        source.fail(message, begin, begin + len(word), closest(word, ("rule",)))
    identifier = identifier.strip()
    start = end - len(identifier)
    if not identifier:
        source.fail("the rule has no id", begin, end)
    if not _IDENTIFIER.fullmatch(identifier):
        likely = re.sub(r"[^a-z0-9]+", "-", identifier.lower()).strip("-")
        message = f"'{identifier}' is no id; an id is lower-case words joined by hyphens"
        source.fail(message, start, end, (likely,) if likely else ())
    return _Block(begin, column, _Item(start, end, column))


def _clause(source: _Source, begin: int, end: int, column: int) -> _Clause:
    word = source.blank[begin:end].split(maxsplit=1)[0]
    if word not in CLAUSES:
        source.fail(f"no clause begins with '{word}'", begin, begin + len(word), closest(word, CLAUSES))
    clause = _Clause(word, begin, column)
    rest = source.blank[begin + len(word) : end]
    if rest.strip():
        start = end - len(rest.lstrip())
        clause.items.append(_Item(start, end, column + start - begin))
    return clause


def _continue(source: _Source, clause: _Clause, begin: int, end: int, column: int) -> None:
    """One more line of a clause: it continues the last item if it is deeper than it or the clause is one text."""
    last = clause.items[-1] if clause.items else None
    word = source.blank[begin:end].split(maxsplit=1)[0]
    if word in CLAUSES and (last is None or column < last.column):
        source.fail(
            f"the clause '{word}' begins in column {clause.column + 1}, like '{clause.word}' above it",
            begin,
            begin + len(word),
        )
    if last is not None and clause.word in _ONE_LINE:
        source.fail(f"'{clause.word}' is one line", begin, end)
    if last is not None and (clause.word in _SINGLE or column > last.column):
        last.end = end
    else:
        clause.items.append(_Item(begin, end, column))


def _rule(source: _Source, block: _Block) -> Rule:
    items: dict[str, list[_Item]] = {word: [] for word in CLAUSES}
    for clause in block.clauses:
        end = clause.start + len(clause.word)
        if not clause.items:
            source.fail(f"the clause '{clause.word}' is empty", clause.start, end)
        if clause.word in _SINGLE and items[clause.word]:
            source.fail(f"a rule has one '{clause.word}'", clause.start, end)
        items[clause.word] += clause.items
    text = {word: source.words_of(items[word][0]) if items[word] else "" for word in _SINGLE}
    for word, choices in (("speed", SPEEDS), ("moment", MOMENTS)):
        if items[word] and text[word] not in choices:
            item = items[word][0]
            message = f"'{text[word]}' is no {word}; it is one of {', '.join(choices)}"
            source.fail(message, item.start, item.end, closest(text[word], choices))
    return Rule(
        id=source.line_of(block.header),
        title=text["title"],
        needs=tuple(_condition(source, item) for item in items["needs"]),
        does=tuple(_reaction(source, item) for item in items["does"]),
        speed=cast(Speed, text["speed"] or "at once"),
        flags=tuple(_flag(source, item) for item in items["flags"]),
        says=text["says"],
        guard=tuple(source.words_of(item) for item in items["guard"]),
        cites=tuple(key for item in items["cites"] for key in _keys(source, item)),
        fires=tuple(_example(source, item) for item in items["fires"]),
        silent=tuple(_example(source, item) for item in items["silent"]),
        moment=text["moment"],  # type: ignore[arg-type]  # one of MOMENTS, tested above
        off=text["off"],
        place=source.place(block.start),
    )


def _keys(source: _Source, item: _Item) -> list[str]:
    keys = [key for key in re.split(r"[\s,]+", source.words_of(item)) if key]
    for key in keys:
        if not _IDENTIFIER.fullmatch(key.lower()):
            start = source.blank.index(key, item.start)
            source.fail(f"'{key}' is no key of a source; keys are words joined by hyphens", start, start + len(key))
    return keys


def _moved(source: _Source, item: _Item, place: Place | None) -> Place | None:
    """A place in the item's line as a place in the file."""
    return None if place is None else source.place(item.start + place.column - 1)


def _moved_conditions(source: _Source, item: _Item, conditions: Iterable[Condition]) -> tuple[Condition, ...]:
    return tuple(msgspec.structs.replace(one, place=_moved(source, item, one.place)) for one in conditions)


def _parsed(source: _Source, item: _Item, parse: Callable[[str], Record]) -> Record:
    """The item through the grammar; an error is moved to its place in the file."""
    try:
        return parse(source.line_of(item))
    except RuleError as error:
        span = error.span
        start, end = (item.start + span.start, item.start + span.end) if span else (item.start, item.end)
        source.fail(error.message, start, end, error.suggestions)


def _condition(source: _Source, item: _Item) -> Condition:
    return _moved_conditions(source, item, [_parsed(source, item, parse_condition)])[0]


def _reaction(source: _Source, item: _Item) -> Reaction:
    reaction = _parsed(source, item, parse_reaction)
    when = _moved_conditions(source, item, reaction.when)
    return msgspec.structs.replace(reaction, when=when, place=_moved(source, item, reaction.place))


def _flag(source: _Source, item: _Item) -> Flag:
    flag = _parsed(source, item, parse_flag)
    when = _moved_conditions(source, item, flag.when)
    return msgspec.structs.replace(flag, when=when, place=_moved(source, item, flag.place))


def _example(source: _Source, item: _Item) -> Example:
    """``portion + portion | setting -> expectation, known miss: reason``; what follows the portions may be left out."""
    line = source.line_of(item)
    body, reason = line, ""
    if found := re.search(r",\s*known\s+miss\s*:", line):
        body, reason = line[: found.start()], " ".join(line[found.end() :].split())
        if not reason:
            source.fail("a known miss has a reason", item.start + found.start() + 1, item.start + found.end())
    setting: dict[str, str] = {}
    expect = ""
    # the parts behind the portions: '|' begins a setting, '->' an expectation
    marks = list(re.finditer(r"(?:(?<=\s)|^)(\||->)(?=\s|$)", body))
    bounds = [*(one.start() for one in marks), len(body)]
    for mark, end in zip(marks, bounds[1:], strict=True):
        start = mark.end()
        words = " ".join(body[start:end].split())
        where = (item.start + mark.start(), item.start + mark.end())
        if not words:
            source.fail(f"nothing stands behind '{mark[1]}'", *where)
        if mark[1] == "|":
            if setting:
                source.fail("an example has one setting", *where)
            setting = _setting(source, item.start + start, body[start:end])
        else:
            if expect:
                source.fail("an example has one expectation", *where)
            if " " in words:
                source.fail("an expectation is one species or one kind of hazard", *where)
            expect = words
    portions = _portions(source, item.start, body[: bounds[0]])
    return Example(source.words_of(item), portions, setting, expect, reason, source.place(item.start))


def _portions(source: _Source, offset: int, text: str) -> tuple[str, ...]:
    """The portions of an example: split at ' + ' outside parentheses."""
    portions: list[str] = []
    depth = begin = 0
    stops = [*re.finditer(r"[()]|(?<=\s)\+(?=\s)|^\+(?=\s)", text)]
    for stop in stops:
        depth += {"(": 1, ")": -1}.get(stop[0], 0)
        if stop[0] == "+" and depth == 0:
            portions.append(text[begin : stop.start()])
            begin = stop.end()
        if depth < 0:
            break
    portions.append(text[begin:])
    if depth:
        source.fail("a parenthesis of this example has no partner", offset, offset + len(text.rstrip()))
    cleaned = tuple(" ".join(portion.split()) for portion in portions)
    if not all(cleaned):
        message = "a portion is missing in this example; to continue the line above, indent this one further"
        source.fail(message, offset, offset + max(1, len(text.rstrip())))
    return cleaned


def _slip(words: str) -> bool:
    """Whether a word is a cover with a slip of the pen rather than a material."""
    return bool(closest(words, COVERS, least=85))


def _setting(source: _Source, offset: int, text: str) -> dict[str, str]:
    """``sealed, glass 1 L, wait 24 h, 60 degC`` as the keys cover, container, volume, wait, temperature."""
    setting: dict[str, str] = {}
    for found in re.finditer(r"[^,]+", text):
        words = " ".join(found[0].split())
        start = offset + found.start() + len(found[0]) - len(found[0].lstrip())
        end = start + len(found[0].strip())
        given: dict[str, str] = {}
        if words in COVERS:
            given = {"cover": words}
        elif wait := _WAIT.fullmatch(words):
            given = {"wait": wait[1]}
        elif _TEMPERATURE.fullmatch(words):
            given = {"temperature": words}
        elif _VOLUME.fullmatch(words):
            given = {"volume": words}
        elif not words.startswith("wait") and not _slip(words) and (vessel := _VESSEL.fullmatch(words)):
            given = {"container": vessel[1]} | ({"volume": vessel[2]} if vessel[2] else {})
        else:
            message = (
                f"'{words}' is no setting; write it as 'sealed', 'glass 1 L', 'wait 24 h' (s, min, h, d) or '60 degC'"
            )
            source.fail(message, start, end, closest(words, COVERS))
        for key, value in given.items():
            if key in setting:
                source.fail(f"the {key} is given twice", start, end)
            setting[key] = value
    return setting
