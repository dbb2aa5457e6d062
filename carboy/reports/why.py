"""How one finding was had: what went in, each number with its equation and constants, what the rules saw, what judged it."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from carboy.errors import InputError
from carboy.model.knowledge import Source, Threshold
from carboy.model.report import Finding, Measure, Pair, Pour, Report
from carboy.model.rule import Rule
from carboy.reports.citations import Citations
from carboy.reports.figures import handy
from carboy.reports.sentences import numbered
from carboy.reports.style import Style, wrapped
from carboy.reports.table import table
from carboy.reports.tree import drawn
from carboy.reports.words import KINDS, OTHER_ORDER, is_formed, moment_words

_STEP = 2  # columns by which a number stands further in than the one that it went into
_LABEL = 34
_CONSTANT = "log10 K of "


def explained(report: Report, number: int) -> Finding:
    """The finding that the report prints as ``number``. Raises InputError with what there is where there is none of it."""
    found = dict(numbered(report))
    if number in found:
        return found[number]
    if not found:
        raise InputError("nothing above a note was found, so there is nothing that --why could explain")
    there = "(1) only" if len(found) == 1 else f"(1) to ({len(found)})"
    raise InputError(f"there is no finding ({number}): the report has {there}")


def why_text(
    report: Report,
    number: int,
    style: Style,
    rules: Sequence[Rule],
    thresholds: Mapping[str, Threshold],
    sources: Mapping[str, Source],
) -> str:
    """The page on the finding printed as ``number``, ending in a newline. Raises InputError where there is no such finding."""
    finding = explained(report, number)
    citations = Citations(sources)
    lines = [
        *_head(number, finding, style),
        *_poured(report, finding, style),
        *_numbers(finding, style, citations),
        *_rules(finding, style, citations, {rule.id: rule for rule in rules}),
        *_thresholds(finding, style, citations, thresholds),
        *_paths(finding, style),
        *citations.lines(style, full=True),
    ]
    return style.finished("\n".join(lines) + "\n")


def _head(number: int, finding: Finding, style: Style) -> Iterator[str]:
    word = finding.signal.upper()
    lead = f"({number}) {word}  "
    first, *rest = wrapped(style.words(finding.summary), style.width, " " * len(lead))
    shown = style.alarm(word) if word == "DANGER" else style.strong(word)
    yield f"({number}) {shown}  {style.strong(first.strip())}"
    yield from (style.strong(line) for line in rest)
    where = "; if poured the other way round" if finding.order == OTHER_ORDER else ""
    about = f"{KINDS[finding.kind].capitalize()}, {moment_words(finding, {})}{where}."
    yield from (style.faint(line) for line in wrapped(about, style.width, " " * len(lead)))


# --- what went in --------------------------------------------------------------------------------------------------


def _poured(report: Report, finding: Finding, style: Style) -> Iterator[str]:
    pours = [
        (step.step, step.poured)
        for step in report.steps
        if step.poured is not None and (finding.order == OTHER_ORDER or step.step <= finding.step)
    ]
    if not pours:
        return
    yield ""
    yield style.strong("What went in, as the labels were read")
    equations = {
        step.from_[0]: step.equation
        for path in (finding.path, *finding.other_paths)
        for step in path
        if step.rule == "label"
    }
    for number, pour in pours:
        where = "" if finding.order == OTHER_ORDER else f"step {number}: "
        yield from wrapped(f"{where}{pour.label}", style.width, "  ")
        yield from table(list(_contents(pour, equations, style)), style.width, indent=6, limits={0: _LABEL})


def _contents(pour: Pour, equations: Mapping[str, str], style: Style) -> Iterator[list[str]]:
    yield ["in all", f"{_shown(pour.volume_L, 'L')}, {_shown(pour.mass_g, 'g')}"]
    for name, moles in pour.holds_mol.items():
        text = next((found for label, found in equations.items() if _speaks_of(label, name, pour)), "")
        yield [name, _shown(moles, "mol") + (f"; in water {style.equation(text)}" if "->" in text else "")]


def _speaks_of(label: str, name: str, pour: Pour) -> bool:
    """Whether the label of a path is that of a substance of this pour."""
    if label.startswith(f"{name} in "):
        return pour.label.endswith(label.removeprefix(f"{name} in "))
    return pour.label.endswith(label) and len(pour.holds_mol) == 1


# --- numbers -------------------------------------------------------------------------------------------------------


def _numbers(finding: Finding, style: Style, citations: Citations) -> Iterator[str]:
    if not finding.measures and finding.amount_mol is None:
        return
    yield ""
    yield style.strong("How each number was had")
    if finding.amount_mol is not None and is_formed(finding):
        name = style.formula(finding.species[0])
        counted = "(molecules, dissolved or not, less those that were there before; over the stated ranges)"
        text = f"{name} formed = {_shown(finding.amount_mol, 'mol')} {counted}"
        yield from wrapped(text, style.width, "  ")
    told: set[str] = set()
    for measure in finding.measures:
        yield from _measure(measure, style, citations, _STEP, told)


def _measure(measure: Measure, style: Style, citations: Citations, indent: int, told: set[str]) -> Iterator[str]:
    """A number, its equation, and below, further in, the numbers that went into it. ``told`` has what was said of numbers before."""
    words = f"{_name(measure, style)} = {_value(measure, style)}"
    behind = _behind(measure, style, citations)
    if behind and words + behind not in told:
        told.add(words + behind)
        words += behind
    lines = wrapped(words, style.width, " " * indent, " " * (indent + _STEP))
    yield from (style.strong(line) for line in lines) if indent == _STEP else lines
    deeper = indent + 2 * _STEP
    if measure.equation:
        signs = measure.equation if style.plain else measure.equation.replace(" x ", " × ").replace(" - ", " − ")
        yield from wrapped(signs, style.width, " " * (indent + _STEP) + "by ", " " * (indent + _STEP + 3))
    for one in measure.inputs:
        yield from _measure(one, style, citations, deeper, told)


def _name(measure: Measure, style: Style) -> str:
    if measure.quantity.startswith(_CONSTANT):
        return f"log K of {style.equation(measure.quantity.removeprefix(_CONSTANT))}"
    return style.words(measure.quantity)


def _value(measure: Measure, style: Style) -> str:
    value = list(measure.value) if isinstance(measure.value, Sequence) else measure.value
    if value is None:
        return style.words(measure.unit) or "not known"
    return handy(value, measure.unit, 4 if measure.quantity.startswith(_CONSTANT) else 3)


def _behind(measure: Measure, style: Style, citations: Citations) -> str:
    """What a number rests on, in brackets, and the mark of its source."""
    itself = f"{_name(measure, style)} {_value(measure, style)}".replace("\u00a0", " ")
    basis = f" ({style.words(measure.basis)})" if measure.basis and measure.basis != itself else ""
    mark = citations.marks([measure.source]) if measure.source else ""
    return f"{basis}{' ' if mark else ''}{mark}"


def _shown(pair: Pair, unit: str) -> str:
    return handy(list(pair), unit)


# --- what judged it ------------------------------------------------------------------------------------------------


def _rules(finding: Finding, style: Style, citations: Citations, rules: Mapping[str, Rule]) -> Iterator[str]:
    if not finding.sight:
        return
    yield ""
    yield style.strong("Which rules speak, and what they saw")
    for sight in finding.sight:
        rule = rules.get(sight.rule)
        title = f"{sight.rule}: {rule.title}." if rule is not None else sight.rule
        yield from wrapped(f"{title} {citations.marks(rule.cites if rule is not None else [])}", style.width, "  ")
        rows = []
        for one in sight.conditions:
            seen = _value(one, style) if one.value is not None or one.unit else one.basis
            named = f"{style.words(one.basis)}, " if one.value is not None and one.basis else ""
            rows.append([style.words(one.quantity), named + seen])
        yield from table(rows, style.width, indent=6, limits={0: _LABEL})


def _thresholds(
    finding: Finding, style: Style, citations: Citations, thresholds: Mapping[str, Threshold]
) -> Iterator[str]:
    known = [thresholds[key] for key in finding.thresholds if key in thresholds]
    if not known:
        return
    yield ""
    yield style.strong("What it was held against")
    yield from wrapped("Thresholds of kb/assessment*.ttl; a site may set its own.", style.width, "  ")
    for one in known:
        figure = handy(one.value.magnitude, one.value.unit)
        yield from wrapped(f"{one.key} = {figure} {citations.marks([one.value.source])}", style.width, "  ")
        yield from (style.faint(line) for line in wrapped(one.reason, style.width, " " * 6))


def _paths(finding: Finding, style: Style) -> Iterator[str]:
    if not finding.path:
        return
    yield ""
    yield style.strong("How it comes about")
    yield from drawn(finding.path, finding.species, style, indent=2)
    for other in finding.other_paths:
        yield "  or"
        yield from drawn(other, finding.species, style, indent=2)
