"""How much of a reagent a vessel's content needs: to a pH, or by the ratio to what is to be taken away.

A first figure for the repair to put in: what it does along the way is for the engine to judge.
"""

from __future__ import annotations

import math

import numpy as np

from carboy.bench.make_up import Bench
from carboy.bench.ranges import Ranges
from carboy.chemistry.mixture import TRACE, Mixture, poured_together
from carboy.chemistry.stock import ChemicalStock
from carboy.model.knowledge import RepairReagent
from carboy.model.plan import Interval, Portion
from carboy.text.case_writer import quantity_text
from carboy.text.portions import NameLookup, parse_portion

SURPLUS = 1.05  # over what the equation asks for
MOST = {"L": 200.0, "g": 20000.0}  # per litre of content; more is no repair
_DOUBLINGS = 40
_HALVINGS = 12  # a part in four thousand


class Doser:
    """Portions of the graph's reagents for given contents."""

    def __init__(self, stock: ChemicalStock, names: NameLookup) -> None:
        self.stock = stock
        self.names = names
        self._units: dict[str, Mixture] = {}

    def portion(self, reagent: RepairReagent, amount: float) -> Portion:
        """``amount`` L or g of the reagent, rounded up to two figures, as a label."""
        rounded = _rounded_up(amount)
        words = quantity_text(Interval(low=rounded, high=rounded), reagent.measured_in)
        return parse_portion(f"{words} of {reagent.portion_words}", self.names)

    def to_pH(self, reagent: RepairReagent, contents: list[Mixture]) -> float:
        """L or g of an acid or base that bring every one of the contents, in every lane, to the pH that it is for; 0 where all are there
        already, inf where it does not get there."""
        assert reagent.brings_pH is not None
        return max((self._to_pH(reagent, content) for content in contents), default=0.0)

    def _to_pH(self, reagent: RepairReagent, content: Mixture) -> float:
        target = reagent.brings_pH
        sign = 1.0 if reagent.serves == "base" else -1.0
        whole = content.take(np.arange(content.lanes))
        whole.neat = {}
        whole.headspace_L = None
        if whole.solved is None:
            return math.inf

        def short(amount: float) -> bool:
            both = poured_together(whole, self._unit(reagent, content.lanes).scaled(amount)) if amount > 0 else whole
            both.neat = {}
            return bool(np.any(sign * (target - both.pH) > 0)) if target is not None else False

        if not short(0.0):
            return 0.0
        most = MOST[reagent.measured_in] * max(float(content.volume_L.max()), 1e-3)
        low, high = 0.0, most / 2.0**_DOUBLINGS
        while short(high):
            low, high = high, 2.0 * high
            if high > most:
                return math.inf
        for _ in range(_HALVINGS):
            middle = 0.5 * (low + high)
            low, high = (middle, high) if short(middle) else (low, middle)
        return SURPLUS * high

    def to_quench(self, reagent: RepairReagent, content: Mixture) -> float:
        """L or g of a quench that take away all that it can in the content; 0 where there is nothing to take."""
        needed = 0.0
        for quench in reagent.quenches:
            for token, amount in content.amounts.items():
                if quench.against in self.stock.classes.get(token, frozenset()):
                    needed += quench.mol_per_mol * float(amount.max())
        if needed <= TRACE:
            return 0.0
        unit = self._unit(reagent, 1)
        brought = float(unit.labelled[reagent.substance][0])
        return SURPLUS * needed / brought

    def _unit(self, reagent: RepairReagent, lanes: int) -> Mixture:
        """One litre or gram of the reagent."""
        one = self._units.get(reagent.id)
        if one is None:
            ranges = Ranges()
            label = parse_portion(f"1 {reagent.measured_in} of {reagent.portion_words}", self.names)
            one = Bench(self.stock, ranges).make_up(label, reagent.id, 25.0).mixture
            self._units[reagent.id] = one
        return one.take(np.zeros(lanes, dtype=np.intp))


def _rounded_up(amount: float) -> float:
    step = 10.0 ** (math.floor(math.log10(amount)) - 1)
    return float(f"{math.ceil(amount / step - 1e-9) * step:.6g}")
