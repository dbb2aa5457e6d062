"""Heat of mixing, dissolving, neutralising and reacting, and the temperature it leads to without loss.

Enthalpies are kept relative to the components in water at infinite dilution, so that a component whose enthalpy of formation is unknown
cancels as long as it stays a component. Method: Hess's law; dilution by the apparent molar enthalpies of the graph (Parker 1965 and the
tables named there).
"""

from __future__ import annotations

from functools import cached_property, lru_cache

import numpy as np

from carboy.chemistry.mixture import Array, Mixture
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.model.knowledge import Enthalpy

WATER_HEAT_CAPACITY = 4.18  # kJ/(kg K), CRC Handbook (from memory)
SOLUTE_HEAT_CAPACITY = 1.0  # kJ/(kg K) for dissolved salts and solids; common practice
LIQUID_HEAT_CAPACITY = 2.0  # kJ/(kg K) for organic liquids; common practice


def _make_up(components: dict[str, float]) -> tuple[tuple[str, float], ...]:
    return tuple(sorted((token, round(count, 6)) for token, count in components.items()))


class HeatBook:
    """Enthalpies of one stock, ready for mixtures."""

    def __init__(self, stock: ChemicalStock) -> None:
        self.stock = stock

    def of_speciation(self, mixture: Mixture) -> Array:
        """kJ ``[L]`` of the mixture's species against its components at infinite dilution: acid/base steps, complexes, solids, gases, and
        what concentrated acids and bases still have to give on dilution. Constants without an enthalpy count as athermal.

        A dilution table already holds the heat of ionisation of its own electrolyte (hydrogensulfate in sulfuric acid), so species made of
        its two ions alone count only beyond the amount that the table covers.
        """
        held = self._undiluted(mixture)
        total = mixture.zeros()
        for group in (mixture.aqueous, mixture.solids, mixture.gases):
            for token, amount in group.items():
                enthalpy = self.of_forming(token)
                if enthalpy is not None:
                    covered = sum((n for table, n in held if self._own_pair(token, table)), mixture.zeros())
                    total = total + enthalpy * np.maximum(amount - covered, 0.0)
        ions = sum((n for _, n in held), mixture.zeros())
        within = sum((n * self.stock.yield_of(table.electrolyte).get(WATER, 0.0) for table, n in held), mixture.zeros())
        water = np.maximum(mixture.total(WATER) - within, 0.0)  # the water inside OH- does not dilute
        ratio = np.divide(water, ions, out=np.zeros_like(water), where=ions > 0)
        for table, n in held:
            if np.any(n > 0):
                grid = sorted(table.points)
                total = total + n * np.interp(ratio, [point[0] for point in grid], [point[1] for point in grid])
        return total

    def of_forming(self, token: str) -> float | None:
        """kJ per mol on forming a species from its components; None where unknown. A solid that is also bought as a substance has the
        enthalpy of that substance, so that what lies undissolved gives and takes no heat."""
        bought = (
            self._bought.get(_make_up(self.stock.components_of(token))) if self.stock.kind(token) == "solid" else None
        )
        if bought is not None:
            return bought
        made = self.stock.formation.get(token)
        return None if made is None else made.enthalpy_formation

    @cached_property
    def _bought(self) -> dict[tuple[tuple[str, float], ...], float]:
        found = {}
        for identity, substance in self.stock.index.substances.items():
            if substance.state == "s" and substance.yields:
                dissolving = self.of_dissolving(identity, neat=True)
                if dissolving is not None:
                    found[_make_up(self.stock.yield_of(identity))] = -dissolving
        return found

    def _own_pair(self, token: str, table: Enthalpy) -> bool:
        parts = {part for part in self.stock.components_of(token) if part != WATER}
        return len(parts) > 1 and parts <= {part for part in self.stock.yield_of(table.electrolyte) if part != WATER}

    def _undiluted(self, mixture: Mixture) -> list[tuple[Enthalpy, Array]]:
        """mol ``[L]`` of each electrolyte with a dilution table that the ions can make up, in the order of the tables."""
        left = {token: mixture.total(token).copy() for token in mixture.amounts}
        return [(table, self._share(table, left, mixture)) for table in self.stock.index.dilution]

    def _share(self, table: Enthalpy, left: dict[str, Array], mixture: Mixture) -> Array:
        """mol of an electrolyte that the ions left can make up; takes them out of ``left``."""
        yields = self.stock.yield_of(table.electrolyte)
        n: Array | None = None
        for token, count in yields.items():
            if token == WATER:
                continue
            have = left.get(token, mixture.zeros()) * np.sign(count)
            n = np.maximum(have, 0.0) / abs(count) if n is None else np.minimum(n, np.maximum(have, 0.0) / abs(count))
        if n is None:
            return mixture.zeros()
        for token, count in yields.items():
            if token in left:
                left[token] = left[token] - count * n
        return n

    def of_reaction(self, change: dict[str, float]) -> float | None:
        """kJ per mol of extent of a reaction given as components gained; None where an enthalpy of formation is unknown."""
        total = 0.0
        for token, count in change.items():
            formation = self._formation(token)
            if formation is None:
                return None
            total += count * formation
        return total

    def _formation(self, token: str) -> float | None:
        if token == PROTON:
            return 0.0
        record = self.stock.index.species.get(token)
        if record is not None and record.formation is not None:
            return record.formation.magnitude
        substance = self.stock.index.substances.get(token)
        if substance is not None and substance.formation is not None:
            return substance.formation.magnitude
        return None

    def of_dissolving(self, substance_id: str, *, neat: bool) -> float | None:
        """kJ per mol on dissolving a substance as bought to its components at infinite dilution (negative = warms); zero for one that is
        in solution already or stands aside; None where unknown."""
        substance = self.stock.index.substances[substance_id]
        if not neat or not substance.yields:
            return 0.0
        if substance.formation is None:
            return None
        after = self.of_reaction(self.stock.yield_of(substance_id))
        return None if after is None else after - substance.formation.magnitude

    def of_molecule(self, substance_id: str) -> float:
        """kJ per mol, against its components, of the species that a substance is made of when it dissolves as a molecule or zwitterion: the
        formed species with the substance's own components, or all but its spectator ions. Zero where there is none."""
        wanted = {part: count for part, count in self.stock.yield_of(substance_id).items() if part != WATER}
        best = 0.0
        most = 1
        for product, made in self.stock.formation.items():
            parts = {part: count for part, count in made.coefficients.items() if part != WATER}
            if made.kind != "aqueous" or made.enthalpy_formation is None or len(parts) <= most:
                continue
            spectators = [part for part in wanted if part not in parts]
            if (
                all(abs(wanted.get(part, 0.0) - count) < 1e-9 for part, count in parts.items())
                and PROTON not in spectators
            ):
                best, most = self.of_forming(product) or 0.0, len(parts)
        return best

    def heat_capacity(self, mixture: Mixture) -> Array:
        """kJ/K of the content."""
        water = mixture.water_kg
        organic = mixture.zeros()
        for token, amount in mixture.aside.items():
            if self.stock.species(token).phase == "l":
                organic = organic + amount * self.stock.molar_mass(token) / 1000
        rest = np.maximum(mixture.mass_g / 1000 - water - organic, 0.0)
        return water * WATER_HEAT_CAPACITY + organic * LIQUID_HEAT_CAPACITY + rest * SOLUTE_HEAT_CAPACITY


@lru_cache(maxsize=4)
def heat_book(stock: ChemicalStock) -> HeatBook:
    """The heat book of a stock, made once."""
    return HeatBook(stock)
