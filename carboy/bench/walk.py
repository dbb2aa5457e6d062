"""Walks a plan step by step and yields what each step did."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from carboy.bench.follow import along, at_contact, contact_parcel, stored
from carboy.bench.make_up import Bench, MadeUp
from carboy.bench.ranges import Ranges
from carboy.bench.separation import separated
from carboy.bench.trace import Course, StepTrace
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
)
from carboy.reasoning.binding import Surroundings
from carboy.reasoning.equation import HYDROXIDE, side_words
from carboy.reasoning.firing import SPEEDS, Firing, Reactor
from carboy.reasoning.record import Record

_HOUR = 3600.0
_DAY = 24 * _HOUR
_DEFAULT_ROOM = 2.0  # a vessel that is not described holds twice the final volume


@dataclass
class Walk:
    """A plan as walked: the steps, the record of causes, and what was assumed, asked and not recognised."""

    case: Case
    ranges: Ranges
    record: Record
    steps: list[StepTrace] = field(default_factory=list)
    vessels: dict[str, VesselState] = field(default_factory=dict)
    assumptions: list[str] = field(default_factory=list)
    questions: list[str] = field(default_factory=list)
    unrecognised: list[str] = field(default_factory=list)
    aims: bool = True  # whether something is to be reached, as in a written procedure; two bottles poured together aim at nothing

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
        for number, step in enumerate(case.steps, start=1):
            if self.progress is not None:
                self.progress(number, len(case.steps))
            self._step(number, step, walk, made)
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
                state = self._vessel(step.vessel, walk)
                portion = made[f"step {number}"]
                text = step.portion.text
                self._pour(
                    number,
                    state,
                    Pouring(f"rinse with {text}", portion.mixture, text, None, step.portion, portion),
                    walk,
                )
            case Transfer():
                self._transfer(number, step, walk)
            case Filter():
                self._filter(number, step, walk)
            case Temper():
                state = self._vessel(step.vessel, walk)
                before = state.content
                state.content = before.take(np.arange(before.lanes))
                state.content.temperature_C = np.full(before.lanes, 0.5 * (step.to.low + step.to.high))
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
            self._transfer(number, Transfer(vessel=step.source, to=target, part=step.part, over=step.over), walk)

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
            for token, left in after.gases.items():
                if np.any(left > TRACE):
                    for component, count in self.stock.components_of(token).items():
                        amounts[component] = amounts.get(component, after.zeros()) - count * left
            amounts = {token: value if token == PROTON else np.maximum(value, 0.0) for token, value in amounts.items()}
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
        whole = source.content.volume_L
        share = np.ones_like(whole)
        if step.part is not None:
            wanted = walk.ranges.draw(f"part taken in step {number}", step.part.low, step.part.high)
            share = np.minimum(wanted / np.maximum(whole, 1e-9), 1.0)
        elif step.heel is not None:
            share = np.clip(1.0 - step.heel.high / np.maximum(whole, 1e-9), 0.0, 1.0)
        moved = source.content.scaled(share)
        source.content = source.content.scaled(1.0 - share)
        walk.record.moved(source.spec.name, target.spec.name, tuple(moved.amounts))
        target.earlier.update(source.earlier)
        target.unknown = target.unknown or source.unknown
        action = f"transfer {source.spec.name} to {target.spec.name}"
        self._pour(number, target, Pouring(action, moved, source.spec.name, step.over, None, None), walk)

    def _filter(self, number: int, step: Filter, walk: Walk) -> None:
        state = self._vessel(step.vessel, walk)
        if not state.filled:
            raise InputError(f"step {number}: vessel '{step.vessel}' is empty")
        content = state.content
        passes = 0.0 if step.passes is None else step.passes.high
        clear, sludge = separated(content, retained_mL_per_g=step.retained, passes=passes)
        filtrate_name = step.filtrate or f"{state.spec.name} filtrate"
        cake_name = step.cake or f"{state.spec.name} cake"
        spec = walk.vessels.get(filtrate_name)
        jug = spec or self._new_vessel(VesselSpec(name=filtrate_name), walk, walk.ranges.lanes, state.capacity_L)
        holder = walk.vessels.get(cake_name) or self._new_vessel(
            VesselSpec(name=cake_name), walk, walk.ranges.lanes, state.capacity_L
        )
        state.content = empty(self.stock, content.lanes, float(content.temperature_C[0]))
        came_from, was_here = state.pours, dict(state.earlier)
        state.pours, state.earlier, state.labels = {}, {}, []
        for target, part in ((jug, clear), (holder, sludge)):
            target.content = part if not target.filled else poured_together(target.content, part)
            target.pours = {token: came_from.get(token, frozenset({number})) for token in part.amounts}
            target.unknown = target.unknown or state.unknown
            walk.record.moved(state.spec.name, target.spec.name, tuple(part.amounts))
        jug.earlier = {token: self.stock.classes.get(token, frozenset()) for token in (*clear.amounts, *clear.solids)}
        holder.earlier = was_here
        surroundings = self._surroundings(jug, None)
        walk.steps.append(
            self._trace(
                number,
                f"{step.kind} {step.vessel} into {filtrate_name}",
                jug,
                jug.content,
                surroundings,
                walk,
                sludge=holder.content,
            )
        )


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
