"""Asking a report and a walk for what a test wants to know."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from carboy.bench.walk import Walk
from carboy.chemistry.mixture import Array, Mixture
from carboy.model.plan import Case, Interval, VesselSpec
from carboy.model.report import Finding, Report
from carboy.text.cases import combine_case
from carboy.vetting import combine, laboratory


@lru_cache(maxsize=256)
def combined(*portions: str, volume_L: float = 0.0, cover: str = "open", material: str = "glass") -> Report:
    """The report of ``combine``; kept, because several tests ask for the same one, so never change it."""
    return combine(*portions, vessel=vessel(volume_L, cover, material) if volume_L or cover != "open" else None)


def vessel(volume_L: float, cover: str = "open", material: str = "glass") -> VesselSpec:
    size = Interval(low=volume_L, high=volume_L) if volume_L else None
    return VesselSpec(name="vessel", volume=size, cover=cover, material=material)  # type: ignore[arg-type]


@lru_cache(maxsize=256)
def walked(*portions: str, volume_L: float = 0.0, cover: str = "open", material: str = "glass") -> Walk:
    """The walk of portions poured one after the other; kept, so never change it."""
    spec = vessel(volume_L, cover, material) if volume_L or cover != "open" else None
    lab = laboratory()
    return lab.walk(combine_case(portions, lab.names, None, spec))


def walk_case(case: Case) -> Walk:
    return laboratory().walk(case)


def only(report: Report, kind: str, species: str = "", *, step: int | None = None, order: str = "") -> Finding:
    """The one finding of a kind (and species, step, order)."""
    found = select(report, kind, species, step=step, order=order)
    assert len(found) == 1, f"{len(found)} findings of {kind} {species}: {outline(report)}"
    return found[0]


def select(
    report: Report, kind: str = "", species: str = "", *, step: int | None = None, order: str = ""
) -> list[Finding]:
    return [
        one
        for one in report.findings
        if (not kind or one.kind == kind)
        and (not species or species in one.species)
        and (step is None or one.step == step)
        and (not order or one.order == order)
    ]


def outline(report: Report) -> list[str]:
    """The findings in short, for the message of a failed test."""
    return [
        f"{one.signal} {one.kind} {one.species} step {one.step} {one.order} {one.amount_mol}" for one in report.findings
    ]


def measure(finding: Finding, quantity: str) -> float:
    """The value of the measure whose quantity begins with the words."""
    found = [one for one in finding.measures if one.quantity.startswith(quantity)]
    assert len(found) == 1, [one.quantity for one in finding.measures]
    assert isinstance(found[0].value, float)
    return found[0].value


def words_of(finding: Finding) -> str:
    """Every word of the reaction paths of a finding."""
    steps = [step for path in (finding.path, *finding.other_paths) for step in path]
    return " ".join([word for step in steps for word in (step.rule, step.equation, *step.from_, *step.to)])


def bottle(text: str) -> Mixture:
    """What a single portion holds, in all lanes of its ranges (the nominal one first)."""
    walk = walked(text)
    return walk.steps[0].after


def nominal(values: Array) -> float:
    return float(np.asarray(values)[0])


def step_value(report: Report, step: int, table: str, key: str) -> tuple[float, float]:
    """Both ends of an entry of ``dissolved_mol``, ``solids_mol`` or ``gas_mol``."""
    return getattr(report.steps[step - 1], table)[key]


def labels(finding: Finding) -> list[str]:
    """The words of the labels that a finding's first path starts from."""
    return [word for step in finding.path if step.rule == "label" for word in step.from_]
