"""The third part of a report on a terminal: how each finding comes about, from the words on the labels on."""

from __future__ import annotations

from collections.abc import Iterator

from carboy.model.report import Finding, PathStep, Report
from carboy.reports.figures import runs
from carboy.reports.sentences import numbered
from carboy.reports.style import Style, wrapped
from carboy.reports.tree import drawn


def path_lines(report: Report, style: Style, *, full: bool) -> Iterator[str]:
    """A tree for each finding above a note; findings that come about alike share one. ``full`` draws every derivation."""
    groups: list[tuple[list[int], Finding]] = []
    for number, finding in numbered(report):
        if not finding.path:
            continue
        for numbers, other in groups:
            if finding.order == other.order and _shape(finding.path) == _shape(other.path):
                numbers.append(number)
                break
        else:
            groups.append(([number], finding))
    if not groups:
        return
    yield ""
    yield style.strong("How it comes about")
    for place, (numbers, finding) in enumerate(groups):
        if place:
            yield ""
        mark = f"({runs(numbers)})"
        lines = drawn(finding.path, finding.species, style, indent=6)
        if len(mark) <= 3:
            yield f"  {mark} {lines[0].lstrip()}"
            yield from lines[1:]
        else:
            yield from wrapped(mark, style.width, "  ")
            yield from lines
        if finding.other_paths and not full:
            count = len(finding.other_paths)
            words = "1 other way leads" if count == 1 else f"{count} other ways lead"
            yield from wrapped(f"{words} there as well; --full draws them.", style.width, " " * 6)
        for derivation in finding.other_paths if full else []:
            yield from wrapped("or", style.width, " " * 6)
            yield from drawn(derivation, finding.species, style, indent=6)


def _shape(path: list[PathStep]) -> list[tuple[str, ...]]:
    return [(step.equation, *step.from_) for step in path]
