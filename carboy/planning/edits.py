"""Changes to a written procedure: each takes a case and gives another one, with words for the bench on what is different.

Steps are counted from 0 here and from 1 in words. An edit judges nothing; whether what comes out is sound is for the reader of case
files and for the engine.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Literal

from carboy.model.plan import Add, Case, Check, Cover, Filter, Goal, Interval, Rinse, Step, Transfer, VesselSpec
from carboy.text.case_writer import quantity_text, with_vessel

CoverWord = Literal["open", "loose", "vented", "sealed"]


@dataclass(frozen=True)
class Change:
    """One thing that is done otherwise: words for the bench, and how large a change it is (1 for a step that changes its place)."""

    words: str
    size: float


@dataclass(frozen=True)
class Variant:
    """A case with what was changed to get it, in that order."""

    case: Case
    changes: tuple[Change, ...] = ()

    def changed(self, case: Case, words: str, size: float) -> Variant:
        """The next variant."""
        return Variant(case, (*self.changes, Change(words, size)))

    @property
    def size(self) -> float:
        """How much is changed in all."""
        return sum(change.size for change in self.changes)


def spoken(step: Step) -> str:
    """What a step handles: the label of a pour, the name of a bottle, or the vessel."""
    match step:
        case Add(portion=None, part=None):
            return step.source
        case Add(portion=None):
            assert step.part is not None
            return f"{quantity_text(step.part, 'g' if step.part_unit == 'g' else 'L')} from {step.source}"
        case Add() | Rinse():
            return step.portion.text if step.portion is not None else ""
        case _:
            return step.vessel


def with_steps(case: Case, steps: Sequence[Step]) -> Case:
    """The same case with other steps; what was expected of the old ones is dropped."""
    return case.model_copy(update={"steps": tuple(steps), "expect": ()})


def with_vessel_spec(case: Case, name: str, **changes: Any) -> Case:
    """The same case with something changed about one vessel."""
    vessels = tuple(spec.model_copy(update=changes) if spec.name == name else spec for spec in case.vessels)
    return case.model_copy(update={"vessels": vessels, "expect": ()})


def spec_of(case: Case, vessel: str) -> VesselSpec | None:
    """The description of a vessel; None for one that a filter makes."""
    return next((spec for spec in case.vessels if spec.name == vessel), None)


def vessel_of(step: Step) -> str:
    """The vessel that a step works on: for a pour the one that receives it."""
    return step.to if isinstance(step, Add | Transfer) else step.vessel


def pours_into(case: Case, vessel: str) -> list[int]:
    """The steps that add something to a vessel."""
    return [place for place, step in enumerate(case.steps) if isinstance(step, Add) and step.to == vessel]


def exchange(variant: Variant, first: int, second: int) -> Variant:
    """Two pours change places; the time that the later one may take stays with the place, as the first goes into a vessel with nothing
    to react with."""
    steps = list(variant.case.steps)
    one, two = steps[first], steps[second]
    assert isinstance(one, Add)
    assert isinstance(two, Add)
    steps[first] = two.model_copy(update={"over": one.over})
    steps[second] = one.model_copy(update={"over": two.over if two.over is not None else one.over})
    words = f"Pour {spoken(two)} first and {spoken(one)} after it (steps {first + 1} and {second + 1} change places)."
    return variant.changed(with_steps(variant.case, steps), words, 1.0)


def bring_forward(variant: Variant, later: int, before: int) -> Variant:
    """A later pour is done before an earlier step."""
    steps = list(variant.case.steps)
    moved = steps.pop(later)
    words = f"Add {spoken(moved)} (step {later + 1}) before {spoken(steps[before])} (step {before + 1})."
    steps.insert(before, moved)
    return variant.changed(with_steps(variant.case, steps), words, 1.0 + 0.1 * (later - before))


def insert(variant: Variant, place: int, new: Sequence[Step], words: str, size: float) -> Variant:
    """New steps before a step."""
    steps = list(variant.case.steps)
    steps[place:place] = new
    return variant.changed(with_steps(variant.case, steps), words, size)


def slower(variant: Variant, place: int, seconds: float) -> Variant:
    """A pour takes longer."""
    steps = list(variant.case.steps)
    step = steps[place]
    assert isinstance(step, Add | Transfer)
    over = Interval(low=seconds, high=seconds)
    steps[place] = step.model_copy(update={"over": over})
    words = f"Add {spoken(step)} (step {place + 1}) over {quantity_text(over, 's')}."
    return variant.changed(with_steps(variant.case, steps), words, 1.5)


def larger_vessel(variant: Variant, vessel: str, litres: float) -> Variant:
    """A vessel of another size."""
    volume = Interval(low=litres, high=litres)
    words = f"Take a vessel of {quantity_text(volume, 'L')} for {vessel}."
    return variant.changed(with_vessel_spec(variant.case, vessel, volume=volume), words, 2.0)


def other_cover(variant: Variant, vessel: str, cover: CoverWord) -> Variant:
    """A vessel that stands open, or under another cover, from the start."""
    words = f"Leave {vessel} open." if cover == "open" else f"Give {vessel} a {cover} cover."
    return variant.changed(with_vessel_spec(variant.case, vessel, cover=cover), words, 1.0)


def not_sealed(variant: Variant, place: int, kind: Literal["vent", "open"]) -> Variant:
    """A vessel is vented or left open in the step that would seal it."""
    steps = list(variant.case.steps)
    step = steps[place]
    vessel = vessel_of(step)
    words = f"Put a vented cap on {vessel}" if kind == "vent" else f"Leave {vessel} open"
    words += f" instead of sealing it (step {place + 1})."
    steps[place] = Cover(kind=kind, vessel=vessel)
    return variant.changed(with_steps(variant.case, steps), words, 1.0)


def other_material(variant: Variant, vessel: str, material: str, name: str) -> Variant:
    """A vessel of another material."""
    return variant.changed(
        with_vessel_spec(variant.case, vessel, material=material), f"Take a vessel of {name} for {vessel}.", 2.0
    )


def elsewhere(step: Step, old: str, new: str) -> Step:
    """The step done on another vessel."""
    changes: dict[str, Any] = {}
    if isinstance(step, Add):
        changes = {key: new for key in ("to", "source") if getattr(step, key) == old}
    elif isinstance(step, Transfer):
        changes = {key: new for key in ("to", "vessel") if getattr(step, key) == old}
    elif step.vessel == old:
        changes["vessel"] = new
        if isinstance(step, Check):
            changes["text"] = with_vessel(step.text, old, new)
    return step.model_copy(update=changes) if changes else step


def after_filter(variant: Variant, place: int, filtering: int) -> Variant:
    """A pour into a vessel is done on the filtrate, after the filter step that comes later anyway."""
    steps = list(variant.case.steps)
    step, filter_step = steps[place], steps[filtering]
    assert isinstance(filter_step, Filter)
    moved = elsewhere(step, filter_step.vessel, filter_step.filtrate)
    del steps[place]
    steps.insert(filtering, moved)
    words = (
        f"Add {spoken(step)} (step {place + 1}) only after the {filter_step.kind}ing, to the clear liquid in "
        f"{filter_step.filtrate}."
    )
    return variant.changed(with_steps(variant.case, steps), words.replace("decanting", "decanting off"), 1.5)


def filter_first(variant: Variant, place: int) -> Variant:
    """The vessel is filtered before a step, and everything from there on is done to the filtrate; the goals go with it."""
    case = variant.case
    vessel = vessel_of(case.steps[place])
    clear, cake = free_name(case, f"{vessel} filtrate"), free_name(case, f"{vessel} sludge")
    later = [elsewhere(step, vessel, clear) for step in case.steps[place:]]
    sieve = Filter(kind="filter", vessel=vessel, cake=cake, filtrate=clear)
    goals = tuple(_moved_goal(goal, vessel, clear) for goal in case.goals)
    steps = [*case.steps[:place], sieve, *later]
    words = (
        f"Filter {vessel} before {spoken(case.steps[place])} (step {place + 1}), and go on with the clear liquid only."
    )
    return variant.changed(with_steps(case, steps).model_copy(update={"goals": goals}), words, 3.0)


def _moved_goal(goal: Goal, old: str, new: str) -> Goal:
    if goal.vessel != old:
        return goal
    text = with_vessel(goal.text, old, new)
    return goal.model_copy(update={"vessel": new, "text": text})


def in_a_side_vessel(
    variant: Variant, place: int, before: Sequence[Add], after: Sequence[Add], litres: float, words: str
) -> Variant:
    """What a step pours is first put into an empty vessel of its own, after ``before`` and followed by ``after`` (whose ``to`` is set
    here), and goes on from there. ``litres`` is the size of that vessel."""
    case = variant.case
    step = case.steps[place]
    assert isinstance(step, Add)
    side = free_name(case, "side vessel")
    main = spec_of(case, step.to)
    spec = VesselSpec(
        name=side,
        volume=Interval(low=litres, high=litres),
        material=main.material if main is not None else "glass",
    )
    slow = Interval(low=_SIDE_POUR, high=_SIDE_POUR)
    aside = [
        *(one.model_copy(update={"to": side}) for one in before),
        step.model_copy(update={"to": side, "over": slow if before else None}),
        *(one.model_copy(update={"to": side}) for one in after),
    ]
    steps = [*case.steps[:place], *aside, Add(source=side, to=step.to, over=step.over), *case.steps[place + 1 :]]
    made = with_steps(case, steps).model_copy(update={"vessels": (*case.vessels, spec)})
    return variant.changed(made, words, 5.0)


_SIDE_POUR = 900.0  # s; a first guess that is vetted like everything else


def in_portions(variant: Variant, place: int, portions: int, between: Sequence[Step]) -> Variant | None:
    """A pour in equal portions with steps in between; None for an amount that cannot be divided (moles)."""
    case = variant.case
    step = case.steps[place]
    if not isinstance(step, Add):
        return None
    bottles, source = dict(case.bottles), step.source
    amount, unit = step.part, step.part_unit
    if step.portion is not None:
        source = free_name(case, "bottle")
        bottles[source] = step.portion
    held = bottles.get(source)
    if held is None or held.unit == "mol":
        return None
    if amount is None:
        amount, unit = held.amount, held.unit
    share = amount.times(1.0 / portions)
    over = None if step.over is None else step.over.times(1.0 / portions)
    one = Add(source=source, part=share, part_unit=unit, to=step.to, over=over)
    parts: list[Step] = [one]
    for _ in range(portions - 1):
        parts += [*between, one]
    words = f"Add {spoken(step)} (step {place + 1}) in {portions} equal portions"
    words += ", and cool in between." if between else "."
    made = with_steps(case, [*case.steps[:place], *parts, *case.steps[place + 1 :]])
    return variant.changed(made.model_copy(update={"bottles": bottles}), words, 4.0)


def leave_out(variant: Variant, place: int, words: str) -> Variant:
    """A pour is not done at all. A bottle that nothing takes from any more is left away."""
    steps = list(variant.case.steps)
    dropped = steps.pop(place)
    made = with_steps(variant.case, steps)
    if isinstance(dropped, Add) and not any(isinstance(one, Add) and one.source == dropped.source for one in steps):
        bottles = {name: portion for name, portion in made.bottles.items() if name != dropped.source}
        made = made.model_copy(update={"bottles": bottles})
    return variant.changed(made, words, 10.0)


def free_name(case: Case, wanted: str) -> str:
    """A name that no bottle and no vessel of the case has."""
    taken = {*case.bottles, *(spec.name for spec in case.vessels)}
    for step in case.steps:
        taken.add(vessel_of(step))
        if isinstance(step, Filter):
            taken |= {step.cake, step.filtrate}
    name, number = wanted, 2
    while name in taken:
        name, number = f"{wanted} {number}", number + 1
    return name
