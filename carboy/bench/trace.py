"""What one step did: the vessel before, along and after it, in every lane."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from carboy.chemistry.mixture import Array, Mixture
from carboy.model.plan import Setting
from carboy.reasoning.binding import Surroundings
from carboy.reasoning.firing import Firing

Scalar = TypeVar("Scalar", bound=np.generic)


@dataclass
class Course:
    """A vessel followed along something: the dosing path, the mixing ratios of the contact zone, or a wait.

    Lanes run over ranges first, points second: lane ``r * points + p``. ``fractions`` is ``[points]``.
    """

    mixture: Mixture
    unreacted: Mixture
    firings: list[Firing]
    fractions: Array
    heat_kJ: Array  # set free, [lanes]
    reached_C: Array  # without loss, [lanes]
    unknown_heat: tuple[str, ...] = ()
    capacity_kJ_K: Array = field(default_factory=lambda: np.zeros(0))  # [lanes]
    dissolved_share: Array | None = None  # of what was dry, the share that the water at hand took up, [lanes]
    heat_parts: tuple[tuple[str, float], ...] = ()  # what the heat of the nominal end comes from, kJ

    @property
    def points(self) -> int:
        return len(self.fractions)

    @property
    def ranges(self) -> int:
        return self.mixture.lanes // self.points

    def table(self, values: NDArray[Scalar]) -> NDArray[Scalar]:
        """``[lanes]`` as ``[ranges, points]``."""
        return np.asarray(values).reshape(self.ranges, self.points)

    def last(self) -> NDArray[np.intp]:
        """The lanes of the last point."""
        return np.arange(self.ranges) * self.points + self.points - 1


@dataclass
class StepTrace:
    """One step of a plan as walked."""

    number: int
    action: str
    vessel: str
    after: Mixture  # [ranges]
    surroundings: Surroundings
    cover: str
    capacity_L: Array  # of the vessel, [ranges]
    rating_kPa: Array | None
    setting: Setting
    unknown: bool = False  # the vessel holds something that nobody could name
    before: Mixture | None = None  # [ranges]; None for an empty vessel
    added: Mixture | None = None  # [ranges]; None where nothing is added
    added_label: str = ""
    path: Course | None = None
    contact: Course | None = None
    storage: Course | None = None
    duration_s: Array | None = None
    notes: list[str] = field(default_factory=list)
    sludge: Mixture | None = None  # a filter's cake
    brought: Mixture | None = None  # what came from a bottle, not from another vessel
    left: dict[str, Array] = field(
        default_factory=dict
    )  # mol of each gas that left the open vessel at the end, [ranges]
    left_alone: tuple[Mixture, ...] = ()  # what was poured, each left standing by itself: what storage is compared with
    left_firings: tuple[Firing, ...] = ()  # what would go on in each of them by itself

    @property
    def unsettled(self) -> bool:
        """Whether some state of the step, along it, at contact or in storage, has no converged speciation in some lane."""
        courses = (self.path, self.contact, self.storage)
        mixtures = [self.after, *(course.mixture for course in courses if course is not None)]
        return not all(bool(np.all(mixture.converged)) for mixture in mixtures)


@dataclass
class LedgerPage:
    """What is where after a step (0: before the first), for the account of what went where.

    ``contents``: vessel -> content. ``brought``: from bottles, in this step. ``left``: gas -> mol that left open vessels, ``[ranges]``.
    """

    step: int
    action: str
    contents: dict[str, Mixture]
    brought: tuple[Mixture, ...] = ()
    left: dict[str, Array] = field(default_factory=dict)
