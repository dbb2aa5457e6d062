"""Finds the doses of a reagent between which an aim is met, by looking at the vessel with many doses in it at once.

A possibility is one lane of the stated ranges; where a rule leaves its conversion open, it counts once with the most and once
with the least of it.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from carboy.bench.follow import along
from carboy.bench.trace import Course, StepTrace
from carboy.chemistry.mixture import Array
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.hazards.draft import DANGER, Draft
from carboy.hazards.goals import goal_value, within
from carboy.hazards.judge import Judge
from carboy.model.plan import Goal
from carboy.reasoning.firing import Reactor

_POINTS = 60  # of the first look, evenly spread over the logarithm of the dose
_BELOW = 30.0  # the first look begins at this part of the dose that could answer the subject alone
_MOST_TIMES = 100.0  # of what could answer everything in the waste
_REFINED = 48  # doses of each further look
_ROUNDS = 5
_CLOSE_ENOUGH = 2e-3  # relative width between a dose that fails and one that does
_FOR_DANGER = 70  # doses of the look that is judged
OF_THE_VESSEL = (
    "foam",
    "pressure",
    "incomplete",
)  # kinds that hang on the vessel or on the aim, judged for the chosen dose alone


@dataclass(frozen=True)
class Look:
    """The vessel with each of ``doses`` ``[n]`` in it: what the aim speaks of, and whether it is met, ``[possibilities, n]``."""

    doses: Array
    value: Array
    met: NDArray[np.bool_]

    def joined(self, other: Look) -> Look:
        """Both, by rising dose."""
        order = np.argsort(np.concatenate([self.doses, other.doses]), kind="stable")
        return Look(
            np.concatenate([self.doses, other.doses])[order],
            np.concatenate([self.value, other.value], axis=1)[:, order],
            np.concatenate([self.met, other.met], axis=1)[:, order],
        )


@dataclass(frozen=True)
class Run:
    """Doses that all meet the aim, from ``first`` to ``last``; ``ends``: whether a dose beyond was looked at, and fails."""

    first: float
    last: float
    ends: bool


@dataclass(frozen=True)
class Danger:
    """The least dose at which a hazard is a danger in some possibility, a dose before it, and the hazard."""

    begins: float
    before: float
    draft: Draft


class DoseSearch:
    """Looks at one addition with any dose. ``trace`` is the pour of one unit of the reagent as the bench walked it."""

    def __init__(
        self, trace: StepTrace, unit: float, goal: Goal, reactors: tuple[Reactor, Reactor], stock: ChemicalStock
    ) -> None:
        assert trace.before is not None
        assert trace.added is not None
        self.trace, self.before, self.added = trace, trace.before, trace.added
        self.unit, self.goal, self.reactors, self.stock = unit, goal, reactors, stock

    # --- looking

    def course(self, doses: Array, *, least: bool = False) -> Course:
        """The vessel, open, with each of ``doses`` (rising, in L or g) in it."""
        reactor = self.reactors[1] if least else self.reactors[0]
        whole = self.added.scaled(doses[-1] / self.unit)
        return along(
            self.before,
            whole,
            reactor,
            self.trace.surroundings,
            capacity_L=None,
            air_mol=None,
            fractions=doses / doses[-1],
        )

    def look(self, doses: Array) -> Look:
        """The aim at each of ``doses``, in every possibility."""
        course = self.course(doses)
        parts = [self._judged(course)]
        if any(firing.share[0] < firing.share[1] for firing in course.firings):
            parts.append(self._judged(self.course(doses, least=True)))
        return Look(
            doses,
            np.concatenate([value for value, _ in parts]),
            np.concatenate([met for _, met in parts]),
        )

    def without(self) -> bool:
        """Whether the aim is met with none of the reagent, in every possibility."""
        value, _ = goal_value(self.goal, self.before, self.stock)
        return bool((within(self.goal, value) & self.before.converged).all())

    def _judged(self, course: Course) -> tuple[Array, NDArray[np.bool_]]:
        value, _ = goal_value(self.goal, course.mixture, self.stock)
        met = within(self.goal, value) & course.mixture.converged
        return course.table(value), course.table(met)

    # --- the scale

    def scale(self, most_volumes: float, at_hand: float | None) -> tuple[float, float]:
        """The least and the most dose to look at, in L or g: from well below what the subject of the aim could use up to a hundred times what
        all that is dissolved could, and no more than ``most_volumes`` times the waste."""
        brought = {token: abs(float(self.added.total(token)[0])) for token in self.added.amounts if token != WATER}
        per_unit = sum(brought.values())
        largest = max(brought.values(), default=0.0)
        bulk = self.before.volume_L if self._in_litres else self.before.mass_g
        most = most_volumes * float(bulk.max())
        if per_unit <= 0:  # water: nothing but dilution
            return most * 1e-4, most if at_hand is None else min(most, at_hand)
        held = {token: np.abs(self.before.total(token)) for token in self.before.amounts if token != WATER}
        everything = sum((float(amount.max()) for amount in held.values()), 0.0)
        subject = sum((float(held[token].min()) for token in held if self.is_subject(token)), 0.0)
        least = (subject or 1e-3 * everything or 1e-6) / per_unit / _BELOW * self.unit
        most = min(most, _MOST_TIMES * max(everything, 1e-6) / largest * self.unit)
        if at_hand is not None:
            most = min(most, at_hand)
        return min(least, 1e-3 * most) if least >= most else least, most

    @property
    def _in_litres(self) -> bool:
        return self.unit == 1.0

    def is_subject(self, token: str) -> bool:
        if self.goal.quantity == "pH":
            return token == PROTON
        record = self.stock.index.species.get(token)
        return record is not None and self.goal.subject in (record.report_key, record.report_key.split("(")[0])

    # --- the window of the aim

    def search(self, least: float, most: float) -> Look:
        """Looks between two doses, closer and closer about those where the aim begins or ceases to be met."""
        found = self.look(np.geomspace(least, most, _POINTS))
        for _ in range(_ROUNDS):
            spans = self._unsettled(found)
            if not spans:
                break
            each = max(2, _REFINED // len(spans))
            finer = [np.geomspace(low, high, each + 2)[1:-1] for low, high in spans]
            found = found.joined(self.look(np.unique(np.concatenate(finer))))
        return found

    def _unsettled(self, found: Look) -> list[tuple[float, float]]:
        """Neighbouring doses between which the aim changes, and that lie further apart than they need to."""
        low, high = found.doses[:-1], found.doses[1:]
        side = np.where(
            found.met,
            0,
            np.where(found.value > (np.inf if self.goal.high is None else self.goal.high), 1, -1),
        )
        changes = np.zeros(len(low), dtype=bool)
        for row in side:
            changes |= row[1:] != row[:-1]
        wide = high > low * (1 + _CLOSE_ENOUGH)
        return [(float(low[place]), float(high[place])) for place in np.flatnonzero(changes & wide)]

    # --- dangers on the way

    def danger(self, judge: Judge, found: Look, upto: float) -> Danger | None:
        """The first danger on the way up to a dose. Hazards of the vessel's size are left out: these are judged for the chosen dose."""
        inside = found.doses[found.doses <= upto * (1 + 1e-9)]
        if not inside.size:
            return None
        if inside.size > _FOR_DANGER:
            inside = inside[np.unique(np.linspace(0, inside.size - 1, _FOR_DANGER).astype(int))]
        first = self._first(judge, inside)
        if first is None:
            return None
        finer = np.geomspace(first.before or inside[0] / 10, first.begins, 18)[1:-1]
        closer = self._first(judge, np.unique(np.concatenate([inside[inside <= first.begins], finer])))
        return closer or first

    def _first(self, judge: Judge, doses: Array) -> Danger | None:
        course = self.course(doses)
        pour = replace(
            self.trace, path=course, added=self.added.scaled(doses[-1] / self.unit), contact=None, storage=None
        )
        found: Danger | None = None
        for draft in judge.drafts(pour):
            if draft.kind in OF_THE_VESSEL or draft.where != "path" or draft.level < DANGER:
                continue
            place = int(np.flatnonzero((draft.levels >= DANGER).any(axis=0))[0])
            if found is None or doses[place] < found.begins:
                found = Danger(float(doses[place]), float(doses[place - 1]) if place else 0.0, draft)
        return found


def longest_run(doses: Array, met: NDArray[np.bool_], last_is_limit: bool = False) -> Run | None:
    """The widest unbroken stretch of doses that meet the aim (by ratio), ``met`` ``[n]``; None where none does."""
    best: Run | None = None
    place = 0
    while place < len(doses):
        if not met[place]:
            place += 1
            continue
        stop = place
        while stop + 1 < len(doses) and met[stop + 1]:
            stop += 1
        run = Run(float(doses[place]), float(doses[stop]), stop + 1 < len(doses) or last_is_limit)
        if best is None or run.last / run.first > best.last / best.first * (1 + 1e-12):
            best = run
        place = stop + 1
    return best
