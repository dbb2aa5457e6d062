"""Follows an addition from the first drop to the last, the place where the stream falls in, and what goes on afterwards."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from carboy.bench.trace import Course
from carboy.chemistry.heat import HeatBook, heat_book
from carboy.chemistry.mixture import WATER_MOLAR_MASS, Array, Mixture, poured_together, solve_together
from carboy.chemistry.stock import PROTON, WATER
from carboy.model.knowledge import Threshold
from carboy.reasoning.binding import Surroundings
from carboy.reasoning.firing import Firing, Reactor

_FINE = 41  # points of a path while there are few lanes
_COARSE = 11
_MANY = 21  # lanes of ranges above which the path is followed more coarsely
_WATER_TO_DISSOLVE = (
    3.0  # mol of water that takes up one mol of salt or base with its heat; common practice, the order of a hydrate
)
BOILING = 100.0  # degC: water that boils grows no hotter
_HEAT_ROUNDS = 3
_WORTH_A_ROUND = 5.0  # K: less warming sets no rule going that was not
_SOLUBLE = 10.0  # g/L: a less soluble salt is left to the equilibria
_CONTACT_SHARES = np.array(
    [0.03, 0.1, 0.25, 0.5, 0.75, 0.9, 0.97]
)  # share of the vessel's liquid where the stream falls in


def path_fractions(ranges: int) -> Array:
    """Fractions of an addition at which the vessel is looked at: closer together at the first drops, the last one is 1."""
    points = _FINE if ranges <= 4 else 21 if ranges <= _MANY else _COARSE
    return np.concatenate([[0.005, 0.02], np.linspace(0.0, 1.0, points - 1)[1:]])


def along(
    vessel: Mixture,
    added: Mixture,
    reactor: Reactor,
    surroundings: Surroundings,
    *,
    capacity_L: Array | None,
    air_mol: Array | None,
    fractions: Array | None = None,
    beside: Mixture | None = None,
) -> Course:
    """The vessel along the dosing path. Every point is the vessel with that fraction of the addition in it, reacted.
    ``fractions`` are those to look at, rising; otherwise :func:`path_fractions`.

    Of a dry salt only what the water at hand can dissolve takes part; the rest lies there and is in the vessel afterwards.

    ``capacity_L`` given: sealed, with ``air_mol`` of air shut in. ``beside``: a content to be asked for next, which is solved in the same
    go where that can be.
    """
    if fractions is None:
        fractions = path_fractions(vessel.lanes)
    points = len(fractions)
    start = vessel.repeated(points)
    dose = added.repeated(points).scaled(np.tile(fractions, vessel.lanes))
    wetted = _wetted(start, dose)
    together = poured_together(*(part.scaled(wetted) if part.neat else part for part in (start, dose)))
    if capacity_L is not None:
        together.headspace_L = np.maximum(np.repeat(capacity_L, points) - together.volume_L, 1e-3)
        together.air_mol = None if air_mol is None else np.repeat(air_mol, points)
    if beside is not None:
        solve_together(together, beside)
    shares = (np.ones(start.lanes), np.tile(fractions, vessel.lanes))
    sources = [
        (part, share * wetted if part.neat else share) for part, share in zip((vessel, added), shares, strict=True)
    ]
    course = _reacted(together, sources, fractions, reactor, surroundings)
    course.dissolved_share = wetted
    return course


def contact_parcel(vessel: Mixture, added: Mixture, thresholds: dict[str, Threshold]) -> Mixture:
    """What is at the place where the stream falls in: a parcel of the addition, undiluted, with growing shares of the vessel's liquid."""
    points = len(_CONTACT_SHARES)
    share = thresholds["contact-share"].value.magnitude
    parcel_L = thresholds["contact-volume"].value.magnitude
    own = np.maximum(added.volume_L, 1e-9)
    part = np.minimum(share, parcel_L / own)
    dose = added.scaled(part).repeated(points)
    mixed = np.tile(_CONTACT_SHARES, vessel.lanes)
    wanted = np.repeat(part * own, points) * mixed / (1.0 - mixed)
    there = np.maximum(np.repeat(vessel.volume_L, points), 1e-9)
    drawn = np.minimum(wanted / there, 1.0)
    return poured_together(vessel.repeated(points).scaled(drawn), dose)


def at_contact(parcel: Mixture, reactor: Reactor, surroundings: Surroundings) -> Course:
    """What happens in a :func:`contact_parcel` before it is mixed in: rules that act at once."""
    mixture, firings = reactor.run(parcel, surroundings, slowest="at once")
    return Course(mixture, parcel, firings, _CONTACT_SHARES, parcel.zeros(), parcel.temperature_C)


def stored(vessel: Mixture, reactor: Reactor, surroundings: Surroundings, slowest: str) -> Course:
    """What still goes on when the vessel is left: rules of hours and days."""
    mixture, firings = reactor.run(vessel, surroundings, slowest=slowest)
    steps, _ = _reaction_heat(heat_book(vessel.stock), firings)
    heat = sum((kJ for _, kJ in steps), vessel.zeros())
    return Course(mixture, vessel, firings, np.array([1.0]), heat, vessel.temperature_C)


def _reacted(
    together: Mixture,
    sources: Sequence[tuple[Mixture, Array]],
    fractions: Array,
    reactor: Reactor,
    surroundings: Surroundings,
) -> Course:
    """React a course and add up its heat. ``sources``: what was poured together, with the share of it that is there, ``[lanes]``."""
    book = heat_book(together.stock)
    mixture, firings = reactor.run(together, surroundings, slowest="minutes")
    before = together.zeros()
    unknown: list[str] = []
    end = len(fractions) - 1  # the nominal range at the end of the addition
    parts: list[tuple[str, float]] = []
    for source, share in sources:
        if source.amounts:
            whole, missing = _held_by(book, source)
            held = np.repeat(whole, len(fractions)) * share
            before = before + held
            unknown += missing
            if source.neat and not missing and not together.neat:
                parts.append((f"dissolving {' and '.join(_names(source))}", float(held[end])))
    capacity = np.maximum(book.heat_capacity(together), 1e-6)
    reached = together.temperature_C
    for _ in range(_HEAT_ROUNDS):
        steps, missing = _reaction_heat(book, firings)
        after = book.of_speciation(mixture)
        dissolved = together.zeros() if together.neat else before - after  # side by side nothing dissolves
        heat = sum((kJ for _, kJ in steps), dissolved)
        warmer = together.temperature_C + heat / capacity
        if float(np.max(warmer - reached)) < _WORTH_A_ROUND:
            reached = warmer
            break
        reached = warmer
        hot = mixture.with_amounts(mixture.amounts)  # what the heat itself sets going
        hot.temperature_C = np.minimum(reached, np.maximum(BOILING, together.temperature_C))
        mixture, more = reactor.run(hot, surroundings, slowest="minutes", already=firings)
        firings = [*firings, *more]
        if not more:
            break
    dissolving = sum(share for _, share in parts)
    parts.append(("dilution, acid and base, complexes, solids and gases", float(dissolved[end]) - dissolving))
    parts += [(title, float(kJ[end])) for title, kJ in steps if abs(kJ[end]) > 0]
    return Course(
        mixture,
        together,
        firings,
        fractions,
        heat,
        reached_C=reached,
        unknown_heat=tuple(dict.fromkeys([*unknown, *missing])),
        capacity_kJ_K=capacity,
        heat_parts=tuple(parts),
    )


def _reaction_heat(book: HeatBook, firings: list[Firing]) -> tuple[list[tuple[str, Array]], list[str]]:
    """kJ ``[lanes]`` that each firing sets free, by its rule's title; and the titles of those whose enthalpy is unknown."""
    known: list[tuple[str, Array]] = []
    missing: list[str] = []
    for firing in firings:
        enthalpy = book.of_reaction(firing.reaction.change)
        if enthalpy is None:
            missing.append(firing.rule.title)
        else:
            known.append((firing.rule.title, -enthalpy * firing.extent))
    return known, missing


def _names(source: Mixture) -> list[str]:
    return [source.stock.index.substances[name].name for name in source.neat]


def _wetted(vessel: Mixture, dose: Mixture) -> Array:
    """Share of what was dry that the water at hand can take up, ``[lanes]``: the first drops on a heap do not dissolve the heap.

    All of it where there is no water to speak of: two dry solids lie side by side, and a neat liquid meets the whole of what it wets.
    A salt of known solubility dissolves to saturation, and with as much acid or base as there is beside it; anything else takes
    _WATER_TO_DISSOLVE mol of water per mol.
    """
    needed = np.zeros(vessel.lanes)
    water = np.zeros(vessel.lanes)
    dry = [part for part in (vessel, dose) if part.neat]
    solids = all(part.stock.index.substances[name].state == "s" for part in dry for name in part.neat)
    if len(dry) != 1 or not solids:
        return np.ones(vessel.lanes)
    for part, other in ((vessel, dose), (dose, vessel)):
        own = np.zeros(part.lanes)  # water that a hydrate or base holds in itself is not there to dissolve it
        for name in part.neat:
            substance = part.stock.index.substances[name]
            if not substance.yields or set(substance.yields) == {name}:
                continue
            moles = part.labelled[name]
            own = own + max(part.stock.yield_of(name).get(WATER, 0.0), 0.0) * moles
            per_mole = _WATER_TO_DISSOLVE
            if substance.solubility is not None and _SOLUBLE <= substance.solubility.magnitude < np.inf:
                molar = part.stock.molar_mass(name)
                per_mole = max(per_mole, 1000 / WATER_MOLAR_MASS * molar / substance.solubility.magnitude)
            reacting = np.abs(other.total(PROTON)) if not other.neat else np.zeros(part.lanes)
            needed = needed + per_mole * np.maximum(moles - reacting, 0.0)
        water = water + np.maximum(part.total(WATER) - own, 0.0)
    return np.clip(np.divide(water, needed, out=np.ones_like(needed), where=needed > 0), 0.0, 1.0)


def _held_by(book: HeatBook, source: Mixture) -> tuple[Array, list[str]]:
    """kJ ``[lanes]`` of a content before pouring, against its components at infinite dilution; and names whose heat of dissolving is unknown
    (these are taken to dissolve without heat to the molecule or ions that they are made of)."""
    if not source.neat:
        return book.of_speciation(source), []
    missing = [source.stock.index.substances[name].name for name, value in source.neat.items() if value is None]
    held = source.zeros()
    for name, value in source.neat.items():
        dissolving = -book.of_molecule(name) if value is None else value
        held = held - dissolving * source.labelled[name]
    return held, missing
