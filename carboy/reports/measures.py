"""The second part of a report on a terminal: what each finding rests on, and the vessel after each step."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from carboy.model.report import Finding, Pair, Report, StepReport
from carboy.reports.figures import handy, runs, span
from carboy.reports.sentences import numbered
from carboy.reports.style import Style, wrapped
from carboy.reports.table import table
from carboy.reports.words import is_formed

_LEAST_SHOWN = 1e-12  # mol
_LEAST_GAS = 1e-6  # mol: less is no news in a table
_LEAST_PRESSURE = 0.05  # kPa
_LABEL, _VALUE = 30, 20  # columns for the name and the figure of a measure where what it rests on stands beside it


def measure_lines(report: Report, style: Style, *, full: bool) -> Iterator[str]:
    """The numbers of the findings above a note, each once for one substance; with ``full`` what they rest on too."""
    entries = [(number, finding) for number, finding in numbered(report) if finding.measures or finding.amount_mol]
    if not entries:
        return
    yield ""
    yield style.strong("Numbers")
    rows: list[list[str]] = []
    shown: set[tuple[str, ...]] = set()
    for number, finding in entries:
        own = [_formed(finding, style)] if is_formed(finding) else []
        for measure in finding.measures:
            value = list(measure.value) if isinstance(measure.value, Sequence) else measure.value
            own.append([style.words(measure.quantity), handy(value, measure.unit), style.words(measure.basis)])
        if not full:
            own = [row[:2] for row in own]
        fresh = [row for row in own if (finding.order, *finding.species, *row) not in shown]
        shown.update((finding.order, *finding.species, *row) for row in own)
        rows += [[f"({number})" if place == 0 else "", *row] for place, row in enumerate(fresh)]
    yield from table(rows, style.width, indent=2, limits={1: _LABEL, 2: _VALUE} if full else {1: style.width // 2 + 2})
    if not full and entries:
        yield from wrapped("--why 1 tells how the numbers of (1) were had, and so on.", style.width, "  ")


def _formed(finding: Finding, style: Style) -> list[str]:
    assert finding.amount_mol is not None
    return [f"{style.formula(finding.species[0])} formed", handy(list(finding.amount_mol), "mol"), ""]


def step_lines(report: Report, style: Style) -> Iterator[str]:
    """The vessel after each step: pH, temperature, pressure, volume, and what is in it."""
    if not report.steps:
        return
    yield ""
    yield style.strong("After each step")
    with_pressure = any(step.gauge_kPa and max(step.gauge_kPa) > _LEAST_PRESSURE for step in report.steps)
    with_vessel = len({step.vessel for step in report.steps}) > 1
    head = [
        "step",
        *(["vessel"] if with_vessel else []),
        "pH",
        "°C",
        *(["kPa"] if with_pressure else []),
        "L",
        "what was done",
    ]
    rows = [head]
    for step in report.steps:
        row = [
            str(step.step),
            *([step.vessel] if with_vessel else []),
            _places(step.pH, 2),
            _places(step.temperature_C, 1),
        ]
        row += [_pair(step.gauge_kPa)] if with_pressure else []
        rows.append([*row, _pair(step.volume_L), step.action])
    yield from table(rows, style.width, indent=2, limits={1: 16} if with_vessel else {})
    for steps, parts in _contents(report, style):
        label = f"  step {runs(steps)}  "
        for place, part in enumerate(parts):
            yield from wrapped(part, style.width, label if place == 0 else " " * len(label))


def _pair(values: Pair | float | None) -> str:
    if values is None:
        return "-"
    return span(values if isinstance(values, tuple) else [values])


def _places(values: Pair | None, places: int) -> str:
    """With a set number of decimals, as pH and temperature are read off an instrument."""
    if values is None:
        return "-"
    ends = [f"{value:.{places}f}".replace("-", "−") for value in values]
    return ends[0] if ends[0] == ends[1] else f"{ends[0]} to {ends[1]}"


def _contents(report: Report, style: Style) -> Iterator[tuple[list[int], list[str]]]:
    """What is in the vessels, one entry for the steps that leave a vessel's content as it was."""
    last: dict[str, tuple[list[int], list[str]]] = {}
    found: list[tuple[list[int], list[str]]] = []
    for step in report.steps:
        parts = _content(step, style)
        before = last.get(step.vessel)
        if before is not None and before[1] == parts:
            before[0].append(step.step)
        elif parts:
            last[step.vessel] = ([step.step], parts)
            found.append(last[step.vessel])
    yield from found


def _content(step: StepReport, style: Style) -> list[str]:
    parts = []
    split = {key.partition("(")[0] for key in step.dissolved_mol if "(" in key}
    dissolved = {key: pair for key, pair in step.dissolved_mol.items() if key not in split}
    for name, amounts in (("dissolved", dissolved), ("solid", step.solids_mol), ("gas", step.gas_mol)):
        least = _LEAST_GAS if name == "gas" else _LEAST_SHOWN
        shown = [f"{_key(key, style)}\u00a0{span(pair)}" for key, pair in amounts.items() if pair[1] > least]
        if shown:
            parts.append(f"{name}, mol: {'; '.join(shown)}")
    return parts


def _key(key: str, style: Style) -> str:
    return key if "(" in key else style.formula(key)
