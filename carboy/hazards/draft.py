"""A hazard as first found, with a severity in every lane, before it is put into words for the report."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from carboy.bench.trace import Course, StepTrace
from carboy.chemistry.mixture import Array
from carboy.model.knowledge import Index
from carboy.model.report import Measure
from carboy.model.rule import Kind, Rule

Levels = NDArray[np.int_]
NONE, NOTE, WARNING, DANGER = 0, 1, 2, 3
Moment = Literal["contact", "during", "after", "storage"]
Where = Literal["path", "contact", "storage"]


@dataclass
class Draft:
    """One hazard of one step. ``levels`` and ``amount`` are ``[ranges, points]`` over ``fractions``; ``tokens`` are species tokens."""

    kind: Kind
    tokens: tuple[str, ...]
    levels: Levels
    fractions: Array
    where: Where
    trace: StepTrace
    summary: str
    amount: Array | None = None
    measures: list[Measure] = field(default_factory=list)
    rules: list[Rule] = field(default_factory=list)
    names: dict[str, str] = field(default_factory=dict)  # variable -> name of what was bound
    bound: dict[str, str] = field(default_factory=dict)  # variable -> token of what was bound
    equations: list[tuple[str, str, tuple[str, ...], tuple[str, ...]]] = field(default_factory=list)
    controls: list[str] = field(default_factory=list)
    sources: list[str] = field(default_factory=list)
    at_most: bool = False  # the amount is the most that there can be, known only by class
    lane: int | None = None  # that the summary and the measures speak of; None where no measure was computed
    bound_by: dict[str, dict[str, str]] = field(default_factory=dict)  # rule -> variable -> token
    thresholds: tuple[str, ...] = ()
    cause_rule: str = ""  # a firing whose node in the record is the cause itself

    @property
    def level(self) -> int:
        return int(self.levels.max(initial=0))

    @property
    def moment(self) -> Moment:
        if self.where != "path":
            return self.where
        if self.trace.path is None:
            return "after"
        held = np.flatnonzero((self.levels >= max(self.level, 1)).any(axis=0))
        return "after" if held.size and held[0] == len(self.fractions) - 1 else "during"

    @property
    def span(self) -> tuple[float, float]:
        """The fractions of the addition between which it stands at its severity."""
        if self.where == "storage" or self.trace.path is None:
            return 1.0, 1.0
        if self.where == "contact":
            return 0.0, 1.0
        held = np.flatnonzero((self.levels >= max(self.level, 1)).any(axis=0))
        return (float(self.fractions[held[0]]), float(self.fractions[held[-1]])) if held.size else (0.0, 1.0)

    @property
    def throughout(self) -> bool:
        """Whether it reaches its severity over the whole of the stated ranges."""
        return bool((self.levels.max(axis=1) >= self.level).all())

    def amount_range(self) -> tuple[float, float] | None:
        """Least and most over the ranges of the most along the path, mol."""
        if self.amount is None:
            return None
        most = self.amount.max(axis=1)
        return 0.0 if self.at_most else float(most.min()), float(most.max())


class Scale:
    """The thresholds of the assessment by name; ``used`` keeps which were looked at."""

    def __init__(self, index: Index) -> None:
        self.index = index
        self._used: dict[str, None] = {}

    def __getitem__(self, key: str) -> float:
        self._used[key] = None
        return self.index.thresholds[key].value.magnitude

    @property
    def used(self) -> tuple[str, ...]:
        return tuple(self._used)

    def afresh(self) -> Scale:
        """The same thresholds, none of them looked at yet."""
        return Scale(self.index)


def graded(values: Array, note: float, warning: float, danger: float) -> Levels:
    """0 below ``note``, 1 from it, 2 from ``warning``, 3 from ``danger``."""
    filled = np.nan_to_num(np.asarray(values, dtype=float), nan=0.0, posinf=np.inf)
    return (filled >= note).astype(int) + (filled >= warning) + (filled >= danger)


def courses(trace: StepTrace) -> list[tuple[Where, Course]]:
    """What there is to judge in a step."""
    found: list[tuple[Where, Course]] = []
    for name, course in (("path", trace.path), ("contact", trace.contact), ("storage", trace.storage)):
        if course is not None:
            found.append((name, course))  # type: ignore[arg-type]
    return found


def course_of(draft: Draft) -> Course | None:
    """The course that a draft was found on."""
    return {"path": draft.trace.path, "contact": draft.trace.contact, "storage": draft.trace.storage}[draft.where]


def worst_lane(levels: Levels, size: Array) -> int:
    """The lane that a summary speaks of, as an index into ``[lanes]``: the largest ``size`` ``[ranges, points]`` of the nominal case where that is
    as grave as any other, else of the gravest case."""
    grave = levels >= max(int(levels.max()), 1)
    if grave[0].any():
        grave[1:] = False
    return int(np.argmax(np.where(grave, np.nan_to_num(size, nan=0.0), -1.0)))
