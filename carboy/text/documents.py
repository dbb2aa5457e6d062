"""A YAML text, or plain Python data, as a tree in which every text knows its place.

Only what a case file needs is read: mappings, lists and text. The tree is built from the parser's events, so that no
tag is ever acted upon, and a file with tags, anchors, aliases, several documents, or too many or too deep entries is
refused.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import Any, Literal, NoReturn

from msgspec import Struct

from carboy.errors import InputError
from carboy.span import Span
from carboy.text.passages import Passage, closest

MOST_CHARACTERS = 1_000_000
MOST_ENTRIES = 50_000
DEEPEST = 12


class Node(Struct, frozen=True):
    """A place of the tree: a text, nothing (``null``), a list of nodes, or a mapping of named nodes in their order."""

    kind: Literal["text", "null", "list", "mapping"]
    passage: Passage  # of a text; for the others a piece of the file to point at
    items: tuple[Node, ...] = ()
    pairs: tuple[tuple[Passage, Node], ...] = ()

    @property
    def text(self) -> str:
        """The text, without white space around it."""
        return self.passage.text.strip() if self.kind == "text" else ""

    @property
    def span(self) -> Span:
        """What to point at."""
        return self.passage.span(0, len(self.passage.text))

    def fail(self, message: str, suggestions: Sequence[str] = (), other: Span | None = None) -> NoReturn:
        """Raise the InputError for this node."""
        raise InputError(message, span=self.span, suggestions=tuple(suggestions), other=other)

    def named(self, what: str, keys: Sequence[str] | None = None) -> dict[str, tuple[Passage, Node]]:
        """The entries of a mapping by name. ``keys`` are the ones allowed.

        Raises InputError for another kind of node or an unknown key.
        """
        if self.kind != "mapping":
            self.fail(f"{what} must be a mapping (lines of 'name: value'), not {_KINDS[self.kind]}")
        found: dict[str, tuple[Passage, Node]] = {}
        for key, value in self.pairs:
            name = key.text.strip()
            span = key.span(0, len(key.text))
            if not name:
                raise InputError(f"a name is missing in {what}", span=span)
            if keys is not None and name not in keys:
                message = f"{what} has no entry '{name}'; it can have {', '.join(keys)}"
                raise InputError(message, span=span, suggestions=closest(name, keys, 2))
            if name in found:
                other = found[name][0]
                raise InputError(f"'{name}' stands twice in {what}", span=span, other=other.span(0, len(other.text)))
            found[name] = (key, value)
        return found

    def listed(self, what: str) -> tuple[Node, ...]:
        """The entries of a list. Raises InputError for another kind of node."""
        if self.kind != "list":
            self.fail(f"{what} must be a list (lines that begin with '- '), not {_KINDS[self.kind]}")
        return self.items

    def worded(self, what: str) -> Passage:
        """The text of the node as a passage. Raises InputError for another kind of node or an empty text."""
        if self.kind != "text" or not self.text:
            self.fail(f"{what} must be a text, not {_KINDS[self.kind] if self.kind != 'text' else 'an empty one'}")
        return self.passage


_KINDS = {"text": "a text", "null": "nothing", "list": "a list", "mapping": "a mapping"}
_NULLS = ("", "~", "null", "Null", "NULL")


def read_yaml(text: str, file: str = "") -> Node:
    """The tree of a YAML text. Raises InputError with the place."""
    from ruamel.yaml import YAML
    from ruamel.yaml.error import YAMLError

    text = text.removeprefix("\ufeff")
    if len(text) > MOST_CHARACTERS:
        raise InputError(
            f"the file is longer than {MOST_CHARACTERS} characters, which no case needs", span=Span(text, 0, 1, file)
        )
    try:
        events = YAML(typ="safe", pure=True).parse(text)
        return _Builder(text, file, iter(events)).document()
    except YAMLError as error:
        mark = getattr(error, "problem_mark", None) or getattr(error, "context_mark", None)
        index = min(mark.index if mark is not None else getattr(error, "position", 0) or 0, max(0, len(text) - 1))
        problem = str(
            getattr(error, "problem", None) or getattr(error, "reason", None) or "a character that YAML does not allow"
        )
        if "mapping values" in problem:
            problem = "a ': ' within a text; put the text in quotes"
        raise InputError(f"this is not YAML: {problem}", span=Span(text, index, index + 1, file)) from None
    except InputError:
        raise
    except (
        ValueError,
        IndexError,
        KeyError,
        TypeError,
        AttributeError,
        AssertionError,
        OverflowError,
        NotImplementedError,
    ) as error:
        # the parser itself trips over some malformed escapes and directives
        raise InputError(
            f"this is not YAML that can be read ({type(error).__name__})", span=Span(text, 0, 1, file)
        ) from None


def from_data(data: Any, file: str = "") -> Node:
    """The tree of dicts, lists, texts and numbers.

    ``file`` names the whole in errors; a place is then ``case.steps[2].add``.
    """
    return _of_data(data, file or "case", 0)


def _of_data(data: Any, path: str, depth: int) -> Node:
    if depth > DEEPEST:
        raise InputError(f"{path}: the data is nested too deeply")
    if data is None:
        return Node("null", Passage("", path))
    if isinstance(data, bool):
        return Node("text", Passage("true" if data else "false", path))
    if isinstance(data, (str, int, float)):
        return Node("text", Passage(str(data), path))
    if isinstance(data, Mapping):
        pairs = []
        for key, value in data.items():
            if not isinstance(key, str):
                raise InputError(f"{path}: a name must be a text, not {key!r}")
            pairs.append((Passage(key, path), _of_data(value, f"{path}.{key}", depth + 1)))
        return Node("mapping", Passage("", path), pairs=tuple(pairs))
    if isinstance(data, Sequence) and not isinstance(data, (bytes, bytearray)):
        return Node(
            "list",
            Passage("", path),
            items=tuple(_of_data(item, f"{path}[{n}]", depth + 1) for n, item in enumerate(data, 1)),
        )
    raise InputError(f"{path}: a text, number, list or mapping is needed, not {type(data).__name__}")


class _Builder:
    """Builds the tree from the parser's events."""

    def __init__(self, text: str, file: str, events: Iterator[Any]) -> None:
        self.text = text
        self.file = file
        self.events = events
        self.count = 0

    def fail(self, message: str, start: int, end: int) -> NoReturn:
        raise InputError(message, span=Span(self.text, start, max(start + 1, end), self.file))

    def next(self) -> tuple[str, Any]:
        event = next(self.events)
        self.count += 1
        name = type(event).__name__
        start, end = event.start_mark.index, event.end_mark.index
        if self.count > MOST_ENTRIES:
            self.fail("the file has more entries than any case needs", start, end)
        if name == "AliasEvent" or getattr(event, "anchor", None):
            self.fail(
                "anchors and aliases (& and *) have no use in a case file; a text that begins so needs quotes",
                start,
                end,
            )
        if getattr(event, "tag", None):
            self.fail("tags (!) have no use in a case file; a text that begins so needs quotes", start, end)
        return name, event

    def document(self) -> Node:
        root: Node | None = None
        while True:
            try:
                name, event = self.next()
            except StopIteration:
                break
            if name in ("StreamStartEvent", "StreamEndEvent", "DocumentStartEvent", "DocumentEndEvent"):
                continue
            if root is not None:
                self.fail(
                    "the file holds more than one document ('---'); a case is one",
                    event.start_mark.index,
                    event.end_mark.index,
                )
            root = self.node(name, event, 0)
        if root is None:
            self.fail("the file is empty", 0, 1)
        return root

    def node(self, name: str, event: Any, depth: int) -> Node:
        start = event.start_mark.index
        if depth > DEEPEST:
            self.fail("the file is nested more deeply than any case needs", start, start + 1)
        if name == "ScalarEvent":
            return self.scalar(event)
        here = Passage(self.text[start : start + 1], self.file, self.text, (start, min(start + 1, len(self.text))))
        if name == "SequenceStartEvent":
            items = []
            while (following := self.next())[0] != "SequenceEndEvent":
                items.append(self.node(*following, depth + 1))
            return Node("list", here, items=tuple(items))
        pairs: list[tuple[Passage, Node]] = []
        while (following := self.next())[0] != "MappingEndEvent":
            key = self.node(*following, depth + 1)
            if key.kind != "text":
                key.fail("a name must be a text")
            value = self.node(*self.next(), depth + 1)
            if value.kind == "null":  # there is nothing to point at but the name
                value = Node("null", key.passage)
            pairs.append((key.passage, value))
        return Node("mapping", here, pairs=tuple(pairs))

    def scalar(self, event: Any) -> Node:
        start, end = event.start_mark.index, event.end_mark.index
        value: str = event.value
        if event.implicit[0] and value in _NULLS:
            return Node("null", Passage(value, self.file, self.text, [min(start, len(self.text))] * (len(value) + 1)))
        return Node("text", Passage(value, self.file, self.text, _positions(self.text, start, end, value)))


def _positions(text: str, start: int, end: int, value: str) -> list[int]:
    """Where each character of ``value`` stands in ``text[start:end]``, and the end.

    Quotes, line folds and escapes are stepped over.
    """
    places: list[int] = []
    at = start
    if text[start : start + 1] in "|>":
        newline = text.find("\n", start, end)
        at = newline + 1 if newline >= 0 else start
    for sign in value:
        if sign.isspace():
            places.append(min(at, end))
            continue
        found = text.find(sign, at, end)
        if found < 0:  # written as an escape
            places.append(min(at, end))
            continue
        places.append(found)
        at = found + 1
    return [*places, min(at, len(text))]
