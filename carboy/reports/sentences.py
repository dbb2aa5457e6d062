"""The first part of a report on a terminal: verdict, dangers, what to do, in plain sentences."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence

from carboy.model.report import Finding, GoalReport, Report
from carboy.reports.citations import Citations
from carboy.reports.figures import quantity, runs
from carboy.reports.style import Style, wrapped
from carboy.reports.words import EITHER_ORDER, KINDS, OTHER_ORDER, VERDICTS, by_signal, moment_words, of_other_order

_MARGIN = 9  # columns of "WARNING  "
_MOST_NOTES = 6
_FEW_STEPS = 2  # where the title says already what is poured into what


def verdict_lines(report: Report, style: Style) -> Iterator[str]:
    """The verdict and what it means, the title below."""
    word = report.verdict.upper()
    grave = report.verdict in ("refuse", "cannot say")
    shown = style.alarm(word) if grave else style.strong(word)
    lines = list(wrapped(VERDICTS[report.verdict], style.width, " " * (len(word) + 2)))
    yield f"{shown}  {style.strong(lines[0].strip())}"
    yield from lines[1:]
    if report.title:
        yield from wrapped(report.title, style.width)
    if all_alike(report):
        yield from wrapped("This holds whichever is poured into which.", style.width)
    if report.unrecognised:
        yield ""
        yield style.strong("Not recognised")
        for item in report.unrecognised:
            yield from wrapped(item, style.width, "  - ")
        yield from wrapped("What it does is not judged; the rest is, as if it were not there.", style.width, "  ")


def all_alike(report: Report) -> bool:
    """Whether two bottles do the same whichever is poured into the other."""
    orders = [finding.order for _, finding in numbered(report)]
    return len(orders) > 1 and set(orders) == {EITHER_ORDER}


def numbered(report: Report) -> list[tuple[int, Finding]]:
    """The findings above a note with the numbers by which the report refers to them; those of the other order last."""
    grave = [*by_signal(report, "danger"), *by_signal(report, "warning")]
    grave += [one for one in of_other_order(report) if one.signal != "note"]
    return list(enumerate(grave, start=1))


def finding_lines(report: Report, style: Style, citations: Citations, *, full: bool) -> Iterator[str]:
    """Dangers, warnings and notes in sentences, then what the other order of pouring would bring."""
    actions = {step.step: step.action for step in report.steps} if len(report.steps) > _FEW_STEPS else {}
    entries = numbered(report)
    alike = all_alike(report)
    told: dict[str, int] = {}
    for number, finding in entries:
        if finding.order != OTHER_ORDER:
            yield ""
            yield from _told(number, finding, actions, style, citations, told, alike=alike)
    notes = [one for one in by_signal(report, "note") if full or not _told_above(one, entries)]
    if notes:
        yield ""
    shown = notes if full else notes[:_MOST_NOTES]
    for finding in shown:
        where = f" (step {finding.step})" if actions else ""
        yield from wrapped(style.words(f"{finding.summary}{where}"), style.width, _head("NOTE", style), " " * _MARGIN)
    if len(notes) > len(shown):
        yield from wrapped(f"{len(notes) - len(shown)} more notes; --full shows them.", style.width, " " * _MARGIN)
    turned = [(number, finding) for number, finding in entries if finding.order == OTHER_ORDER]
    if turned:
        yield ""
        yield style.strong("If poured the other way round:")
        for number, finding in turned:
            yield ""
            yield from _told(number, finding, actions, style, citations, told)


def _told_above(note: Finding, entries: Sequence[tuple[int, Finding]]) -> bool:
    """Whether what stays dissolved of a metal is the subject of a warning or danger already."""
    return note.kind == "incomplete" and any(
        finding.kind == "remobilised"
        and (finding.step, finding.vessel, finding.species) == (note.step, note.vessel, note.species)
        for _, finding in entries
    )


def _head(word: str, style: Style) -> str:
    shown = style.alarm(word) if word == "DANGER" else style.strong(word)
    return shown + " " * (_MARGIN - len(word))


def _told(
    number: int,
    finding: Finding,
    actions: dict[int, str],
    style: Style,
    citations: Citations,
    told: dict[str, int],
    *,
    alike: bool = False,
) -> Iterator[str]:
    """One finding. ``told`` has what was said of others before, so that nothing is said twice."""
    margin = " " * _MARGIN
    marks = citations.marks(finding.sources)
    summary = finding.summary if finding.says else f"{finding.summary} {marks}"
    lines = list(wrapped(style.words(summary), style.width, margin))
    yield _head(finding.signal.upper(), style) + style.strong(lines[0][_MARGIN:])
    yield from (margin + style.strong(line[_MARGIN:]) for line in lines[1:])
    said = told.setdefault(finding.says, number) if finding.says else number
    if said == number and finding.says:
        yield from wrapped(style.words(f"{finding.says} {marks}"), style.width, margin)
    controls = [control for control in finding.controls if told.setdefault(control, number) == number]
    if controls:
        yield f"{margin}What prevents it:"
    for control in controls:
        yield from wrapped(style.words(control), style.width, f"{margin}- ")
    before = {said} | {told[control] for control in finding.controls}
    before.discard(number)
    about = f"({number}) {KINDS[finding.kind].capitalize()}, {moment_words(finding, actions, alike=alike)}."
    if before:
        numbers = " and ".join(f"({one})" for one in sorted(before))
        about += f" See {numbers} too." if controls else f" Why, and what prevents it: see {numbers}."
    yield from (style.faint(line) for line in wrapped(about, style.width, margin))


def goal_lines(goals: Sequence[GoalReport], style: Style) -> Iterator[str]:
    """The aims of a procedure: met, not met, or open."""
    if not goals:
        return
    yield ""
    yield style.strong("Aims")
    for goal in goals:
        word = {True: "met", False: "NOT MET", None: "open"}[goal.met]
        value = (
            f" It comes to {quantity(list(goal.value), goal.unit)}."
            if goal.value is not None
            else " It cannot be told."
        )
        shown = style.alarm(word) if goal.met is False else word
        yield from wrapped(f"{goal.goal}.{value}", style.width, f"  {shown}{' ' * (9 - len(word))}")


_OF_A_STEP = re.compile(r"Step (\d+): (.*)", re.DOTALL)


def gathered(items: Sequence[str]) -> list[str]:
    """What is said of several steps in the same words, said once."""
    steps: dict[str, list[int]] = {}
    for item in items:
        found = _OF_A_STEP.fullmatch(item)
        steps.setdefault(found[2] if found else item, []).extend([int(found[1])] if found else [])
    return [f"Step{'s' if len(of) > 1 else ''} {runs(of)}: {text}" if of else text for text, of in steps.items()]


def listed(title: str, items: Sequence[str], style: Style, *, faint: bool = False) -> Iterator[str]:
    """A titled list; nothing for an empty one."""
    if not items:
        return
    yield ""
    yield style.strong(title)
    for item in items:
        for line in wrapped(style.words(item), style.width, "  - "):
            yield style.faint(line) if faint else line
