"""Two ways that a case can go, told as one: the graver finding leads, and numbers span both."""

from __future__ import annotations

from carboy.hazards.judge import SIGNAL_ORDER, in_order
from carboy.model.report import Finding, GoalReport, Pair, StepReport


def merge_findings(first: list[Finding], second: list[Finding]) -> list[Finding]:
    """One finding per kind, species, step and vessel; one that only one way brings, or brings more gravely, holds in part."""

    def key(finding: Finding) -> tuple[object, ...]:
        return finding.kind, tuple(finding.species), finding.step, finding.vessel

    here, there = ({key(one): one for one in way} for way in (first, second))
    merged: list[Finding] = []
    for mark in dict.fromkeys([*here, *there]):
        pair = [way[mark] for way in (here, there) if mark in way]
        lead = min(pair, key=lambda one: SIGNAL_ORDER[one.signal])
        alike = len(pair) == 2 and pair[0].signal == pair[1].signal
        if not alike or any(one.holds == "in part" for one in pair):
            lead.holds = "in part"
        known = [one.amount_mol for one in pair if one.amount_mol is not None]
        if known:
            least = 0.0 if len(pair) < 2 else min(amount[0] for amount in known)
            lead.amount_mol = (least, max(amount[1] for amount in known))
        merged.append(lead)
    return in_order(merged)


def _span(first: Pair | None, second: Pair | None) -> Pair | None:
    known = [pair for pair in (first, second) if pair is not None]
    return (min(pair[0] for pair in known), max(pair[1] for pair in known)) if known else None


def _spans(first: dict[str, Pair], second: dict[str, Pair]) -> dict[str, Pair]:
    return {
        key: _span(first.get(key, (0.0, 0.0)), second.get(key, (0.0, 0.0))) or (0.0, 0.0)
        for key in sorted({*first, *second})
    }


def wider_step(first: StepReport, second: StepReport) -> StepReport:
    """A step's numbers over both ways."""
    return first.model_copy(
        update={
            "pH": _span(first.pH, second.pH),
            "temperature_C": _span(first.temperature_C, second.temperature_C),
            "gauge_kPa": _span(first.gauge_kPa, second.gauge_kPa),
            "dissolved_mol": _spans(first.dissolved_mol, second.dissolved_mol),
            "solids_mol": _spans(first.solids_mol, second.solids_mol),
            "gas_mol": _spans(first.gas_mol, second.gas_mol),
        }
    )


def wider_goal(first: GoalReport, second: GoalReport) -> GoalReport:
    """A goal over both ways: met only if it is met in both."""
    met = None if first.met is None or second.met is None else first.met and second.met
    return first.model_copy(update={"met": met, "value": _span(first.value, second.value)})
