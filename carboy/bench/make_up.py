"""From a label to amounts: what a portion holds, in mol of components, in every lane."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from carboy.bench.ranges import Ranges
from carboy.chemistry.heat import heat_book
from carboy.chemistry.mixture import WATER_MOLAR_MASS, Array, Mixture, empty
from carboy.chemistry.roots import bracketed_root
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.model.knowledge import Material, Substance
from carboy.model.plan import Ingredient, Interval, Portion
from carboy.reasoning.equation import dissolution_equation

WATER_DENSITY = 0.997  # g/mL at 25 degC, CRC Handbook (from memory)
DISSOLVED_SALT_DENSITY = (
    2.5  # g/mL, apparent, for solutes whose solutions have no density in the graph; common practice
)
UNKNOWN_LIQUID_DENSITY = 0.9  # g/mL for an organic liquid without a density in the graph; common practice
MOLAR_VOLUME = 24.465  # L/mol of gas at 25 degC and 1 atm
_PH_TOLERANCE = 0.003
_PURE = 0.99  # a "concentrated" material purer than this is the neat substance


@dataclass
class MadeUp:
    """A portion's content, with what was assumed, asked and not recognised."""

    mixture: Mixture
    assumptions: list[str] = field(default_factory=list)
    questions: list[str] = field(default_factory=list)
    unrecognised: list[str] = field(default_factory=list)
    parts: list[tuple[str, str, dict[str, float]]] = field(
        default_factory=list
    )  # substance id, its equation, nominal mol of components


class Bench:
    """Makes up portions from the graph."""

    def __init__(self, stock: ChemicalStock, ranges: Ranges) -> None:
        self.stock = stock
        self.index = stock.index
        self.ranges = ranges
        self.heat = heat_book(stock)
        self._points: dict[str, list[tuple[float, float]]] = {}  # by substance id

    @cached_property
    def concentrated(self) -> dict[str, Material]:
        """Substance id -> the material that "concentrated" means for it."""
        return {item.strength_of: item for item in self.index.materials.values() if item.strength_of}

    def _solution_points(self, substance_id: str) -> list[tuple[float, float]]:
        """Mass fraction and g/mL of the strengths whose density the graph knows, the weakest first."""
        known = self._points.get(substance_id)
        if known is None:
            points = {
                (item.parts[0].typical / 100, item.density.magnitude)
                for item in self.index.materials.values()
                if item.density is not None and item.balance == "water" and item.state == "l"
                if len(item.parts) == 1 and item.parts[0].substance == substance_id
            }
            substance = self.index.substances.get(substance_id)
            if substance is not None and substance.state == "l" and substance.density is not None:
                points.add((1.0, substance.density.magnitude))
            known = self._points[substance_id] = sorted(points)
        return known

    def density(self, substance_id: str, mass_fraction: Array) -> Array:
        """g/mL of a solution in water, between the strengths whose density the graph knows."""
        plain = 1.0 / ((1.0 - mass_fraction) / WATER_DENSITY + mass_fraction / DISSOLVED_SALT_DENSITY)
        points = self._solution_points(substance_id)
        if not points:
            return plain
        grid = [(0.0, WATER_DENSITY), *(point for point in points if point[0] > 0.005)]
        within = np.interp(mass_fraction, [point[0] for point in grid], [point[1] for point in grid])
        last, dense = grid[-1]
        beyond = dense + plain - 1.0 / ((1.0 - last) / WATER_DENSITY + last / DISSOLVED_SALT_DENSITY)
        return np.where(mass_fraction > last, beyond, within)

    def make_up(self, portion: Portion, key: str, temperature_C: float) -> MadeUp:
        """The content of ``portion``. ``key`` names it in the ranges ("bottle rinse-14", "portion 2")."""
        made = MadeUp(empty(self.stock, self.ranges.lanes, temperature_C))
        amount = self._draw(f"amount of {portion.text}", portion.amount)
        solids = self._as_pure(portion)
        if solids is not None:
            self._pure(portion, solids, amount, made)
        else:
            self._solution(portion, amount, key, made)
        if portion.pH is not None:
            self._state_pH(portion, made)
        return made

    def _draw(self, key: str, interval: Interval, nominal: float | None = None) -> Array:
        return self.ranges.draw(key, interval.low, interval.high, nominal)

    # --- pure things -------------------------------------------------------------------------------------------

    def _as_pure(self, portion: Portion) -> Substance | None:
        if len(portion.ingredients) != 1:
            return None
        item = portion.ingredients[0]
        if item.strength.unit != "neat" or not item.reference.startswith("substance:"):
            return None
        substance = self.index.substances[item.reference.split(":", 1)[1]]
        if portion.unit in ("g", "mol") and substance.state == "s":
            return substance
        if portion.unit in ("g", "mol") and substance.state != "aq":
            return substance if not self._sold_dilute(substance) else None
        if substance.state == "g" and portion.unit == "L":
            return substance if not self._sold_dilute(substance) else None
        if substance.state == "l" and not self._sold_dilute(substance):
            return substance
        return None

    def _sold_dilute(self, substance: Substance) -> bool:
        """Bought as a solution whose strength a label states (hydrochloric acid), so that the bare name leaves the strength open."""
        material = self.concentrated.get(substance.id)
        return material is not None and material.parts[0].typical / 100 < _PURE

    def _pure(self, portion: Portion, substance: Substance, amount: Array, made: MadeUp) -> None:
        item = portion.ingredients[0]
        molar = self.stock.molar_mass(substance.id) + item.hydrate * WATER_MOLAR_MASS
        density = substance.density.magnitude if substance.density is not None else None
        if portion.unit == "mol":
            moles = amount
        elif portion.unit == "g":
            moles = amount / molar
        elif substance.state == "g":
            moles = amount / MOLAR_VOLUME
        else:
            if density is None:
                density = UNKNOWN_LIQUID_DENSITY
                made.assumptions.append(f"{substance.name}: density unknown, {density} g/mL taken.")
            moles = amount * 1000 * density / molar
        grams = moles * molar
        self._put(substance, moles, made, hydrate=item.hydrate, companions=False)
        if set(self.stock.yield_of(substance.id)) != {WATER}:
            made.mixture.neat = {substance.id: self.heat.of_dissolving(substance.id, neat=True)}
        made.mixture.mass_g = made.mixture.mass_g + grams
        if substance.state != "g":
            made.mixture.volume_L = made.mixture.volume_L + grams / 1000 / (density or 2.0)

    def _put(self, substance: Substance, moles: Array, made: MadeUp, *, hydrate: float = 0.0, companions: bool) -> None:
        content = made.mixture
        brought = self.stock.yield_of(substance.id)
        if hydrate:
            brought = {**brought, WATER: brought.get(WATER, 0.0) + hydrate}
        for token, count in brought.items():
            content.amounts[token] = content.total(token) + count * moles
        content.labelled[substance.id] = content.labelled.get(substance.id, content.zeros()) + moles
        made.parts.append(
            (
                substance.id,
                dissolution_equation(substance, self.stock),
                {token: float(count * moles[0]) for token, count in brought.items()},
            )
        )
        if companions:
            for other, ratio in substance.companions.items():
                self._put(self.index.substances[other], moles * ratio, made, companions=False)

    # --- solutions ---------------------------------------------------------------------------------------------

    def _solution(self, portion: Portion, amount: Array, key: str, made: MadeUp) -> None:
        fractions: list[tuple[Substance, float, str, Array]] = []  # substance, hydrate, kind of figure, figure
        density_known: Array | None = None
        for item in portion.ingredients:
            if item.reference in ("unrecognised", "unknown"):
                made.unrecognised.append(item.words)
                continue
            kind, _, identity = item.reference.partition(":")
            if kind == "material":
                density_known = self._material(
                    self.index.materials[identity], item, key, made, fractions, alone=len(portion.ingredients) == 1
                )
            elif kind == "substance":
                substance = self.index.substances[identity]
                unit, figure = self._figure(substance, item, portion, made)
                fractions.append((substance, item.hydrate, unit, figure))
            else:
                made.unrecognised.append(item.words)
        litres, grams = self._bulk(portion, amount, fractions, density_known)
        solute = made.mixture.zeros()
        for substance, hydrate, unit, figure in fractions:
            moles = self._moles(substance, hydrate, unit, figure, litres, grams)
            self._put(substance, moles, made, hydrate=hydrate, companions=unit != "neat")
            solute = solute + moles * (self.stock.molar_mass(substance.id) + hydrate * WATER_MOLAR_MASS)
            for other, ratio in substance.companions.items():
                solute = solute + moles * ratio * self.stock.molar_mass(other)
        rest = np.maximum(grams - solute, 0.0)
        if portion.solvent == "substance:water":
            made.mixture.amounts[WATER] = made.mixture.total(WATER) + rest / WATER_MOLAR_MASS
        else:
            solvent = self.index.substances.get(portion.solvent.split(":", 1)[-1])
            if solvent is not None:  # an unknown solvent is among the unrecognised ingredients
                self._put(solvent, rest / self.stock.molar_mass(solvent.id), made, companions=False)
        made.mixture.volume_L = litres
        made.mixture.mass_g = grams

    def _figure(self, substance: Substance, item: Ingredient, portion: Portion, made: MadeUp) -> tuple[str, Array]:
        strength = item.strength
        name = f"strength of {item.words} in {portion.text}"
        if strength.value is not None and strength.unit not in ("concentrated", "dilute", "saturated", "unknown"):
            return strength.unit, self._draw(name, strength.value)
        material = self.concentrated.get(substance.id)
        solubility = self._saturation(substance)
        if strength.unit == "concentrated" and material is not None:
            part = material.parts[0]
            return "w/w", self._draw(name, Interval(low=part.low / 100, high=part.high / 100), part.typical / 100)
        if strength.unit in ("saturated", "concentrated"):
            if solubility is None:
                made.questions.append(f"How strong is the {item.words}? Its solubility is not in the graph.")
                solubility = 1000.0 * self.index.thresholds["unknown-strength-high"].value.magnitude / 10
            return "g/L of water", self._draw(name, Interval(low=solubility, high=solubility))
        if strength.unit == "dilute":
            low, high = (self.index.thresholds[f"dilute-{end}"].value.magnitude for end in ("low", "high"))
            made.assumptions.append(f"Dilute {substance.name}: {low:g} to {high:g} mol/L taken.")
            return "mol/L", self._draw(name, Interval(low=low, high=high))
        if strength.unit == "trace":
            return "w/w", self._draw(name, strength.value or Interval(low=0.0, high=0.001))
        made.questions.append(f"How strong is the {item.words} in '{portion.text}'?")
        if material is not None:
            top = material.parts[0].high / 100
            low = self.index.thresholds["dilute-low"].value.magnitude * self.stock.molar_mass(substance.id) / 1000
            return "w/w", self._draw(name, Interval(low=min(low, top), high=top))
        low, high = (self.index.thresholds[f"unknown-strength-{end}"].value.magnitude for end in ("low", "high"))
        if solubility is not None:
            high = min(high, solubility / self.stock.molar_mass(substance.id))
        return "mol/L", self._draw(name, Interval(low=min(low, high), high=high))

    def _saturation(self, substance: Substance) -> float | None:
        if (
            substance.solubility is None
            or not np.isfinite(substance.solubility.magnitude)
            or substance.solubility.magnitude >= 1e6
        ):
            return None
        return substance.solubility.magnitude

    def _material(
        self,
        material: Material,
        item: Ingredient,
        key: str,
        made: MadeUp,
        fractions: list[tuple[Substance, float, str, Array]],
        *,
        alone: bool,
    ) -> Array | None:
        stated = item.strength.value is not None
        for place, part in enumerate(material.parts):
            substance = self.index.substances[part.substance]
            if place == 0 and stated:
                unit, figure = self._figure(
                    substance,
                    item,
                    Portion(text=item.words, amount=Interval(low=1, high=1), unit="L", ingredients=(item,)),
                    made,
                )
                fractions.append((substance, 0.0, unit, figure))
                continue
            figure = self._draw(
                f"{substance.name} in {item.words} ({key})",
                Interval(low=part.low / 100, high=part.high / 100),
                part.typical / 100,
            )
            fractions.append((substance, 0.0, "w/w", figure))
        if material.balance != "water":
            taken = sum((figure for _, _, unit, figure in fractions if unit == "w/w"), made.mixture.zeros())
            fractions.append((self.index.substances[material.balance], 0.0, "w/w", np.maximum(1.0 - taken, 0.0)))
        if stated or not alone or material.density is None:
            return None
        return np.full(self.ranges.lanes, material.density.magnitude)

    def _grams_per_litre(self, substance: Substance, hydrate: float, unit: str, figure: Array, density: Array) -> Array:
        molar = self.stock.molar_mass(substance.id) + hydrate * WATER_MOLAR_MASS
        match unit:
            case "mol/L":
                return figure * molar
            case "eq/L":
                return figure * molar / self._valence(substance)
            case "g/L":
                return figure
            case "w/v":
                return figure * 1000
            case "v/v":
                own = substance.density.magnitude if substance.density is not None else UNKNOWN_LIQUID_DENSITY
                return figure * 1000 * own
            case "g/L of water":
                return figure / (1 + figure / 1000) * density
            case "mass ppm":
                return figure * 1e-6 * density * 1000
            case "neat":
                return density * 1000
        return figure * density * 1000  # w/w

    def _valence(self, substance: Substance) -> float:
        """Equivalents per mol of an acid or base; for a salt the charge of its cations."""
        protons = abs(self.stock.yield_of(substance.id).get(PROTON, 0.0))
        if protons:
            return protons
        charge = sum(
            count * self.index.species[token].charge
            for token, count in substance.yields.items()
            if token in self.index.species and self.index.species[token].charge > 0
        )
        return charge or 1.0

    def _bulk(
        self,
        portion: Portion,
        amount: Array,
        fractions: list[tuple[Substance, float, str, Array]],
        density: Array | None,
    ) -> tuple[Array, Array]:
        """Litres and grams of the whole solution; the density is found together with the mass fractions."""
        if density is None:
            density = np.full(self.ranges.lanes, WATER_DENSITY)
            if portion.solvent != "substance:water":
                solvent = self.index.substances.get(portion.solvent.split(":", 1)[-1])
                if solvent is not None and solvent.density is not None:
                    density = np.full(self.ranges.lanes, solvent.density.magnitude)
            base = density
            for _ in range(6):
                excess = np.zeros(self.ranges.lanes)
                for substance, hydrate, unit, figure in fractions:
                    fraction = np.clip(
                        self._grams_per_litre(substance, hydrate, unit, figure, density) / (1000 * density), 0.0, 1.0
                    )
                    excess = excess + self.density(substance.id, fraction) - WATER_DENSITY
                    for other, ratio in substance.companions.items():
                        share = fraction * ratio * self.stock.molar_mass(other) / self.stock.molar_mass(substance.id)
                        excess = excess + self.density(other, np.clip(share, 0, 1)) - WATER_DENSITY
                density = base + excess
        if portion.unit == "L":
            return amount, amount * 1000 * density
        if portion.unit == "g":
            return amount / 1000 / density, amount
        litres = amount * 0.018  # mol of a solution is no amount; the reader refuses it
        return litres, litres * 1000 * density

    def _moles(
        self, substance: Substance, hydrate: float, unit: str, figure: Array, litres: Array, grams: Array
    ) -> Array:
        molar = self.stock.molar_mass(substance.id) + hydrate * WATER_MOLAR_MASS
        density = np.divide(grams, 1000 * litres, out=np.full_like(grams, WATER_DENSITY), where=litres > 0)
        held = np.minimum(self._grams_per_litre(substance, hydrate, unit, figure, density), 1000 * density)
        return held * litres / molar

    # --- a pH on the label -------------------------------------------------------------------------------------

    def _state_pH(self, portion: Portion, made: MadeUp) -> None:
        assert portion.pH is not None
        target = self._draw(f"pH of {portion.text}", portion.pH)
        content = made.mixture
        if any(item.reference == "unknown" for item in portion.ingredients):
            low_side = portion.pH.high <= 7
            ceiling = self.index.thresholds["unknown-reserve"].value.magnitude
            token = self._of_class("unspecified-acid-reserve" if low_side else "unspecified-base-reserve")
            reserve = self._draw(f"reserve of acid or base in {portion.text}", Interval(low=0.0, high=ceiling), 0.0)
            content.amounts[token] = reserve * content.volume_L
            made.assumptions.append(
                f"'{portion.text}': its pH shows the free acid or base only; a hidden reserve of up to {ceiling:g} mol/L is allowed for."
            )
            made.questions.append(f"Titrate '{portion.text}': how much acid or base does it hold in all?")
        self._fit_protons(content, target)

    def _of_class(self, key: str) -> str:
        return next(token for token, species in self.index.species.items() if key in species.classes)

    def _fit_protons(self, content: Mixture, target: Array) -> None:
        """Set the proton excess so that the speciation has the pH of the label; a counter-ion that does nothing keeps it neutral."""
        if not self.ranges.fixed:
            return  # the first reading only lists the ranges
        known = content.total(PROTON)
        span = np.maximum(20.0 * content.volume_L, 1e-6)

        def with_excess(excess: Array) -> dict[str, Array]:
            amounts = {**content.amounts, PROTON: excess}
            charge = sum((self._charge(token) * amount for token, amount in amounts.items()), content.zeros())
            amounts[anion] = amounts.get(anion, content.zeros()) + np.maximum(charge, 0.0)
            amounts[cation] = amounts.get(cation, content.zeros()) + np.maximum(-charge, 0.0)
            return amounts

        def error(excess: Array) -> Array:
            return target - content.with_amounts(with_excess(excess)).pH  # rises with the excess

        anion, cation = self._of_class("unspecified-anion"), self._of_class("unspecified-cation")
        found = bracketed_root(error, known - span, known + span, tolerance=_PH_TOLERANCE)
        content.amounts = with_excess(found)

    def _charge(self, token: str) -> float:
        if token == PROTON:
            return 1.0
        record = self.index.species.get(token)
        return 0.0 if record is None else float(record.charge)
