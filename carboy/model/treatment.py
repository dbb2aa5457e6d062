"""What ``treat`` returns: routes from a waste to a safe end state, as pydantic models under the contract ``carboy-treat/1``."""

from __future__ import annotations

from typing import Literal

from carboy.model.report import Pair, Report, ReportPart

Outcome = Literal["routes found", "nothing to treat", "no sound treatment", "cannot say"]


class RouteStep(ReportPart):
    """One step as done at the bench. ``treatment`` is the id of the record it comes from, ``test`` what must be seen before going on."""

    step: int
    action: str
    treatment: str = ""
    pH: Pair | None = None
    test: str = ""


class Stream(ReportPart):
    """What leaves: a filtrate or a sludge. ``mg_L`` of the liquid by report key, ``solids_g`` by formula."""

    vessel: str
    kind: Literal["liquid", "sludge"]
    volume_L: Pair
    pH: Pair | None = None
    mg_L: dict[str, Pair] = {}
    solids_g: dict[str, Pair] = {}
    goes_to: str = ""


class Route(ReportPart):
    """A procedure that vets clean. ``case_file`` is the case as vetted, to be saved and vetted again; ``report`` is what came of it."""

    treatments: list[str]
    names: list[str]
    vessel_L: float
    steps: list[RouteStep]
    streams: list[Stream]
    sludge_g: float
    dangers: list[str]
    notes: list[str] = []
    sources: list[str]
    cost: float
    case_file: str
    report: Report


class Rejected(ReportPart):
    """A sequence of treatments that was tried and is not offered, with the reasons."""

    names: list[str]
    reasons: list[str]


class TreatReport(ReportPart):
    """The answer of ``treat``."""

    format: Literal["carboy-treat/1"] = "carboy-treat/1"
    waste: str
    outcome: Outcome
    hazards: list[str]
    remains: list[str] = []
    routes: list[Route] = []
    rejected: list[Rejected] = []
    reasons: list[str] = []
    unrecognised: list[str] = []
    assumptions: list[str] = []
    cautions: list[str] = []
