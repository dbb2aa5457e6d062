"""The first part of a report on a terminal: verdict, dangers, what to do, in plain sentences."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence

from carboy.model.report import Finding, GoalReport, Report
from carboy.reports.citations import Citations
from carboy.reports.figures import quantity, runs
from carboy.reports.style import Style, wrapped
from carboy.reports.words import (
    EITHER_ORDER,
    GASES,
    KINDS,
    OTHER_ORDER,
    VERDICTS,
    by_signal,
    moment_words,
    of_other_order,
)

_MARGIN = 9  # columns of "WARNING  "
_MOST_NOTES = 6
_FEW_STEPS = 2  # where the title says already what is poured into what


def verdict_lines(report: Report, style: Style, near: Mapping[str, Sequence[str]]) -> Iterator[str]:
    """The verdict and what it means, the title below; what was not recognised, with names ``near`` it."""
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
            meant = " or ".join(f"'{word}'" for word in near.get(item, ()))
            yield from wrapped(f"{item}{f'; did you mean {meant}?' if meant else ''}", style.width, "  - ")
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
    notes = by_signal(report, "note")
    shown = notes if full else _news(notes, [one for _, one in entries])[:_MOST_NOTES]
    if notes:
        yield ""
    for finding in shown:
        where = f" (step {finding.step})" if actions else ""
        yield from wrapped(style.words(f"{finding.summary}{where}"), style.width, _head("NOTE", style), " " * _MARGIN)
    if len(notes) > len(shown):
        more = len(notes) - len(shown)
        words = "1 more note; --full shows it." if more == 1 else f"{more} more notes; --full shows them."
        yield from wrapped(words, style.width, _head("NOTE", style) if not shown else " " * _MARGIN, " " * _MARGIN)
    turned = [(number, finding) for number, finding in entries if finding.order == OTHER_ORDER]
    if turned:
        yield ""
        yield style.strong("If poured the other way round:")
        for number, finding in turned:
            yield ""
            yield from _told(number, finding, actions, style, citations, told)


def _news(notes: Sequence[Finding], told: Sequence[Finding]) -> list[Finding]:
    """The notes that say something new: not the same of a later step, not another measure of a gas that was told of in the same step, nor
    what stays dissolved of a metal whose going back was told."""
    fresh: list[Finding] = []
    for note in notes:
        before = [one for one in (*told, *fresh) if (one.step, one.vessel) == (note.step, note.vessel)]
        same_gas = note.kind in GASES and any(one.kind in GASES and one.species == note.species for one in before)
        first = {one.quantity for one in note.measures[:1]}
        same_metal = note.kind == "incomplete" and any(
            one.kind == "remobilised" and first <= {measure.quantity for measure in one.measures} for one in before
        )
        again = any((one.kind, one.summary) == (note.kind, note.summary) for one in (*told, *fresh))
        if not again and not same_gas and not same_metal:
            fresh.append(note)
    return fresh


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
    same = told.setdefault(f"{finding.kind} {finding.summary}", number)
    if same != number:
        yield f"{_head(finding.signal.upper(), style)}{style.strong(f'As ({same}), once more.')}"
        yield from _about(number, finding, actions, style, alike=alike)
        return
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
    numbers = " and ".join(f"({one})" for one in sorted(before))
    more = f" See {numbers} too." if controls else f" Why, and what prevents it: see {numbers}."
    yield from _about(number, finding, actions, style, more if before else "", alike=alike)


def _about(
    number: int, finding: Finding, actions: dict[int, str], style: Style, more: str = "", *, alike: bool = False
) -> Iterator[str]:
    about = f"({number}) {KINDS[finding.kind].capitalize()}, {moment_words(finding, actions, alike=alike)}.{more}"
    yield from (style.faint(line) for line in wrapped(about, style.width, " " * _MARGIN))


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
