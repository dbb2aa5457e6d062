"""Aims of a procedure, judged over the stated ranges."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from carboy.bench.vessels import VesselState
from carboy.bench.walk import Walk
from carboy.chemistry.mixture import Array, Mixture
from carboy.chemistry.stock import ChemicalStock
from carboy.hazards.leaching import BASIS, extracts
from carboy.hazards.steps import dissolved_by_key, pair
from carboy.model.plan import Goal
from carboy.model.report import GoalReport
from carboy.text.formulas import elements


@dataclass(frozen=True)
class Judged:
    """A goal, the vessel and content that it is judged on (None: it cannot be), its values ``[ranges]`` and where they are met."""

    goal: Goal
    vessel: VesselState | None
    content: Mixture | None
    values: Array | None
    unit: str
    met: NDArray[np.bool_] | None

    def report(self) -> GoalReport:
        if self.values is None or self.met is None:
            return GoalReport(goal=self.goal.text, met=None, value=None, unit=self.goal.unit)
        return GoalReport(goal=self.goal.text, met=bool(self.met.all()), value=pair(self.values), unit=self.unit)


def goal_reports(walk: Walk, stock: ChemicalStock) -> list[GoalReport]:
    """Each goal with its value at the end of the plan; None where the vessel or the state cannot be judged."""
    return [one.report() for one in judged_goals(walk, stock)]


def judged_goals(walk: Walk, stock: ChemicalStock) -> list[Judged]:
    """Each goal judged at the end of the plan; what a leaching test is taken to be is noted among the walk's assumptions."""
    if any(goal.quantity == "leached" for goal in walk.case.goals):
        walk.assumptions.append(BASIS)
    return [_judged(goal, walk, stock) for goal in walk.case.goals]


def _judged(goal: Goal, walk: Walk, stock: ChemicalStock) -> Judged:
    state = walk.vessels.get(goal.vessel) if goal.vessel else next(iter(walk.vessels.values()))
    none = Judged(goal, state, None, None, goal.unit, None)
    if state is None or not state.filled or not np.all(state.content.converged):
        return none
    if goal.quantity != "leached":
        values, unit = goal_value(goal, state.content, stock)
        return Judged(goal, state, state.content, values, unit, within(goal, values))
    inert = sum(grams for grams, _ in state.carriers.values())
    drawn = [(one, *leached_value(goal, one, stock)) for one in extracts(state.content, stock, inert)]
    drawn = [one for one in drawn if np.all(one[0].converged)]
    if not drawn:
        return none
    worst = max(drawn, key=lambda one: float(one[1].max()))
    values = np.max([one[1] for one in drawn], axis=0)
    return Judged(goal, state, worst[0], values, worst[2], within(goal, values))


def within(goal: Goal, values: Array) -> NDArray[np.bool_]:
    """Whether each value lies in the goal's window."""
    met = np.ones(np.shape(values), dtype=bool)
    if goal.low is not None:
        met &= values >= goal.low
    if goal.high is not None:
        met &= values <= goal.high
    return met


def leached_value(goal: Goal, extract: Mixture, stock: ChemicalStock) -> tuple[Array, str]:
    """mg/L of the goal's metal in an extract; without one the share of its limit that the worst of the listed metals reaches."""
    if goal.subject:
        return goal_value(goal, extract, stock)
    share = extract.zeros()
    for limit in stock.index.limits:
        if limit.kind == goal.limit and limit.subject in elements():
            one = goal.model_copy(update={"subject": limit.subject, "unit": "mg/L"})
            share = np.maximum(share, goal_value(one, extract, stock)[0] / limit.value.magnitude)
    return share, "times the limit"


def goal_value(goal: Goal, content: Mixture, stock: ChemicalStock) -> tuple[Array, str]:
    """What a goal speaks of, ``[lanes]``, and its unit: pH, mg/L, or mol/L where the goal says so."""
    if goal.quantity == "pH":
        return content.pH, "pH"
    element = goal.subject.split("(")[0]
    litres = np.maximum(content.volume_L, 1e-9)
    if goal.quantity == "residual" and goal.subject.startswith("class:"):
        return _of_class(goal.subject.removeprefix("class:"), content, stock, litres, goal.unit)
    if goal.quantity in ("dissolved", "residual", "leached"):
        amount = dissolved_by_key(content, stock).get(goal.subject, content.zeros())
    else:
        amount = content.zeros()
        for token in content.amounts:
            record = stock.index.species.get(token)
            if record is not None and goal.subject in (record.report_key, record.report_key.split("(")[0]):
                amount = amount + content.total(token) * record.atoms.get(element, 1.0)
    if goal.unit in ("mol/L", "M"):
        return amount / litres, "mol/L"
    known = elements().get(element)
    if known is not None and known.weight is not None:
        weight = known.weight
    else:
        holder = next(
            (t for t in content.amounts if t in stock.index.species and stock.species(t).report_key == goal.subject), ""
        )
        weight = stock.molar_mass(holder) if holder else 0.0
    return 1000 * amount * weight / litres, "mg/L"


def _of_class(key: str, content: Mixture, stock: ChemicalStock, litres: Array, unit: str) -> tuple[Array, str]:
    """All that is dissolved of a class, in mol/L or mg/L."""
    moles, grams = content.zeros(), content.zeros()
    for token in content.amounts:
        if key in stock.classes.get(token, ()) and token in stock.index.species:
            amount = content.dissolved(token) if stock.kind(token) == "component" else content.total(token)
            moles = moles + amount
            grams = grams + amount * stock.molar_mass(token)
    if unit in ("mol/L", "M"):
        return moles / litres, "mol/L"
    return 1000 * grams / litres, "mg/L"
