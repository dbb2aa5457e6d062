"""Aims of a procedure, judged over the stated ranges."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from carboy.bench.walk import Walk
from carboy.chemistry.mixture import Array, Mixture
from carboy.chemistry.stock import ChemicalStock
from carboy.hazards.steps import dissolved_by_key, pair
from carboy.model.plan import Goal
from carboy.model.report import GoalReport
from carboy.text.formulas import elements


def goal_reports(walk: Walk, stock: ChemicalStock) -> list[GoalReport]:
    """Each goal with its value at the end of the plan; None where the vessel or the state cannot be judged."""
    return [_judged(goal, walk, stock) for goal in walk.case.goals]


def _judged(goal: Goal, walk: Walk, stock: ChemicalStock) -> GoalReport:
    state = walk.vessels.get(goal.vessel) if goal.vessel else next(iter(walk.vessels.values()))
    if state is None or not state.filled or not np.all(state.content.converged):
        return GoalReport(goal=goal.text, met=None, value=None, unit=goal.unit)
    values, unit = goal_value(goal, state.content, stock)
    met = within(goal, values)
    return GoalReport(goal=goal.text, met=bool(met.all()), value=pair(values), unit=unit)


def within(goal: Goal, values: Array) -> NDArray[np.bool_]:
    """Whether each value lies in the goal's window."""
    met = np.ones(np.shape(values), dtype=bool)
    if goal.low is not None:
        met &= values >= goal.low
    if goal.high is not None:
        met &= values <= goal.high
    return met


def goal_value(goal: Goal, content: Mixture, stock: ChemicalStock) -> tuple[Array, str]:
    """What a goal speaks of, ``[lanes]``, and its unit: pH, mg/L, or mol/L where the goal says so."""
    if goal.quantity == "pH":
        return content.pH, "pH"
    element = goal.subject.split("(")[0]
    if goal.quantity == "dissolved":
        amount = dissolved_by_key(content, stock).get(goal.subject, content.zeros())
    else:
        amount = content.zeros()
        for token in content.amounts:
            record = stock.index.species.get(token)
            if record is not None and goal.subject in (record.report_key, record.report_key.split("(")[0]):
                amount = amount + content.total(token) * record.atoms.get(element, 1.0)
    if goal.unit in ("mol/L", "M"):
        return amount / np.maximum(content.volume_L, 1e-9), "mol/L"
    known = elements().get(element)
    if known is not None and known.weight is not None:
        weight = known.weight
    else:
        holder = next(
            (t for t in content.amounts if t in stock.index.species and stock.species(t).report_key == goal.subject), ""
        )
        weight = stock.molar_mass(holder) if holder else 0.0
    return 1000 * amount * weight / np.maximum(content.volume_L, 1e-9), "mg/L"
