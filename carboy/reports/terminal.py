"""A report for a person at the bench: plain sentences first, numbers second, formulas third, the cautions last."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from carboy.model.knowledge import Source
from carboy.model.report import Report
from carboy.reports.accounting import account_lines
from carboy.reports.citations import Citations
from carboy.reports.hold_points import hold_lines
from carboy.reports.measures import measure_lines, step_lines
from carboy.reports.paths import path_lines
from carboy.reports.sentences import finding_lines, gathered, goal_lines, listed, verdict_lines
from carboy.reports.style import Style, wrapped


def report_text(
    report: Report,
    style: Style,
    sources: Mapping[str, Source] | None = None,
    *,
    near: Mapping[str, Sequence[str]] | None = None,
    full: bool = False,
) -> str:
    """The whole report as text that ends in a newline.

    ``sources`` gives the citations for the keys in the report; ``near`` names that may have been meant by what was not recognised; ``full``
    shows every derivation, note and citation.
    """
    citations = Citations(sources or {})
    return style.finished("\n".join(_lines(report, style, citations, near or {}, full=full)) + "\n")


def _lines(
    report: Report, style: Style, citations: Citations, near: Mapping[str, Sequence[str]], *, full: bool
) -> Iterator[str]:
    yield from verdict_lines(report, style, near)
    yield from finding_lines(report, style, citations, full=full)
    yield from goal_lines(report.goals, style)
    yield from hold_lines(report, style, citations, full=full)
    yield from listed("To settle it", report.questions, style)
    yield from measure_lines(report, style, full=full)
    yield from step_lines(report, style)
    yield from path_lines(report, style, full=full)
    for account in report.accounts:
        yield ""
        yield from account_lines(account, style)
    yield from listed("Taken as given", gathered(report.assumptions), style, faint=True)
    yield from citations.lines(style, full=full)
    if report.cautions:
        yield ""
        yield from wrapped(" ".join(report.cautions), style.width)
