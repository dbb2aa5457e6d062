"""A dose report for a person at the bench: how much, from where to where, when to stop, and what the dose does."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from carboy.model.dosing import DoseReport
from carboy.model.knowledge import Source
from carboy.model.report import Report
from carboy.reports.citations import Citations
from carboy.reports.figures import handy, number, quantity
from carboy.reports.hold_points import upper_first
from carboy.reports.plot import Axis, plot_lines
from carboy.reports.sentences import finding_lines, gathered, listed
from carboy.reports.style import Style, ascii_text, wrapped
from carboy.reports.table import table
from carboy.reports.words import VERDICTS

_ROWS = 9  # doses in the table
_DECADES_BELOW = 30.0  # the plot begins at this part of the least dose
_LEAST_SHOWN = 1e-6  # of the highest figure: the floor of a logarithmic plot


def dose_text(report: DoseReport, style: Style, sources: Mapping[str, Source], *, full: bool = False) -> str:
    """The whole report as text that ends in a newline."""
    citations = Citations(sources)
    return style.finished("\n".join(_lines(report, style, citations, full=full)) + "\n")


def _lines(report: DoseReport, style: Style, citations: Citations, *, full: bool) -> Iterator[str]:
    word = report.verdict.upper()
    grave = report.verdict in ("refuse", "cannot say")
    yield f"{style.alarm(word) if grave else style.strong(word)}  {style.strong(VERDICTS[report.verdict])}"
    yield from wrapped(f"{report.waste}, with {report.reagent}: {report.aim}", style.width)
    yield from listed("Not recognised", report.unrecognised, style)
    yield ""
    yield style.strong("Dose")
    yield from wrapped(style.words(report.summary), style.width, "  ")
    yield from wrapped(style.words(report.tolerance.words), style.width, "  ")
    yield from _curve(report, style)
    if report.spot_tests:
        yield ""
        yield style.strong("When to stop")
    for test in report.spot_tests:
        marks = citations.marks(test.sources)
        yield from wrapped(
            style.words(f"{upper_first(test.name)}: {test.role} ({test.basis}). {marks}"),
            style.width,
            "  - ",
        )
        yield from wrapped(style.words(f"{test.procedure} {test.reading} {test.caution}"), style.width, "    ")
    if report.findings:
        yield ""
        yield style.strong("What this dose does")
    shown = Report(title=report.title, verdict=report.verdict, findings=report.findings, steps=report.steps)
    yield from finding_lines(shown, style, citations, full=full)
    yield from listed("To settle it", report.questions, style)
    yield from listed("Taken as given", gathered(report.assumptions), style, faint=True)
    yield from citations.lines(style, full=full)
    if report.cautions:
        yield ""
        yield from wrapped(" ".join(report.cautions), style.width)


def _curve(report: DoseReport, style: Style) -> Iterator[str]:
    curve = report.curve
    points = [(dose, value) for dose, value in zip(curve.dose, curve.aim, strict=True) if value is not None]
    if len(points) < 2:
        return
    log = curve.aim_unit != "pH"
    values = [value for _, value in points]
    if log:
        floor = max(max(values) * _LEAST_SHOWN, 1e-9)
        points = [(dose, max(value, floor)) for dose, value in points]
        values = [value for _, value in points]
    if min(values) == max(values):
        return
    window = report.window or report.nominal_window
    first = points[0][0] if window is None else max(points[0][0], window.least / _DECADES_BELOW)
    x = Axis(first, points[-1][0], log=True)
    y = Axis(min(values), max(values), log=log)
    levels = [level for level in (curve.aim_from, curve.aim_to) if level is not None and (level > 0 or not log)]
    yield ""
    unit = curve.aim_unit
    yield from wrapped(
        f"{unit} against dose, both by powers of ten; dots: the aim" if log else "pH against dose; dots: the aim",
        style.width,
        "  ",
    )
    marked = None if window is None else (window.least, points[-1][0] if window.most is None else window.most)
    yield from plot_lines(
        points,
        x,
        y,
        width=min(style.width, 76),
        levels=levels,
        marked=marked,
        arrow=None if report.dose is None else report.dose.amount,
    )
    left, right = handy(x.low, report.unit), handy(x.high, report.unit)
    yield f"{' ' * 12}{left}{right:>{max(min(style.width, 76) - 12 - len(left), len(right) + 1)}}"
    if window is not None:
        yield from wrapped("= the window, ^ the dose above", style.width, "            ")
    yield ""
    yield from _figures(report, style, first)


def _figures(report: DoseReport, style: Style, first: float) -> Iterator[str]:
    """Some doses of the curve, each with what the vessel then is."""
    curve = report.curve
    places = [place for place, dose in enumerate(curve.dose) if dose >= first]
    low, high = curve.dose[places[0]], curve.dose[places[-1]]
    wanted = [low * (high / low) ** (step / (_ROWS - 1)) for step in range(_ROWS)]
    window = report.window or report.nominal_window
    if window is not None:
        wanted += [window.least, window.least if window.most is None else window.most]
    chosen = {_nearest(curve.dose, places, aimed) for aimed in wanted}
    metals = list(curve.dissolved_mg_L)
    gases = sorted(curve.gas_mol, key=lambda gas: -max(curve.gas_mol[gas]))[:2]
    rows: list[Sequence[str]] = [
        [
            "dose",
            *([f"aim, {curve.aim_unit}"] if curve.aim_unit != "pH" else []),
            *(f"{metal} in solution, mg/L" for metal in metals if curve.aim_unit != "mg/L" or len(metals) > 1),
            "pH",
            *(f"{style.formula(gas)} that can leave" for gas in gases),
            "",
        ]
    ]
    for place in sorted(chosen):
        aim, pH = curve.aim[place], curve.pH[place]
        rows.append(
            [
                handy(curve.dose[place], report.unit),
                *(["-" if aim is None else number(aim, 2)] if curve.aim_unit != "pH" else []),
                *(
                    number(curve.dissolved_mg_L[metal][place], 2)
                    for metal in metals
                    if curve.aim_unit != "mg/L" or len(metals) > 1
                ),
                "-" if pH is None else f"{pH:.1f}",
                *(quantity(1000 * curve.gas_mol[gas][place], "mmol", 2) for gas in gases),
                "danger" if curve.danger[place] else "",
            ]
        )
    if style.plain:  # columns are as wide as what is printed
        rows = [[ascii_text(cell) for cell in row] for row in rows]
    yield from table(rows, style.width, indent=2)


def _nearest(doses: Sequence[float], places: Sequence[int], aimed: float) -> int:
    return min(places, key=lambda place: abs(doses[place] / aimed - 1))
