"""What might clear a finding: changes to try, the likeliest and smallest first. None of them is known to be sound yet."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator

import numpy as np

from carboy.bench.trace import StepTrace
from carboy.bench.walk import Walk
from carboy.chemistry.mixture import Mixture, poured_together
from carboy.chemistry.stock import ChemicalStock
from carboy.model.knowledge import RepairReagent
from carboy.model.plan import Add, Cover, Filter, Interval, Portion, Step, Temper, Transfer
from carboy.model.report import Finding
from carboy.planning import edits
from carboy.planning.amounts import Doser
from carboy.planning.edits import Variant
from carboy.text.portions import NameLookup

# First guesses of sizes and times. They judge nothing: each is vetted, and what does not clear the finding is not offered.
_DILUTIONS = (1.0, 4.0)  # litres of water for a litre
_SLOW = (1800.0, 14400.0)  # s
_SLOWER = (4.0, 16.0)  # times as long as it takes now
_LONGEST = 86400.0  # s
_WIDER = (2.0, 5.0)  # times as large
_COLD = 5.0  # degC, an ice bath
_REAGENT_TIME = 1800.0  # s
_PORTIONS = 5
_ROOM = 0.7  # a vessel is filled no further than this where a new one is chosen
_MATERIALS = 4  # how many other vessel materials are tried
_TO_BE_REMOVED = ("explosive", "fire", "toxic-product")  # not made safe by another pH or by water while both are there
_AFTERWARDS = 4  # how many later pours are tried before the step

Way = Callable[[Finding], Iterator[Variant]]


class Proposer:
    """Changes to one variant, by the findings on it and by what was in its vessels."""

    def __init__(self, variant: Variant, walk: Walk, stock: ChemicalStock, names: NameLookup, doser: Doser) -> None:
        self.variant = variant
        self.case = variant.case
        self.walk = walk
        self.stock = stock
        self.names = names
        self.doser = doser

    def against(self, finding: Finding) -> Iterator[Variant]:
        """Variants that may clear a finding."""
        for way in self._ways(finding):
            yield from way(finding)

    def _ways(self, finding: Finding) -> tuple[Way, ...]:
        if finding.kind == "pressure":
            return self._cover, self._later_pours, self._quench, self._wider
        if finding.moment == "storage":
            first: tuple[Way, ...] = (self._cover, self._later_pours, self._quench, self._neutralise, self._dilute)
            return (*self._upstream(finding), *first, self._material, self._wider)
        gas: tuple[Way, ...] = (
            self._exchange,
            self._later_pours,
            self._neutralise,
            self._quench,
            self._slower,
            self._aside,
            self._dilute,
            self._wider,
            self._cool,
        )
        ways: dict[str, tuple[Way, ...]] = {
            "toxic-gas": gas,
            "asphyxiant-gas": (self._slower, *gas),
            "flammable-gas": (self._slower, *gas),
            "oxygen": (self._slower, self._dilute, *gas),
            "heat": (self._exchange, self._slower, self._portions, self._dilute, self._aside, self._cool),
            "foam": (self._slower, self._wider, self._later_pours, self._exchange, self._dilute, self._aside),
            "remobilised": (self._filter, self._later_pours, self._exchange, self._quench, self._neutralise),
            "incomplete": (self._filter, self._later_pours, self._exchange, self._quench, self._neutralise),
            "attack": (self._material, self._neutralise),
        }
        other: tuple[Way, ...] = (
            self._exchange,
            self._later_pours,
            self._material,
            self._quench,
            self._aside,
            self._cool,
        )
        return ways.get(finding.kind, other)

    def _upstream(self, finding: Finding) -> tuple[Way, ...]:
        """What stands at the end was made earlier: a shortfall or a metal back in solution is mended where it came about."""
        return (self._filter, self._quench) if finding.kind in ("remobilised", "incomplete") else ()

    # --- what there is

    def _trace(self, finding: Finding) -> StepTrace:
        return self.walk.trace_of(finding.step, finding.vessel)

    def _pour(self, finding: Finding) -> tuple[int, Add] | None:
        """The step of the finding if it pours something into a vessel that holds something already."""
        place = finding.step - 1
        step = self.case.steps[place]
        trace = self.walk.trace_of(finding.step, finding.vessel)
        return (place, step) if isinstance(step, Add) and trace.before is not None and trace.added is not None else None

    def _capacity(self, vessel: str) -> float:
        spec = edits.spec_of(self.case, vessel)
        if spec is not None and spec.volume is not None:
            return spec.volume.low
        return float(self.walk.vessels[vessel].capacity_L[0]) if vessel in self.walk.vessels else math.inf

    def _with_room(self, variant: Variant, vessel: str, more_L: float) -> Variant:
        """The variant with a larger vessel where what is added would not go in."""
        most = max(
            (float(trace.after.volume_L.max()) for trace in self.walk.steps if trace.vessel == vessel), default=0
        )
        spec = edits.spec_of(variant.case, vessel)
        if spec is None or spec.volume is None or most + more_L <= spec.volume.low:
            return variant
        return edits.larger_vessel(variant, vessel, _vessel_size((most + more_L) / _ROOM))

    # --- order

    def _exchange(self, finding: Finding) -> Iterator[Variant]:
        found = self._pour(finding)
        if found is None:
            return
        place, step = found
        earlier = [one for one in edits.pours_into(self.case, step.to) if one < place]
        for one in (*earlier[-1:], *earlier[:1][: len(earlier) - 1]):
            yield edits.exchange(self.variant, one, place)

    def _later_pours(self, finding: Finding) -> Iterator[Variant]:
        place = finding.step - 1
        vessel = edits.vessel_of(self.case.steps[place])
        later = [one for one in edits.pours_into(self.case, vessel) if one > place]
        for one in later[:_AFTERWARDS]:
            yield edits.bring_forward(self.variant, one, place)

    # --- time, cold, room, cover

    def _slower(self, finding: Finding) -> Iterator[Variant]:
        place = finding.step - 1
        step = self.case.steps[place]
        if not isinstance(step, Add | Transfer) or self._trace(finding).before is None:
            return
        now = 0.0 if step.over is None else step.over.low
        times = {*_SLOW, *(min(now * factor, _LONGEST) for factor in _SLOWER)}
        for seconds in sorted(one for one in times if one > now):
            yield edits.slower(self.variant, place, seconds)

    def _cool(self, finding: Finding) -> Iterator[Variant]:
        found = self._pour(finding)
        if found is not None:
            place, step = found
            yield edits.insert(
                self.variant, place, [_cooling(step.to, _COLD)], f"Cool {step.to} to {_COLD:g} degC first.", 2.0
            )

    def _portions(self, finding: Finding) -> Iterator[Variant]:
        found = self._pour(finding)
        if found is None:
            return
        place, step = found
        cooling = _cooling(step.to, min(self.case.setting.temperature.low, 20.0))
        variant = edits.in_portions(self.variant, place, _PORTIONS, [cooling])
        if variant is not None:
            yield variant

    def _wider(self, finding: Finding) -> Iterator[Variant]:
        vessel = finding.vessel
        if edits.spec_of(self.case, vessel) is None:
            return
        for factor in _WIDER:
            yield edits.larger_vessel(self.variant, vessel, _vessel_size(factor * self._capacity(vessel)))

    def _cover(self, finding: Finding) -> Iterator[Variant]:
        seals = [
            place
            for place, step in enumerate(self.case.steps[: finding.step])
            if isinstance(step, Cover) and step.kind == "seal" and step.vessel == finding.vessel
        ]
        if seals:
            yield edits.not_sealed(self.variant, seals[-1], "vent")
            yield edits.not_sealed(self.variant, seals[-1], "open")
            return
        spec = edits.spec_of(self.case, finding.vessel)
        if spec is None or spec.cover == "open":
            return
        if spec.cover != "vented":
            yield edits.other_cover(self.variant, spec.name, "vented")
        yield edits.other_cover(self.variant, spec.name, "open")

    def _material(self, finding: Finding) -> Iterator[Variant]:
        spec = edits.spec_of(self.case, finding.vessel)
        if spec is None:
            return
        hardy = sorted(self.stock.index.containers.values(), key=lambda one: (len(one.attacks), one.id))
        for container in [one for one in hardy if one.id != spec.material][:_MATERIALS]:
            yield edits.other_material(self.variant, spec.name, container.id, container.name)

    # --- solids

    def _filter(self, finding: Finding) -> Iterator[Variant]:
        """A pour that opens the sludge again is done on the filtrate. Where the shortfall is only seen later, each pour before is tried."""
        vessel = finding.vessel
        last = finding.step - 1
        pours = [place for place in edits.pours_into(self.case, vessel) if place <= last]
        for place in reversed(pours[1:]):
            before = self.walk.trace_of(place + 1, vessel).before
            if before is None or not (before.solids or before.aside):
                continue
            filters = [
                later
                for later, step in enumerate(self.case.steps)
                if later > place and isinstance(step, Filter) and step.vessel == vessel and step.filtrate
            ]
            if filters:
                yield edits.after_filter(self.variant, place, filters[0])
            else:
                yield edits.filter_first(self.variant, place)

    # --- reagents

    def _reagents(self, serves: str) -> list[RepairReagent]:
        return [one for one in self.stock.index.repair_reagents if one.serves == serves]

    def _place_for_reagent(self, finding: Finding) -> tuple[int, str, Mixture, Mixture | None] | None:
        """Before which step, into which vessel, with what in it, and what the step then adds."""
        place = finding.step - 1
        step = self.case.steps[place]
        vessel = edits.vessel_of(step)
        trace = self.walk.trace_of(finding.step, vessel)
        if trace.before is None or not vessel or not trace.before.amounts:
            return None
        return place, vessel, trace.before, trace.added if isinstance(step, Add) else None

    def _neutralise(self, finding: Finding) -> Iterator[Variant]:
        spot = self._place_for_reagent(finding)
        if spot is None:
            return
        place, vessel, before, added = spot
        contents = [before] if added is None else [before, _together(before, added)]
        for serves, words in self._directions(before, added):
            for reagent in self._reagents(serves):
                amount = self.doser.to_pH(reagent, contents)
                if amount > 0:
                    yield from self._put_in(place, vessel, reagent, amount, before, words)

    def _directions(self, before: Mixture, added: Mixture | None) -> list[tuple[str, str]]:
        """Base where the vessel is acid or becomes so, acid where it is alkaline; both where neither is known."""
        base, acid = ("base", "to neutralise the acid"), ("acid", "to take up the base")
        sour = np.nanmin(np.append(before.pH, 7.0)) < 6.0
        if added is not None:
            sour = sour or np.nanmin(np.append(_together(before, added).pH, 7.0)) < 6.0
        return [base, acid] if sour else [acid, base]

    def _quench(self, finding: Finding) -> Iterator[Variant]:
        spot = self._place_for_reagent(finding)
        if spot is None:
            return
        place, vessel, before, _ = spot
        for reagent in self._reagents("quench"):
            amount = self.doser.to_quench(reagent, before)
            if amount > 0:
                yield from self._put_in(place, vessel, reagent, amount, before, "to take it away first")

    def _put_in(
        self, place: int, vessel: str, reagent: RepairReagent, amount: float, content: Mixture, purpose: str
    ) -> Iterator[Variant]:
        if not self._in_reason(reagent, amount, content):
            return
        portion = self.doser.portion(reagent, amount)
        over = Interval(low=_REAGENT_TIME, high=_REAGENT_TIME)
        pour = Add(portion=portion, to=vessel, over=over)
        words = f"Add {portion.text} over 30 min before {self._named(place)}, {purpose}."
        more = amount if reagent.measured_in == "L" else 0.0
        variant = edits.insert(self.variant, place, [pour], words, 3.0 + _share(amount, reagent, content))
        yield self._with_room(variant, vessel, more)

    def _in_reason(self, reagent: RepairReagent, amount: float, content: Mixture) -> bool:
        return math.isfinite(amount) and _share(amount, reagent, content) <= 10.0

    def _named(self, place: int) -> str:
        step = self.case.steps[place]
        if isinstance(step, Add):
            return f"{edits.spoken(step)} (step {place + 1})"
        return f"step {place + 1} ({step.kind} {edits.vessel_of(step)})"

    def _dilute(self, finding: Finding) -> Iterator[Variant]:
        spot = self._place_for_reagent(finding)
        if spot is None:
            return
        place, vessel, before, _ = spot
        for reagent in self._reagents("diluent"):
            for times in _DILUTIONS:
                litres = times * float(before.volume_L.max())
                portion = self.doser.portion(reagent, litres)
                words = f"Add {portion.text} before {self._named(place)}, to dilute what is there."
                pour = Add(portion=portion, to=vessel)
                variant = edits.insert(self.variant, place, [pour], words, 2.0 + 0.5 * times)
                yield self._with_room(variant, vessel, litres)

    def _aside(self, finding: Finding) -> Iterator[Variant]:
        """What is poured is made harmless in a vessel of its own before: quenched, neutralised, or run into water."""
        found = self._pour(finding)
        if found is None or found[1].source in self.walk.vessels:
            return
        place, _ = found
        added = self._trace(finding).added
        assert added is not None
        what = self._named(place)
        over = Interval(low=_REAGENT_TIME, high=_REAGENT_TIME)
        takes_away = self._reagents("quench")
        thins = finding.kind not in _TO_BE_REMOVED
        milder = [*self._reagents("base"), *self._reagents("acid")] if thins else []
        for reagent in (*takes_away, *milder):
            amount = (
                self.doser.to_quench(reagent, added)
                if reagent.serves == "quench"
                else self.doser.to_pH(reagent, [added])
            )
            if amount <= 0 or not self._in_reason(reagent, amount, added):
                continue
            portion = self.doser.portion(reagent, amount)
            words = f"Put {what} into an empty vessel first, add {portion.text} over 30 min there, and go on with that."
            yield self._beside(place, [], [Add(portion=portion, over=over)], portion, added, words)
        for reagent in self._reagents("diluent") if thins else []:
            for times in _DILUTIONS:
                portion = self.doser.portion(reagent, times * float(added.volume_L.max()))
                words = f"Run {what} into {portion.text} in a vessel of its own first, and go on with that."
                yield self._beside(place, [Add(portion=portion)], [], portion, added, words)

    def _beside(
        self, place: int, before: list[Add], after: list[Add], portion: Portion, added: Mixture, words: str
    ) -> Variant:
        more = portion.amount.high if portion.unit == "L" else portion.amount.high / 1000
        litres = _vessel_size((float(added.volume_L.max()) + more) / 0.5)
        variant = edits.in_a_side_vessel(self.variant, place, before, after, litres, words)
        return self._with_room(variant, edits.vessel_of(self.case.steps[place]), more)


def _together(before: Mixture, added: Mixture) -> Mixture:
    both = poured_together(before, added)
    both.neat = {}
    return both


def _cooling(vessel: str, degrees: float) -> Step:
    return Temper(kind="cool", vessel=vessel, to=Interval(low=degrees, high=degrees))


def _share(amount: float, reagent: RepairReagent, content: Mixture) -> float:
    """Litres or kilograms of reagent per litre of content."""
    return amount / (1.0 if reagent.measured_in == "L" else 1000.0) / max(float(content.volume_L.max()), 1e-3)


def _vessel_size(litres: float) -> float:
    """The next size of vessel up: 1, 2 or 5 in every decade."""
    decade = 10.0 ** math.floor(math.log10(litres))
    return next(float(f"{step * decade:.6g}") for step in (1.0, 2.0, 5.0, 10.0) if step * decade >= litres * (1 - 1e-9))
