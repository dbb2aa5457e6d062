"""From a sequence of treatments to a procedure with amounts: stoichiometry from the waste's own content, pH by the engine."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from math import ceil, floor, log10
from typing import Any, Protocol

import numpy as np

from carboy.bench.make_up import Bench
from carboy.bench.ranges import Ranges
from carboy.bench.walk import Walk
from carboy.chemistry.mixture import Mixture, poured_together
from carboy.chemistry.stock import PROTON, ChemicalStock
from carboy.model.knowledge import Index, Stage, Treatment
from carboy.model.plan import Case
from carboy.model.report import Report
from carboy.planning.liquid import hazards_of
from carboy.reasoning.binding import Surroundings
from carboy.reasoning.firing import Reactor
from carboy.text.portions import NameLookup, parse_portion

WASTE, TANK = "waste", "tank"
_SIZES = (0.1, 0.25, 0.5, 1, 2, 3, 5, 10, 15, 20, 30, 50, 75, 100, 150, 200, 300)  # L
_GRID = 48  # amounts tried at once when a pH is sought
_WATER_DENSITY = 0.997  # g/mL at 25 degC, CRC Handbook (from memory)
_ACID_ENOUGH = 2.0  # pH; what is more acid than this counts towards a dose of acid
_WITHIN = 0.2  # how far into a window of pH one goes
_CLOSE = 0.01  # how near the amount for a pH is sought
_LEAST = 1e-6  # mol of a reagent per litre of waste; below it there is nothing to dose
_LEAST_G, _LEAST_L = 0.02, 5e-5  # of a reagent per litre of waste; less can be neither weighed nor measured
_ROUNDS = 7  # how often the grid is closed in; each narrows it by its own number
_FINEST = 7  # figures of an amount, where fewer would miss a narrow window of pH
_DROPS = 20.0  # to a millilitre, common practice
_DROPWISE = 1e-3  # L; less is counted in drops
_LEFT_ALONE = "metal-sulfide"  # class of the solids that are filtered off before anything goes in
_SETTLED = 0.05  # g/L of solid at the end that calls for a filter
_ORDINALS = ("", "second ", "third ", "fourth ", "fifth ", "sixth ", "seventh ")


class Vetter(Protocol):
    """What is needed of the laboratory: it is above this layer."""

    index: Index

    @property
    def stock(self) -> ChemicalStock: ...
    @property
    def reactor(self) -> Reactor: ...
    @property
    def names(self) -> NameLookup: ...
    def walk(self, case: Case) -> Walk: ...
    def vet(self, case: Case, *, hold_points: bool = False) -> Report: ...


class CannotDo(Exception):
    """A treatment that cannot be carried out on this waste; the text says why."""


@dataclass
class Procedure:
    """A procedure in the making, as the mapping of a case file; ``origin`` has the treatment and the test of each step."""

    waste: str
    setting: Mapping[str, Any]
    material: str = "HDPE"
    slower: float = 1.0
    roomier: float = 1.0
    steps: list[dict[str, str]] = field(default_factory=list)
    origin: list[tuple[str, str]] = field(default_factory=list)
    words: list[str] = field(
        default_factory=list
    )  # how the amount of each step is said, where the case file is too exact
    vessels: list[str] = field(default_factory=lambda: [TANK])
    cakes: list[tuple[str, str]] = field(default_factory=list)  # vessel, treatment that filled it
    size_L: float = 1000.0
    content: Mixture | None = None  # of the vessel where the liquid is, after the steps so far
    fullest_L: float = 0.0

    @property
    def vessel(self) -> str:
        """Where the liquid is now."""
        return self.vessels[-1]

    def mapping(self, goals: list[str]) -> dict[str, Any]:
        """As a case file has it."""
        described = {"volume": f"{self.size_L:g} L", "material": self.material, "cover": "open"}
        return {
            "title": f"Treatment of {self.waste}",
            "setting": dict(self.setting),
            "bottles": {WASTE: self.waste},
            "vessels": {name: dict(described) for name in self.vessels},
            "steps": [dict(step) for step in self.steps],
            "goals": list(goals),
        }

    def add(self, step: dict[str, str], treatment: str = "", test: str = "", words: str = "") -> None:
        """One more step."""
        self.steps.append(step)
        self.origin.append((treatment, test))
        self.words.append(words)


class Builder:
    """Builds procedures for one waste."""

    def __init__(self, lab: Vetter, waste: str, setting: Mapping[str, Any]) -> None:
        self.lab = lab
        self.waste = waste
        self.setting = setting
        self._ranges = Ranges()
        self._waste = self._made_up()
        self._reagents: dict[str, tuple[Mixture, str]] = {}
        self.portions = (
            0  # in how many equal ones the waste would fit the bench, where a procedure was too large for it
        )

    def build(self, sequence: tuple[str, ...], *, slower: float = 1.0, roomier: float = 1.0) -> Procedure:
        """The procedure of a sequence of treatments. Raises CannotDo."""
        made = Procedure(self.waste, self.setting, slower=slower, roomier=roomier)
        treatments = [self.lab.index.treatments[key] for key in sequence]
        self._begin(made, treatments)
        for treatment in treatments:
            if self._idle(made, treatment):
                continue
            for stage in treatment.stages:
                self._stage(made, treatment, stage)
        self._settle(made)
        final = float(self.content(made).volume_L[0])
        largest = self.lab.index.thresholds["treatment-largest-batch"].value.magnitude
        if final > largest:
            raise self._too_large("takes", final, 1.1 * final / largest)
        room = self.lab.index.thresholds["treatment-free-space"].value.magnitude
        made.size_L = min(
            _size(roomier * room * made.fullest_L), max(_size(room * largest), _size(room * made.fullest_L))
        )
        return made

    def _too_large(self, verb: str, litres: float, share: float) -> CannotDo:
        """What is said of a procedure that is too large; ``share`` is how often the bench would have to hold it."""
        portions = max(ceil(share), 2)
        self.portions = min(self.portions or portions, portions)
        return CannotDo(f"it {verb} {litres:.3g} L, too much for one batch on the bench; {portions} portions may fit")

    def _idle(self, made: Procedure, treatment: Treatment) -> bool:
        """Whether a treatment finds nothing to do: none of what it doses by, or, where it doses by nothing, none of what it takes."""
        content = self.content(made)
        doses = [stage for stage in treatment.stages if stage.demands and stage.agent != PROTON]
        least = _LEAST * content.volume_L
        if not doses:
            # what has come down already but is still in the vessel counts: the filter of the treatment is for it
            suspended = any(
                np.any(content.total(token) > least)
                for key in treatment.takes
                for token in self.lab.index.hazards[key].species
            )
            return not suspended and not hazards_of(content, self.lab.stock) & set(treatment.takes)
        return not any(np.any(content.total(demand.species) > least) for stage in doses for demand in stage.demands)

    def waste_alone(self) -> Mixture:
        """The waste as it comes, reacted."""
        made = Procedure(self.waste, self.setting)
        self._put(made, self._waste)
        return self.content(made)

    def open_ranges(self) -> list[str]:
        """The uncertain numbers of the waste, in words."""
        return [f"{key} {low:.3g} to {high:.3g}" for key, (low, _, high) in self._ranges.variables.items()]

    def content(self, made: Procedure) -> Mixture:
        """What is in the vessel where the liquid is. The amounts are sought on this short form of the walk, in which each addition is one
        step to its end; what is offered is judged on the whole one."""
        assert made.content is not None
        return made.content

    def _made_up(self) -> Mixture:
        portion = parse_portion(self.waste, self.lab.names)
        Bench(self.lab.stock, self._ranges).make_up(portion, WASTE, 25.0)
        self._ranges.fix()
        return Bench(self.lab.stock, self._ranges).make_up(portion, WASTE, 25.0).mixture

    def _put(self, made: Procedure, added: Mixture) -> None:
        together = added if made.content is None else poured_together(made.content, added)
        self._react(made, together, "minutes")
        made.fullest_L = max(made.fullest_L, float(self.content(made).volume_L.max()))

    def _react(self, made: Procedure, content: Mixture, slowest: str) -> None:
        """React the content of an open vessel and let its bubbles go."""
        after, _ = self.lab.reactor.run(content.take(np.arange(content.lanes)), Surroundings(), slowest=slowest)
        amounts = dict(after.amounts)
        for token, left in after.gases.items():
            for component, count in self.lab.stock.components_of(token).items():
                amounts[component] = amounts.get(component, after.zeros()) - count * left
        amounts = {key: value if key == PROTON else np.maximum(value, 0.0) for key, value in amounts.items()}
        made.content = after.with_amounts(amounts)

    def _clear(self, made: Procedure) -> None:
        """Only the liquid goes on."""
        content = self.content(made)
        bound: dict[str, np.ndarray] = {}
        for token, amount in content.solids.items():
            for component, count in self.lab.stock.components_of(token).items():
                bound[component] = bound.get(component, content.zeros()) + count * amount
        for token, amount in content.aside.items():
            if self.lab.stock.species(token).phase == "s":
                bound[token] = amount
        amounts = {key: value - bound.get(key, 0.0) for key, value in content.amounts.items()}
        made.content = content.with_amounts(
            {key: value if key == PROTON else np.maximum(value, 0.0) for key, value in amounts.items()}
        )

    # --- the beginning: the waste, into water where it must be diluted

    def _begin(self, made: Procedure, treatments: list[Treatment]) -> None:
        made.add({"add": WASTE, "to": TANK})
        self._put(made, self._waste)
        content = self.content(made)
        volume = float(content.volume_L[0])
        factor = 1.0
        for treatment in treatments:
            for token, most in treatment.dilute_below.items():
                factor = max(factor, self._strength(content, token) / most)
        if factor > 1.02:
            largest = self.lab.index.thresholds["treatment-largest-batch"].value.magnitude
            if volume * factor > largest:
                raise self._too_large("asks for dilution to", volume * factor, 1.3 * volume * factor / largest)
            water = _round_up(volume * (factor - 1.0))
            made.steps.clear()
            made.origin.clear()
            made.words.clear()
            made.content = None
            unit, _ = self._reagent("water")
            self._put(made, self._scaled(unit, 1000.0 * water * _WATER_DENSITY))
            self._put(made, self._waste)
            made.add({"add": f"{_amount(water)} of water", "to": TANK})
            made.add(
                {"add": WASTE, "to": TANK, "over": f"{_minutes(20 * made.slower)} min"},
                "",
                "The wall of the vessel stays cool to the hand.",
            )
        if self._is_sulfide_sludge(self.content(made)):
            self._filter(made, "", "")

    def _is_sulfide_sludge(self, content: Mixture) -> bool:
        """Whether sulfides of metals stand in the waste: they are what a treatment would leave, and an oxidiser opens them again."""
        grams = content.zeros()
        for token, amount in content.solids.items():
            if _LEFT_ALONE in self.lab.stock.classes.get(token, frozenset()):
                grams = grams + amount * self.lab.stock.molar_mass(token)
        return bool(np.any(grams > _SETTLED * content.volume_L))

    def _strength(self, content: Mixture, token: str) -> float:
        """mol/L; of the proton: free acid or free base, whichever there is."""
        volume = max(float(content.volume_L[0]), 1e-9)
        if token == PROTON:
            pH = float(content.pH[0])
            free = 10.0**-pH + 10.0 ** (pH - 14.0)
            return min(free, abs(float(content.total(PROTON)[0])) / volume)
        return float(content.total(token)[0]) / volume

    # --- the stages of a treatment

    def _stage(self, made: Procedure, treatment: Treatment, stage: Stage) -> None:
        match stage.action:
            case "raise" | "lower":
                self._to_pH(made, treatment, stage)
            case "dose":
                self._dose(made, treatment, stage)
            case "stir" if "add" not in made.steps[-1] or made.origin[-1][0] != treatment.id:
                pass  # nothing of this treatment has gone in that it would mix
            case "stir" | "stand":
                self._react(made, self.content(made), _speed(stage.action, stage.minutes))
                made.add({stage.action: _time(stage.minutes), "in": made.vessel}, treatment.id, stage.test)
            case "filter":
                self._filter(made, treatment.id, stage.test)

    def _filter(self, made: Procedure, treatment: str, test: str) -> None:
        place = _ORDINALS[min(len(made.cakes), len(_ORDINALS) - 1)]
        cake, jug = f"{place}sludge", f"{place}jug"
        made.add({"filter": made.vessel, "cake": cake, "filtrate": jug}, treatment, test)
        self._clear(made)
        made.cakes.append((cake, treatment))
        made.vessels.append(jug)

    def _settle(self, made: Procedure) -> None:
        """A filter at the end where solid came down that no treatment was about (iron hydroxide of a neutralised pickle)."""
        content = self.content(made)
        grams = content.zeros()
        for token, amount in content.solids.items():
            grams = grams + amount * self.lab.stock.molar_mass(token)
        for token, amount in content.aside.items():
            if self.lab.stock.species(token).phase == "s":
                grams = grams + amount * self.lab.stock.molar_mass(token)
        if np.any(grams > _SETTLED * content.volume_L):
            self._react(made, content, "days")
            made.add({"stand": "12 h", "in": made.vessel})
            self._filter(made, "", "")

    def _dose(self, made: Procedure, treatment: Treatment, stage: Stage) -> None:
        content = self.content(made)
        # for the most that the stated ranges allow: too little treats nothing, and too much is judged by the vetting
        demands = (content.total(demand.species) * demand.mol_per_mol for demand in stage.demands)
        wanted = stage.excess * sum(demands, content.zeros())
        if stage.agent == PROTON:  # acid that is free already need not be brought
            wanted = wanted - np.maximum(content.volume_L * (10.0**-content.pH - 10.0**-_ACID_ENOUGH), 0.0)
        needed = float(np.max(wanted))
        if needed <= _LEAST * float(content.volume_L[0]):
            return
        unit, words = self._reagent(stage.reagent)
        per_unit = float(unit.total(stage.agent)[0])
        if per_unit <= 0:
            raise CannotDo(f"{stage.reagent} holds none of what is to be dosed")
        self._pour(made, treatment, stage, needed / per_unit, words)

    def _to_pH(self, made: Procedure, treatment: Treatment, stage: Stage) -> None:
        """The least amount that brings the pH well into the window: a grid of amounts, each solved for its equilibrium, closed in on twice."""
        assert stage.pH_low is not None
        assert stage.pH_high is not None
        content = self.content(made)
        up = stage.action == "raise"
        # within stated ranges for the one that needs most; whether the others bear it is judged by the vetting
        acid = content.total(PROTON)
        content = content.take(np.array([int(np.argmax(acid) if up else np.argmin(acid))]))
        inside = content.pH[0] >= stage.pH_low if up else content.pH[0] <= stage.pH_high
        if inside:
            return
        margin = _WITHIN * (stage.pH_high - stage.pH_low)
        aim = stage.pH_low + margin if up else stage.pH_high - margin
        unit, words = self._reagent(stage.reagent)
        litres = float(content.volume_L[0])
        low, high = 1e-6 * litres, (2000.0 if words == "g" else 5.0) * litres
        amounts = np.geomspace(low, high, _GRID)
        reached = np.nan
        for _ in range(_ROUNDS):
            pH = self._pH_after(content, unit, amounts)
            there = pH >= aim if up else pH <= aim
            if not there.any():
                raise CannotDo(f"{stage.reagent} does not bring the pH to {aim:.1f}")
            place = int(np.argmax(there))
            low, high, reached = (amounts[place - 1] if place else 0.0), float(amounts[place]), float(pH[place])
            if high - low < _CLOSE * high and stage.pH_low <= reached <= stage.pH_high:
                break
            amounts = np.linspace(low, high, _GRID)
        if reached > stage.pH_high + 0.3 if up else reached < stage.pH_low - 0.3:
            raise CannotDo(f"{stage.reagent} overshoots the window of pH {stage.pH_low:g} to {stage.pH_high:g}")
        if high > (_LEAST_G if words == "g" else _LEAST_L) * litres:
            self._pour(made, treatment, stage, self._fewest_figures(content, unit, high, stage, words), words)

    def _fewest_figures(self, content: Mixture, unit: Mixture, amount: float, stage: Stage, words: str) -> float:
        """The amount rounded as far as the pH stays in the window."""
        assert stage.pH_low is not None
        assert stage.pH_high is not None
        rounded = np.array([_rounded(amount, digits, words) for digits in range(3, _FINEST + 1)])
        pH = self._pH_after(content, unit, rounded)
        fits = (pH >= stage.pH_low) & (pH <= stage.pH_high)
        return float(rounded[int(np.argmax(fits))]) if fits.any() else amount

    def _pH_after(self, content: Mixture, unit: Mixture, amounts: np.ndarray) -> np.ndarray:
        together = poured_together(content.repeated(len(amounts)), unit.repeated(len(amounts)).scaled(amounts))
        together.neat = {}
        after, _ = self.lab.reactor.run(together, Surroundings(), slowest="minutes")
        return np.nan_to_num(after.pH, nan=7.0)

    def _pour(self, made: Procedure, treatment: Treatment, stage: Stage, amount: float, words: str) -> None:
        exact = stage.pH_low is not None
        digits = _FINEST if exact else 4
        text = f"{_amount(amount, digits) if words == 'L' else _grams(amount, digits)} of {stage.reagent}"
        step = {"add": text, "to": made.vessel}
        minutes = stage.minutes * made.slower
        said = ""
        if words == "L" and amount < _DROPWISE:
            minutes = min(minutes, _DROPS * amount * 1000 / 4)  # some four drops a minute
            said = f"{_amount(amount, 2)} ({max(1, round(_DROPS * 1000 * amount))} drops) of {stage.reagent}"
        elif exact:
            said = f"about {_amount(amount, 3) if words == 'L' else _grams(amount, 3)} of {stage.reagent}"
        if exact:
            said += f", to pH {stage.pH_low:g} to {stage.pH_high:g},"
        if minutes:
            step["over"] = f"{_minutes(minutes)} min"
        made.add(step, treatment.id, stage.test, said)
        unit, _ = self._reagent(stage.reagent)
        self._put(made, self._scaled(unit, amount))

    def _scaled(self, unit: Mixture, amount: float) -> Mixture:
        """So many units of a reagent, in as many lanes as the waste has."""
        return unit.repeated(self._waste.lanes).scaled(amount)

    def _reagent(self, label: str) -> tuple[Mixture, str]:
        """The content of one gram or one litre of a reagent, and the unit."""
        known = self._reagents.get(label)
        if known is None:
            solution = label[0].isdigit()
            portion = parse_portion(f"1 {'L' if solution else 'g'} of {label}", self.lab.names)
            if portion.unrecognised:
                raise CannotDo(f"the reagent '{label}' is not known")
            ranges = Ranges()
            Bench(self.lab.stock, ranges).make_up(portion, "reagent", 25.0)
            mixture = Bench(self.lab.stock, ranges).make_up(portion, "reagent", 25.0).mixture
            known = self._reagents[label] = (mixture.take(np.array([0])), "L" if solution else "g")
        return known


def _size(litres: float) -> float:
    """L of the least usual vessel that holds so much."""
    return next((size for size in _SIZES if size >= litres), _SIZES[-1])


def _speed(action: str, minutes: float) -> str:
    """The slowest reactions that go on, as the walk has it."""
    return "minutes" if action == "stir" or minutes < 30 else "hours" if minutes < 720 else "days"


def _rounded(value: float, digits: int, words: str) -> float:
    """As the text of the case has it: the same digits whether told in L or mL."""
    return (
        float(_figures(value, digits)) if words == "g" or value >= 1 else float(_figures(1000 * value, digits)) / 1000
    )


def _figures(value: float, digits: int) -> str:
    rounded = round(value, digits - 1 - floor(log10(abs(value)))) if value > 0 else 0.0
    text = f"{rounded:.10f}"
    return text.rstrip("0").rstrip(".") if "." in text else text


def _amount(litres: float, digits: int = 4) -> str:
    return f"{_figures(litres, digits)} L" if litres >= 1 else f"{_figures(1000 * litres, digits)} mL"


def _grams(grams: float, digits: int = 4) -> str:
    return f"{_figures(grams, digits)} g"


def _minutes(value: float) -> str:
    return f"{ceil(value):d}"


def _time(minutes: float) -> str:
    return f"{minutes / 60:g} h" if minutes >= 120 else f"{minutes:g} min"


def _round_up(litres: float) -> float:
    step = 10.0 ** (floor(log10(litres)) - 1)
    return ceil(litres / step - 1e-9) * step
