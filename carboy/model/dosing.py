"""The dose report: the contract ``carboy-dose/1`` as pydantic models."""

from __future__ import annotations

from typing import Literal

from carboy.model.report import Finding, Pair, ReportPart, StepReport, Verdict

DoseUnit = Literal["L", "g"]
UpperEnd = Literal["aim", "danger", "vessel", "not found"]


class Dose(ReportPart):
    """An amount of the reagent: ``amount`` in the report's unit, in words, and the mol of each substance that it brings."""

    amount: float
    words: str
    holds_mol: dict[str, Pair]


class DoseWindow(ReportPart):
    """Doses between which the aim is met and no danger has begun; ``most`` is None where nothing ends it within what was looked at."""

    least: float
    most: float | None
    upper_end: UpperEnd
    upper_words: str


class Tolerance(ReportPart):
    """What an uncertain waste or reagent does to the window. ``ranges``: the uncertain numbers that were followed. ``throughout``: whether one
    dose serves the whole of them. ``least``, ``most``: the window's ends over the possibilities (None where some possibility has none).
    ``waste_factor``: from and up to how many times as much of the waste the chosen dose would still serve (None: no upper end)."""

    ranges: dict[str, Pair]
    throughout: bool
    least: Pair | None
    most: tuple[float | None, float | None] | None
    waste_factor: tuple[float | None, float] | None
    words: str


class DoseCurve(ReportPart):
    """The vessel against the dose, one entry for each dose looked at. ``aim`` is what the aim speaks of, in ``aim_unit``; ``_low`` and ``_high``
    are the least and the most over the stated ranges. ``gas_mol``: mol of each gas that can leave. ``danger``: whether a danger stands by then."""

    dose: list[float]
    aim: list[float | None]
    aim_low: list[float | None]
    aim_high: list[float | None]
    aim_unit: str
    aim_from: float | None  # the aim's own window
    aim_to: float | None
    dissolved_mg_L: dict[str, list[float]]
    pH: list[float | None]
    gas_mol: dict[str, list[float]]
    danger: list[bool]


class SpotTestReport(ReportPart):
    """A test at the bench that tells when to stop. ``role``: what it is for here."""

    name: str
    role: str
    shows: str
    procedure: str
    reading: str
    caution: str = ""
    basis: str = ""
    sources: list[str] = []


class DoseReport(ReportPart):
    """What `dose` returns. Amounts of the reagent are in ``unit``. ``nominal_window`` holds for the figures as stated, ``window`` over the whole
    of the stated ranges. The findings and steps are those of ``dose``."""

    format: Literal["carboy-dose/1"] = "carboy-dose/1"
    title: str
    verdict: Verdict
    waste: str
    reagent: str
    aim: str
    unit: DoseUnit
    summary: str
    dose: Dose | None
    window: DoseWindow | None
    nominal_window: DoseWindow | None
    tolerance: Tolerance
    curve: DoseCurve
    spot_tests: list[SpotTestReport] = []
    findings: list[Finding] = []
    steps: list[StepReport] = []
    unrecognised: list[str] = []
    assumptions: list[str] = []
    questions: list[str] = []
    cautions: list[str] = []
