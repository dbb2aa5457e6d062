"""The report: the contract ``carboy-report/1`` as pydantic models. Every renderer reads this and nothing else."""

from __future__ import annotations

from typing import Any, Literal

from pydantic import BaseModel, ConfigDict, Field

from carboy.model.rule import Kind

Signal = Literal["danger", "warning", "note"]
Moment = Literal["contact", "during", "after", "storage"]
Verdict = Literal["refuse", "conditional", "no objection", "cannot say"]
Pair = tuple[float, float]
Stream = Literal["vessel", "cake", "filtrate", "decanted liquid", "washings", "contaminated solid", "sample", "gas"]


class ReportPart(BaseModel):
    """Base of the report's records."""

    model_config = ConfigDict(populate_by_name=True, extra="forbid", ser_json_inf_nan="null", defer_build=True)

    def model_dump(self, **options: Any) -> dict[str, Any]:
        """As pydantic's, with the contract's own key names."""
        return super().model_dump(**{"by_alias": True, **options})

    def model_dump_json(self, **options: Any) -> str:
        """As pydantic's, with the contract's own key names."""
        return super().model_dump_json(**{"by_alias": True, **options})


class PathStep(ReportPart):
    """One link of a reaction path: the rule or equilibrium, its equation, what went in and what came out. ``from`` words are labels or formulas."""

    rule: str
    equation: str
    from_: list[str] = Field(alias="from", serialization_alias="from")
    to: list[str]
    step: int


class Measure(ReportPart):
    """One number that judges a finding, with what it rests on: the equation it came from and the numbers that went in; ``source`` is the
    key of the source of a number that was looked up."""

    quantity: str
    value: float | list[float] | None
    unit: str
    basis: str
    equation: str = ""
    inputs: list[Measure] = []
    source: str = ""


class RuleSight(ReportPart):
    """What a rule saw where the finding is gravest: one measure a condition, its ``quantity`` the condition as the rule file has it."""

    rule: str
    conditions: list[Measure]


class Finding(ReportPart):
    """One hazard or shortfall of one step."""

    rule: str
    kind: Kind
    signal: Signal
    step: int
    vessel: str = ""
    moment: Moment
    fractions: Pair
    holds: Literal["throughout", "in part"]
    species: list[str]
    amount_mol: Pair | None
    summary: str
    says: str = ""  # the rules' words for the bench
    path: list[PathStep]
    other_paths: list[list[PathStep]] = []
    measures: list[Measure] = []
    controls: list[str] = []
    sources: list[str] = []
    rules: list[str] = []  # every rule that supports it
    order: str = ""  # for combine: "as written", "other order", "either order"
    speed: str = ""  # of what goes on in storage: "hours", "days"
    sight: list[RuleSight] = []
    thresholds: list[str] = []  # keys of the thresholds that were looked at in grading it


class Pour(ReportPart):
    """What a step poured, as it was read off the label: the least and the most of it, and of each substance in it."""

    label: str
    volume_L: Pair
    mass_g: Pair
    holds_mol: dict[str, Pair]


class StepReport(ReportPart):
    """The vessel after a step."""

    step: int
    action: str = ""
    vessel: str
    pH: Pair | None
    temperature_C: Pair | None
    gauge_kPa: Pair | None
    volume_L: Pair | float
    dissolved_mol: dict[str, Pair] = {}
    solids_mol: dict[str, Pair] = {}
    gas_mol: dict[str, Pair] = {}
    poured: Pour | None = None


class GoalReport(ReportPart):
    """A goal and whether it is met over the stated ranges (None: cannot say)."""

    goal: str
    met: bool | None
    value: Pair | None
    unit: str


class HoldPoint(ReportPart):
    """What must be true before a step: ``must`` in words, the ``test`` that shows it at the bench, and the ``basis``, the margin found."""

    step: int
    vessel: str = ""
    must: str
    test: str
    basis: str
    sources: list[str] = []


class Share(ReportPart):
    """Where a part of an element is at the end: the stream, as what, how many grams over the stated ranges, and how many per cent of what
    was put in (nominal). ``carrier``: what dry thing it is wet in, such as paper."""

    place: str
    stream: Stream
    state: Literal["dissolved", "solid", "gas", "liquid apart"]
    form: str = ""
    grams: Pair
    nominal_g: float
    percent: float | None
    carrier: str = ""


class AccountStep(ReportPart):
    """After a step: g put in so far, and g in each place (nominal)."""

    step: int
    action: str
    put_in_g: float
    grams: dict[str, float]


class ElementAccount(ReportPart):
    """Where every gram of an element went. ``gap_g``: what was put in less what is found, the worst over the stated ranges."""

    element: str
    name: str
    put_in_g: Pair
    shares: list[Share]
    steps: list[AccountStep]
    gap_g: float
    gap_share: float


class Report(ReportPart):
    """What `combine` and `vet` return."""

    format: Literal["carboy-report/1"] = "carboy-report/1"
    title: str = ""
    verdict: Verdict
    findings: list[Finding] = []
    steps: list[StepReport] = []
    goals: list[GoalReport] = []
    hold_points: list[HoldPoint] = []
    accounts: list[ElementAccount] = []
    unrecognised: list[str] = []
    assumptions: list[str] = []
    questions: list[str] = []
    cautions: list[str] = []
