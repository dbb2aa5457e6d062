"""Vessels on the bench, and what is poured into them."""

from __future__ import annotations

from dataclasses import dataclass, field

from msgspec import Struct

from carboy.bench.make_up import MadeUp
from carboy.chemistry.mixture import Array, Mixture
from carboy.model.plan import Interval, Portion, VesselSpec
from carboy.model.report import Stream


@dataclass
class VesselState:
    """A vessel on the bench."""

    spec: VesselSpec
    content: Mixture
    capacity_L: Array
    rating_kPa: Array | None
    cover: str
    air_mol: Array | None = None
    pours: dict[str, frozenset[int]] = field(default_factory=dict)
    earlier: dict[str, frozenset[str]] = field(default_factory=dict)
    labels: list[str] = field(default_factory=list)
    stood: str = "at once"  # the slowest speed whose reactions have had their time since the last pour
    unknown: bool = False  # holds something that nobody could name, so that its pH is anybody's guess
    stream: Stream = "vessel"
    settled: bool = False  # has stood since it was last poured into or stirred, so that its solids lie at the bottom
    carriers: dict[str, tuple[float, float]] = field(
        default_factory=dict
    )  # what is dry of itself: words -> g, mL of liquid it holds

    @property
    def filled(self) -> bool:
        return bool(self.content.amounts)

    @property
    def carried_mL(self) -> float:
        """Liquid that filter aid, paper and the like in the vessel can hold."""
        return sum(volume for _, volume in self.carriers.values())


class Pouring(Struct, frozen=True):
    """What is poured in one step: its content, the words of its label, how long it takes, and the portion where it comes off a label."""

    action: str
    content: Mixture
    label: str
    over: Interval | None
    portion: Portion | None
    made: MadeUp | None
    fresh: bool = True  # from a bottle; what comes out of another vessel is not
