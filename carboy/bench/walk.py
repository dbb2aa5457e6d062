"""Walks a plan step by step and yields what each step did."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from carboy.bench.follow import along, at_contact, contact_parcel, stored
from carboy.bench.make_up import Bench, MadeUp
from carboy.bench.ranges import Ranges
from carboy.bench.separation import LIQUID_IN_AID, LIQUID_IN_PAPER, LIQUID_OVER_SLUDGE, Separated, separated
from carboy.bench.trace import Course, LedgerPage, StepTrace
from carboy.bench.vessels import Pouring, VesselState
from carboy.chemistry.mixture import (
    ATMOSPHERE_KPA,
    GAS_CONSTANT_KPA,
    TRACE,
    Array,
    Mixture,
    empty,
    poured_together,
    water_vapour_kPa,
)
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.errors import InputError
from carboy.model.plan import (
    Absorbent,
    Add,
    Case,
    Check,
    Cover,
    Filter,
    Portion,
    Rinse,
    Step,
    Temper,
    Transfer,
    VesselSpec,
    Wait,
    Wipe,
)
from carboy.model.report import Stream
from carboy.reasoning.binding import Surroundings
from carboy.reasoning.equation import HYDROXIDE, side_words
from carboy.reasoning.firing import SPEEDS, Firing, Reactor
from carboy.reasoning.record import Record

_HOUR = 3600.0
_DAY = 24 * _HOUR
_SETTLES_IN = 0.5 * _HOUR  # of standing, so that a liquid can be drawn off its solids; common practice
_DEFAULT_ROOM = 2.0  # a vessel that is not described holds twice the final volume


@dataclass
class Walk:
    """A plan as walked: the steps, the record of causes, and what was assumed, asked and not recognised."""

    case: Case
    ranges: Ranges
    record: Record
    steps: list[StepTrace] = field(default_factory=list)
    vessels: dict[str, VesselState] = field(default_factory=dict)
    ledger: list[LedgerPage] = field(default_factory=list)  # before the first step, then after each
    assumptions: list[str] = field(default_factory=list)
    questions: list[str] = field(default_factory=list)
    unrecognised: list[str] = field(default_factory=list)
    aims: bool = True  # whether something is to be reached, as in a written procedure; two bottles poured together aim at nothing

    def trace_of(self, number: int, vessel: str = "") -> StepTrace:
        """What a step did, to ``vessel`` where it touched several; raises KeyError where there is no such step."""
        found = [trace for trace in self.steps if trace.number == number]
        if not found:
            raise KeyError(number)
        return next((trace for trace in found if trace.vessel == vessel), found[-1])

    @property
    def open_conversion(self) -> bool:
        """Whether a rule fired whose share of conversion is a range."""
        return any(
            firing.share[0] < firing.share[1]
            for trace in self.steps
            for course in (trace.path, trace.contact, trace.storage)
            if course is not None
            for firing in course.firings
        )


class Walker:
    """Walks cases over one stock of chemistry and one book of rules."""

    def __init__(
        self, stock: ChemicalStock, reactor: Reactor, progress: Callable[[int, int], None] | None = None
    ) -> None:
        self.stock = stock
        self.reactor = reactor
        self.progress = progress

    def walk(self, case: Case) -> Walk:
        """Every step in order. Raises InputError where a step cannot be carried out (an empty vessel, more than there is)."""
        ranges = Ranges()
        self._make_all(case, Bench(self.stock, ranges))
        ranges.fix()
        bench = Bench(self.stock, ranges)
        made = self._make_all(case, bench)
        walk = Walk(case, ranges, Record())
        for portion in made.values():
            walk.assumptions += portion.assumptions
            walk.questions += portion.questions
            walk.unrecognised += portion.unrecognised
        self._lay_out(case, walk, made)
        held = tuple(state.content for state in walk.vessels.values() if state.filled)
        walk.ledger.append(LedgerPage(0, "at the start", _contents(walk), held))
        for number, step in enumerate(case.steps, start=1):
            if self.progress is not None:
                self.progress(number, len(case.steps))
            already = len(walk.steps)
            self._step(number, step, walk, made)
            walk.ledger.append(_page(number, step, walk, walk.steps[already:]))
        for name in ("assumptions", "questions", "unrecognised"):
            setattr(walk, name, list(dict.fromkeys(getattr(walk, name))))
        return walk

    # --- preparation -------------------------------------------------------------------------------------------

    def _make_all(self, case: Case, bench: Bench) -> dict[str, MadeUp]:
        temperature = 0.5 * (case.setting.temperature.low + case.setting.temperature.high)
        made = {f"bottle {name}": bench.make_up(portion, name, temperature) for name, portion in case.bottles.items()}
        for number, step in enumerate(case.steps, start=1):
            portion = step.portion if isinstance(step, Add | Rinse) else None
            if portion is not None:
                made[f"step {number}"] = bench.make_up(portion, f"step {number}", temperature)
            if isinstance(step, Add | Transfer) and step.part is not None:
                bench.ranges.draw(f"part taken in step {number}", step.part.low, step.part.high)
        for vessel in case.vessels:
            for place, portion in enumerate(vessel.holds):
                made[f"vessel {vessel.name} {place}"] = bench.make_up(portion, vessel.name, temperature)
        return made

    def _lay_out(self, case: Case, walk: Walk, made: dict[str, MadeUp]) -> None:
        lanes = walk.ranges.lanes
        specs = list(case.vessels) or [VesselSpec(name="vessel")]
        volume = sum((portion.mixture.volume_L for portion in made.values()), np.zeros(lanes))
        for spec in specs:
            self._new_vessel(spec, walk, lanes, _DEFAULT_ROOM * volume)
            if spec.volume is None:
                walk.assumptions.append(
                    f"{spec.name.capitalize()}: no size is given; {_DEFAULT_ROOM * float(volume[0]):.3g} L, twice the final volume, is taken."
                )
            for place, portion in enumerate(spec.holds):
                state = walk.vessels[spec.name]
                self._join(
                    state,
                    made[f"vessel {spec.name} {place}"].mixture,
                    walk,
                    0,
                    portion,
                    made[f"vessel {spec.name} {place}"],
                )
        walk.assumptions.append(
            "The chemistry is that of 25 degC; heat is judged without loss to the vessel or the air."
        )

    def _new_vessel(self, spec: VesselSpec, walk: Walk, lanes: int, fallback_L: Array) -> VesselState:
        temperature = 0.5 * (walk.case.setting.temperature.low + walk.case.setting.temperature.high)
        capacity = (
            np.maximum(fallback_L, 1e-6)
            if spec.volume is None
            else walk.ranges.draw(f"volume of {spec.name}", spec.volume.low, spec.volume.low)
        )
        rating = None if spec.rating is None else np.full(lanes, spec.rating.low)
        state = VesselState(spec, empty(self.stock, lanes, temperature), capacity, rating, spec.cover)
        walk.vessels[spec.name] = state
        return state

    # --- steps -------------------------------------------------------------------------------------------------

    def _step(self, number: int, step: Step, walk: Walk, made: dict[str, MadeUp]) -> None:
        match step:
            case Add():
                self._add(number, step, walk, made)
            case Rinse():
                self._rinse(number, step, walk, made)
            case Wipe():
                self._wipe(number, step, walk)
            case Transfer():
                self._transfer(number, step, walk)
            case Filter():
                self._filter(number, step, walk)
            case Temper():
                state = self._vessel(step.vessel, walk)
                before = state.content
                state.content = before.take(np.arange(before.lanes))
                state.content.temperature_C = np.full(before.lanes, 0.5 * (step.to.low + step.to.high))
                state.settled = False  # it is stirred, or moves of itself
                self._stand(
                    number, f"{step.kind} to {step.to.high:g} degC", state, "minutes", None, walk, earlier=before
                )
            case Wait():
                self._wait(number, step, walk)
            case Cover():
                self._cover(number, step, walk)
            case Check():
                state = self._vessel(step.vessel, walk)
                self._note(number, f"check {step.text or step.quantity}", state, walk)

    def _vessel(self, name: str, walk: Walk) -> VesselState:
        if not name:
            return next(iter(walk.vessels.values()))
        state = walk.vessels.get(name)
        if state is None:
            raise InputError(f"there is no vessel '{name}' at this step", suggestions=tuple(walk.vessels))
        return state

    def _add(self, number: int, step: Add, walk: Walk, made: dict[str, MadeUp]) -> None:
        state = self._vessel(step.to, walk)
        if step.portion is not None:
            portion = made[f"step {number}"]
            text = step.portion.text
            pouring = Pouring(f"add {text}", portion.mixture, text, step.over, step.portion, portion)
            self._pour(number, state, pouring, walk)
        elif f"bottle {step.source}" in made:
            portion = made[f"bottle {step.source}"]
            content, label = portion.mixture, walk.case.bottles[step.source]
            if step.part is not None:
                content = content.scaled(self._share(number, step, content, walk))
            words = f"{step.source}: {label.text}"
            self._pour(number, state, Pouring(f"add {words}", content, words, step.over, label, portion), walk)
        else:
            target = step.to or state.spec.name
            unit = step.part_unit or "L"
            moved = Transfer(vessel=step.source, to=target, part=step.part, part_unit=unit, over=step.over)
            self._transfer(number, moved, walk)

    def _share(self, number: int, step: Add, content: Mixture, walk: Walk) -> Array:
        assert step.part is not None
        wanted = walk.ranges.draw(f"part taken in step {number}", step.part.low, step.part.high)
        whole = content.volume_L if step.part_unit == "L" else content.mass_g
        share = np.divide(wanted, whole, out=np.ones_like(wanted), where=whole > 0)
        if float(share[0]) > 1.0 + 1e-6:
            raise InputError(
                f"step {number} takes more from '{step.source}' than the {float(whole[0]):.3g} {step.part_unit} that it holds"
            )
        return np.minimum(share, 1.0)

    def _surroundings(self, state: VesselState, pour: int | None) -> Surroundings:
        material = self.stock.index.containers.get(state.spec.material)
        words = frozenset(
            {
                state.spec.material,
                *((material.name.lower(), *(word.lower() for word in material.synonyms)) if material else ()),
            }
        )
        return Surroundings(state.cover, state.spec.material, words, dict(state.pours), pour, dict(state.earlier))

    def _join(
        self,
        state: VesselState,
        content: Mixture,
        walk: Walk,
        number: int,
        portion: Portion | None,
        made: MadeUp | None,
    ) -> None:
        """Note where things come from before they are poured."""
        for token in (*content.amounts, *content.labelled):
            state.pours[token] = state.pours.get(token, frozenset()) | {number}
        if made is not None and portion is not None:
            whole = float(made.mixture.mass_g[0])
            part = float(content.mass_g[0]) / whole if whole > 0 else 1.0
            for identity, equation, tokens in made.parts:
                walk.record.poured(
                    state.spec.name,
                    portion.text
                    if len(made.parts) == 1
                    else f"{self.stock.index.substances[identity].name} in {portion.text}",
                    equation,
                    _brought(tokens, part),
                    number,
                )
            state.labels.append(portion.text)
            state.unknown = state.unknown or (bool(made.unrecognised) and portion.pH is None)
        if number == 0:
            state.content = poured_together(state.content, content) if state.filled else content

    def _pour(self, number: int, state: VesselState, pouring: Pouring, walk: Walk) -> None:
        added = pouring.content
        before = state.content if state.filled else None
        self._join(state, added, walk, number, pouring.portion, pouring.made)
        state.stood = "at once"
        state.settled = False
        surroundings = self._surroundings(state, number)
        sealed = state.cover == "sealed"
        path: Course | None = None
        contact: Course | None = None
        if before is None:
            start = added.take(np.arange(added.lanes))
            after, firings = self.reactor.run(start, self._surroundings(state, None))
            still = np.zeros(added.lanes)
            path = Course(after, start, firings, np.ones(1), still, start.temperature_C, capacity_kJ_K=still)
            self._record(firings, state, number, walk)
        else:
            if sealed:
                state.air_mol = self._air(state, before, also_L=added.volume_L)  # opened to pour, closed at once
            parcel = contact_parcel(before, added, self.stock.index.thresholds)
            path = along(
                before,
                added,
                self.reactor,
                surroundings,
                capacity_L=state.capacity_L if sealed else None,
                air_mol=state.air_mol,
                beside=parcel,
            )
            contact = at_contact(parcel, self.reactor, surroundings)
            after = _with_rest(path, before, added)
            after.temperature_C = np.minimum(path.reached_C[path.last()], 100.0)
            self._record(path.firings, state, number, walk)
        over_capacity = after.volume_L > state.capacity_L * (1 + 1e-6)
        over = pouring.over
        duration = None if over is None else np.full(after.lanes, over.low)  # the quickest that is allowed
        trace = self._trace(
            number,
            pouring.action,
            state,
            after,
            surroundings,
            walk,
            before=before,
            added=added,
            added_label=pouring.label,
            path=path,
            contact=contact,
            duration_s=duration,
            brought=added if pouring.fresh else None,
        )
        if over_capacity.any():
            trace.notes.append(
                f"{state.spec.name} overflows: {float(after.volume_L.max()):.3g} L in {float(state.capacity_L[0]):.3g} L"
            )
        self._settle(state, after, walk, trace)

    def _trace(
        self,
        number: int,
        action: str,
        state: VesselState,
        after: Mixture,
        surroundings: Surroundings,
        walk: Walk,
        **parts: Any,
    ) -> StepTrace:
        return StepTrace(
            number=number,
            action=action,
            vessel=state.spec.name,
            after=after,
            surroundings=surroundings,
            cover=state.cover,
            capacity_L=state.capacity_L,
            rating_kPa=state.rating_kPa,
            setting=walk.case.setting,
            unknown=state.unknown,
            **parts,
        )

    def leave(self, walk: Walk) -> None:
        """What goes on when the content of the last pour is left for days, beside what would go on in each part by itself."""
        trace = walk.steps[-1]
        if trace.added is None or trace.before is None or not trace.added.amounts:
            return
        state = walk.vessels[trace.vessel]
        surroundings = self._surroundings(state, None)
        whole = trace.after.take(np.arange(trace.after.lanes))
        trace.storage = stored(whole, self.reactor, surroundings, "days")
        self._record(trace.storage.firings, state, trace.number, walk)
        alone = Surroundings(surroundings.cover, surroundings.container, surroundings.container_words)
        poured = [
            one.added
            for one in walk.steps
            if one.vessel == trace.vessel and one.added is not None and one.added.amounts
        ]
        parts = [part.take(np.arange(part.lanes)) for part in poured]
        if whole.headspace_L is not None:
            for part in parts:
                part.headspace_L, part.air_mol = whole.headspace_L, whole.air_mol
        courses = [stored(part, self.reactor, alone, "days") for part in parts]
        trace.left_alone = tuple(course.mixture for course in courses)
        trace.left_firings = tuple(firing for course in courses for firing in course.firings)

    def _record(self, firings: list[Firing], state: VesselState, number: int, walk: Walk) -> None:
        for firing in firings:
            most = float(firing.extent.max())
            consumed: dict[str, float] = {}
            for token, count in firing.reaction.reactants:
                for component, inner in self.stock.components_of(token).items():
                    if component != WATER and inner > 0:
                        consumed[component] = consumed.get(component, 0.0) + count * inner * most
            made: dict[str, float] = {}
            for token, count in firing.reaction.products:
                for component, inner in self.stock.components_of(token).items():
                    if component not in (WATER, PROTON) and inner > 0:
                        made[component] = made.get(component, 0.0) + count * inner * most
            sides = (dict(firing.reaction.reactants), dict(firing.reaction.products))
            equation = " -> ".join(side_words(side, self.stock) for side in sides)
            shown = tuple(tuple(self.stock.label(token) for token in side) for side in sides)
            walk.record.fired(
                state.spec.name, firing.rule.id, equation, consumed, made, number, shown=(shown[0], shown[1])
            )

    def _settle(self, state: VesselState, after: Mixture, walk: Walk, trace: StepTrace) -> None:
        """End of a step: what bubbled out of an open vessel is gone; remember what was here."""
        trace.after = after
        walk.steps.append(trace)
        content = after
        if state.cover != "sealed" and after.gases:
            amounts = dict(after.amounts)
            for token, gas in after.gases.items():
                if np.any(gas > TRACE):
                    parts = self.stock.components_of(token)
                    left = gas
                    for (
                        component,
                        count,
                    ) in parts.items():  # rounding of the equilibrium must not take more than is there
                        if component != PROTON and count > 0:
                            left = np.minimum(left, np.maximum(amounts.get(component, after.zeros()), 0.0) / count)
                    for component, count in parts.items():
                        amounts[component] = amounts.get(component, after.zeros()) - count * left
                    trace.left[token] = left
            content = after.with_amounts(amounts)
        state.content = content = content.take(np.arange(content.lanes))
        for token in (*content.amounts, *after.solids, *content.labelled):
            state.earlier[token] = self.stock.classes.get(token, frozenset())
        for token, amount in after.aqueous.items():
            if self.stock.classes.get(token) and np.any(amount > TRACE):
                state.earlier[token] = self.stock.classes[token]
        if trace.unsettled:
            trace.notes.append("The equilibrium of this step did not converge over the whole of the stated ranges.")

    def _air(self, state: VesselState, content: Mixture, also_L: Array | float = 0.0) -> Array:
        """mol of air that a vessel shuts in when it is closed at one atmosphere."""
        room = np.maximum(state.capacity_L - content.volume_L - also_L, 0.0)
        kelvin = content.temperature_C + 273.15
        return (ATMOSPHERE_KPA - water_vapour_kPa(content.temperature_C)) * room / (GAS_CONSTANT_KPA * kelvin)

    def _stand(
        self,
        number: int,
        action: str,
        state: VesselState,
        slowest: str,
        duration: Array | None,
        walk: Walk,
        earlier: Mixture | None = None,
    ) -> None:
        """Leave a vessel to itself; ``earlier``: what it is to be compared with, where it was heated or cooled first."""
        surroundings = self._surroundings(state, None)
        before = state.content
        if SPEEDS.index(state.stood) >= SPEEDS.index(slowest):
            slowest = "at once"  # what takes that long has run its course already
        else:
            state.stood = slowest
        course = stored(before, self.reactor, surroundings, slowest) if state.filled else None
        if course is not None:
            self._record(course.firings, state, number, walk)
        after = before if course is None else course.mixture
        trace = self._trace(
            number,
            action,
            state,
            after,
            surroundings,
            walk,
            before=(earlier or before) if state.filled else None,
            storage=course,
            duration_s=duration,
            left_alone=(before,) if state.filled else (),
        )
        self._settle(state, after, walk, trace)

    def _note(self, number: int, action: str, state: VesselState, walk: Walk) -> None:
        surroundings = self._surroundings(state, None)
        before = state.content if state.filled else None
        walk.steps.append(self._trace(number, action, state, state.content, surroundings, walk, before=before))

    def _wait(self, number: int, step: Wait, walk: Walk) -> None:
        seconds = None if step.duration is None else step.duration.high
        slowest = "days"
        if step.kind == "stir" or seconds is None or seconds < 0.5 * _HOUR:
            slowest = "minutes"
        elif seconds < 0.5 * _DAY:
            slowest = "hours"
        words = step.kind if seconds is None else f"{step.kind} {_time_words(seconds)}"
        duration = None if seconds is None else np.full(walk.ranges.lanes, seconds)
        filled = [state for state in walk.vessels.values() if state.filled]
        for state in [self._vessel(step.vessel, walk)] if step.vessel or not filled else filled:
            state.settled = step.kind != "stir" and (seconds is None or seconds >= _SETTLES_IN or step.kind == "settle")
            self._stand(number, words, state, slowest, duration, walk)

    def _cover(self, number: int, step: Cover, walk: Walk) -> None:
        state = self._vessel(step.vessel, walk)
        if step.kind == "seal":
            state.cover = "sealed"
            state.air_mol = self._air(state, state.content)
            state.content = state.content.take(np.arange(state.content.lanes))
            state.content.headspace_L = np.maximum(state.capacity_L - state.content.volume_L, 1e-3)
            state.content.air_mol = state.air_mol
            self._stand(number, f"seal {state.spec.name}", state, "days", None, walk)
        else:
            state.cover = "open" if step.kind == "open" else "vented"
            state.air_mol = None
            state.content = state.content.take(np.arange(state.content.lanes))
            state.content.headspace_L = None
            state.content.air_mol = None
            self._stand(number, f"{step.kind} {state.spec.name}", state, "minutes", None, walk)

    def _transfer(self, number: int, step: Transfer, walk: Walk) -> None:
        source = self._vessel(step.vessel, walk)
        if not source.filled:
            raise InputError(f"step {number}: vessel '{step.vessel}' is empty")
        target = walk.vessels.get(step.to) or self._new_vessel(
            VesselSpec(name=step.to), walk, walk.ranges.lanes, source.capacity_L
        )
        if step.kind == "sample" and not target.filled:
            target.stream = "sample"
        whole = source.content.volume_L if step.part_unit == "L" else source.content.mass_g
        share = np.ones_like(whole)
        if step.part is not None:
            wanted = walk.ranges.draw(f"part taken in step {number}", step.part.low, step.part.high)
            share = np.minimum(wanted / np.maximum(whole, 1e-9), 1.0)
            if float(wanted[0]) > float(whole[0]) * (1 + 1e-6):
                walk.assumptions.append(
                    f"Step {number}: {float(wanted[0]):.3g} {step.part_unit} are wanted of {source.spec.name}, which holds "
                    f"{float(whole[0]):.3g} {step.part_unit}; all of it is taken."
                )
        elif step.heel is not None:
            share = np.clip(1.0 - step.heel.high / np.maximum(whole, 1e-9), 0.0, 1.0)
        moved = source.content.scaled(share)
        source.content = source.content.scaled(1.0 - share)
        walk.record.moved(source.spec.name, target.spec.name, tuple(moved.amounts))
        target.earlier.update(source.earlier)
        target.unknown = target.unknown or source.unknown
        for words, (grams, volume) in list(source.carriers.items()):
            part = float(share[0])
            own, more = target.carriers.get(words, (0.0, 0.0)), (grams * part, volume * part)
            target.carriers[words] = (own[0] + more[0], own[1] + more[1])
            source.carriers[words] = (grams - more[0], volume - more[1])
        action = f"transfer {source.spec.name} to {target.spec.name}"
        if step.kind == "sample":
            action = f"sample {source.spec.name}"
        self._pour(number, target, Pouring(action, moved, source.spec.name, step.over, None, None, fresh=False), walk)

    def _filter(self, number: int, step: Filter, walk: Walk) -> None:
        state = self._vessel(step.vessel, walk)
        if not state.filled:
            raise InputError(f"step {number}: vessel '{step.vessel}' is empty")
        content = state.content
        parts = self._separated(number, step, state, walk)
        names = (step.filtrate or f"{state.spec.name} filtrate", step.cake or f"{state.spec.name} cake")
        jug = self._receiver(names[0], "filtrate" if step.kind == "filter" else "decanted liquid", state, walk)
        holder = self._receiver(names[1], "cake", state, walk)
        state.content = empty(self.stock, content.lanes, float(content.temperature_C[0]))
        came_from, was_here = state.pours, dict(state.earlier)
        state.pours, state.earlier, state.labels = {}, {}, []
        carriers, state.carriers = state.carriers, {}
        deliveries = [(jug, parts.filtrate)]
        if step.first_runnings is not None:
            first, rest = _first_runnings(parts, step.first_runnings.low)
            beaker = self._receiver(step.runnings, "filtrate", state, walk) if step.runnings else jug
            deliveries = [(beaker, first), (jug, rest)]
        deliveries.append((holder, parts.sludge))
        for target, part in deliveries:
            target.content = part if not target.filled else poured_together(target.content, part)
            target.pours = {token: came_from.get(token, frozenset({number})) for token in part.amounts}
            target.unknown = target.unknown or state.unknown
            target.settled = False
            passed = {token: self.stock.classes.get(token, frozenset()) for token in (*part.amounts, *part.solids)}
            target.earlier = was_here if target is holder else passed
            walk.record.moved(state.spec.name, target.spec.name, tuple(part.amounts))
        holder.carriers.update(carriers)
        if step.aid is not None:
            self._carry(holder, step.aid, LIQUID_IN_AID, "filter aid")
        if step.paper is not None and parts.thrown_away.amounts:
            self._throw_away(number, state, step.waste, step.paper, parts.thrown_away, was_here, walk)
        surroundings = self._surroundings(jug, None)
        walk.steps.append(
            self._trace(
                number,
                f"{step.kind} {step.vessel} into {names[0]}",
                jug,
                jug.content,
                surroundings,
                walk,
                sludge=holder.content,
            )
        )

    def _separated(self, number: int, step: Filter, state: VesselState, walk: Walk) -> Separated:
        decanted = step.kind == "decant"
        retained = step.retained
        if decanted and retained is None:
            retained = LIQUID_OVER_SLUDGE
        floating = decanted and not state.settled and step.passes is None
        carried = state.carried_mL + _held_mL(step.aid, LIQUID_IN_AID)
        parts = separated(
            state.content,
            retained_mL_per_g=retained,
            passes=0.0 if step.passes is None else step.passes.high,
            carried_mL=carried,
            thrown_away_mL=_held_mL(step.paper, LIQUID_IN_PAPER),
            evenly=floating,
        )
        if floating and parts.passed.amounts:
            walk.assumptions.append(
                f"Step {number}: {state.spec.name} had not settled when it was decanted, so that its solids go over with the liquid in "
                "equal measure; let it settle first."
            )
        if step.aid is not None:
            walk.assumptions.append(_held_words(number, step.aid, LIQUID_IN_AID, "filter aid", "the cake"))
        if step.paper is not None:
            walk.assumptions.append(_held_words(number, step.paper, LIQUID_IN_PAPER, "paper", step.waste))
        if decanted and step.retained is None and not floating and parts.sludge.volume_L.max() > 0:
            walk.assumptions.append(
                f"Step {number}: a settled sludge keeps {LIQUID_OVER_SLUDGE:g} mL of liquid per g of solid (common practice), at most half."
            )
        return parts

    def _receiver(self, name: str, stream: Stream, source: VesselState, walk: Walk) -> VesselState:
        """The vessel that a stream goes to; a new one where there is none of this name."""
        target = walk.vessels.get(name) or self._new_vessel(
            VesselSpec(name=name), walk, walk.ranges.lanes, source.capacity_L
        )
        if not target.filled and target is not source:
            target.stream = stream
        return target

    def _carry(self, holder: VesselState, dry: Absorbent, usual: float, words: str) -> None:
        grams, volume = holder.carriers.get(dry.words or words, (0.0, 0.0))
        holder.carriers[dry.words or words] = (grams + dry.grams, volume + _held_mL(dry, usual))

    def _throw_away(
        self,
        number: int,
        source: VesselState,
        name: str,
        dry: Absorbent,
        content: Mixture,
        earlier: dict[str, frozenset[str]],
        walk: Walk,
    ) -> None:
        """What something dry has taken up, as a stream of its own: the bin it goes to is, for its liquid, made of it."""
        place = walk.vessels.get(name) or self._new_vessel(
            VesselSpec(name=name, material=dry.material or "glass"), walk, walk.ranges.lanes, source.capacity_L
        )
        if not place.filled:
            place.stream = "contaminated solid"
        self._carry(place, dry, LIQUID_IN_PAPER, "paper")
        walk.record.moved(source.spec.name, place.spec.name, tuple(content.amounts))
        place.earlier.update(earlier)
        place.unknown = place.unknown or source.unknown
        action = f"{dry.words or 'paper'} from {source.spec.name} to {name}"
        self._pour(number, place, Pouring(action, content, source.spec.name, None, None, None, fresh=False), walk)

    def _wipe(self, number: int, step: Wipe, walk: Walk) -> None:
        state = self._vessel(step.vessel, walk)
        if not state.filled:
            raise InputError(f"step {number}: vessel '{step.vessel}' is empty")
        volume_mL = np.maximum(1000 * state.content.volume_L, 1e-6)
        share = np.minimum(_held_mL(step.absorbent, LIQUID_IN_PAPER) / volume_mL, 1.0)
        taken = state.content.scaled(share)
        state.content = state.content.scaled(1.0 - share)
        if np.all(share >= 1.0):
            state.content = empty(self.stock, walk.ranges.lanes, float(state.content.temperature_C[0]))
        walk.assumptions.append(_held_words(number, step.absorbent, LIQUID_IN_PAPER, "paper", step.to))
        self._throw_away(number, state, step.to, step.absorbent, taken, dict(state.earlier), walk)

    def _rinse(self, number: int, step: Rinse, walk: Walk, made: dict[str, MadeUp]) -> None:
        state = self._vessel(step.vessel, walk)
        portion, text = made[f"step {number}"], step.portion.text
        words = f"{step.kind} {state.spec.name} with {text}" if step.to else f"{step.kind} with {text}"
        self._pour(number, state, Pouring(words, portion.mixture, text, None, step.portion, portion), walk)
        if not step.to:
            return
        content = state.content
        parts = separated(content, retained_mL_per_g=step.retained, carried_mL=state.carried_mL)
        target = self._receiver(step.to, "washings", state, walk)
        state.content = parts.sludge
        walk.record.moved(state.spec.name, target.spec.name, tuple(parts.clear.amounts))
        target.unknown = target.unknown or state.unknown
        target.earlier.update(
            {token: self.stock.classes.get(token, frozenset()) for token in (*parts.clear.amounts, *parts.clear.solids)}
        )
        action = f"washings of {state.spec.name} to {target.spec.name}"
        self._pour(number, target, Pouring(action, parts.clear, state.spec.name, None, None, None, fresh=False), walk)


def _held_mL(dry: Absorbent | None, usual: float) -> float:
    return 0.0 if dry is None else dry.grams * (usual if dry.holds is None else dry.holds)


def _held_words(number: int, dry: Absorbent, usual: float, words: str, place: str) -> str:
    per_gram = usual if dry.holds is None else dry.holds
    basis = "common practice" if dry.holds is None else "as the case says"
    return (
        f"Step {number}: {dry.grams:g} g of {dry.words or words} takes {_held_mL(dry, usual):.3g} mL of liquid along to {place} "
        f"({per_gram:g} mL per g, {basis})."
    )


def _first_runnings(parts: Separated, litres: float) -> tuple[Mixture, Mixture]:
    """The first ``litres`` of a filtrate, with all that has passed, and the clear rest."""
    share = np.minimum(litres / np.maximum(parts.clear.volume_L, 1e-9), 1.0)
    first = parts.clear.scaled(share)
    if parts.passed.amounts:
        first = poured_together(first, parts.passed)
    return first, parts.clear.scaled(1.0 - share)


def _with_rest(path: Course, before: Mixture, added: Mixture) -> Mixture:
    """The vessel at the end of a path, with what still lies undissolved in it."""
    after = path.mixture.take(path.last())
    if path.dissolved_share is not None:
        rest = 1.0 - path.dissolved_share[path.last()]
        if np.any(rest > 0):
            for part in (before, added):
                if part.neat:
                    for token, amount in part.amounts.items():
                        after.amounts[token] = after.total(token) + rest * amount
                    for name, amount in part.labelled.items():
                        after.labelled[name] = after.labelled.get(name, after.zeros()) + rest * amount
                    after.volume_L = after.volume_L + rest * part.volume_L
                    after.mass_g = after.mass_g + rest * part.mass_g
    return after


def _contents(walk: Walk) -> dict[str, Mixture]:
    return {name: state.content for name, state in walk.vessels.items() if state.filled}


def _page(number: int, step: Step, walk: Walk, traces: list[StepTrace]) -> LedgerPage:
    left: dict[str, Array] = {}
    for trace in traces:
        for token, amount in trace.left.items():
            left[token] = left[token] + amount if token in left else amount
    brought = tuple(trace.brought for trace in traces if trace.brought is not None)
    main = traces[0 if isinstance(step, Rinse) else -1]  # paper goes first, washings last
    return LedgerPage(number, main.action, _contents(walk), brought, left)


def _brought(tokens: dict[str, float], part: float) -> dict[str, float]:
    """What ``part`` of a labelled substance brings, with protons that it takes away told as hydroxide that it brings."""
    brought = {token: part * count for token, count in tokens.items() if token != WATER and count > 0}
    if tokens.get(PROTON, 0.0) < 0:
        brought[HYDROXIDE] = -part * tokens[PROTON]
    return brought


def _time_words(seconds: float) -> str:
    for size, unit in ((_DAY, "d"), (_HOUR, "h"), (60.0, "min")):
        if seconds >= size:
            return f"{seconds / size:g} {unit}"
    return f"{seconds:g} s"
