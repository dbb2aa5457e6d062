"""What must be true before each step, for a person at the bench."""

from __future__ import annotations

from collections.abc import Iterator

from carboy.model.report import Report
from carboy.reports.citations import Citations
from carboy.reports.style import Style, wrapped


def hold_lines(report: Report, style: Style, citations: Citations, *, full: bool) -> Iterator[str]:
    """The hold points by step; with ``full`` how each test is done as well as why. A test is told once."""
    if not report.hold_points:
        return
    yield ""
    yield style.strong("Hold points: before the step, make sure of this")
    told: set[str] = set()
    for point in report.hold_points:
        name, _, how = point.test.partition(": ")
        yield from wrapped(
            style.words(f"step {point.step}, {point.vessel}: {point.must}. Test: {lower_first(name)}."),
            style.width,
            "  - ",
        )
        yield from wrapped(style.words(point.basis), style.width, "    ")
        if full and point.test not in told:
            told.add(point.test)
            yield from wrapped(style.words(f"{how} {citations.marks(point.sources)}"), style.width, "    ")


def lower_first(text: str) -> str:
    """A name within a sentence; ``pH`` and the like stay."""
    return text[:1].lower() + text[1:] if text[1:2].islower() else text


def upper_first(text: str) -> str:
    """A name at the start of a sentence; ``pH`` and the like stay."""
    return text[:1].upper() + text[1:] if text[1:2].islower() else text
