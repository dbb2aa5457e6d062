"""Follows an addition from the first drop to the last, the place where the stream falls in, and what goes on afterwards."""

from __future__ import annotations

import numpy as np

from carboy.bench.trace import Course
from carboy.chemistry.heat import HeatBook, heat_book
from carboy.chemistry.mixture import Array, Mixture, poured_together
from carboy.chemistry.stock import WATER
from carboy.model.knowledge import Threshold
from carboy.reasoning.binding import Surroundings
from carboy.reasoning.firing import Firing, Reactor

_FINE = 41  # points of a path while there are few lanes
_COARSE = 11
_MANY = 12  # lanes of ranges above which the path is followed more coarsely
_WATER_TO_DISSOLVE = (
    3.0  # mol of water that takes up one mol of salt or base with its heat; common practice, the order of a hydrate
)
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
) -> Course:
    """The vessel along the dosing path. Every point is the vessel with that fraction of the addition in it, reacted.

    ``capacity_L`` given: sealed, with ``air_mol`` of air shut in.
    """
    fractions = path_fractions(vessel.lanes)
    points = len(fractions)
    start = vessel.repeated(points)
    dose = added.repeated(points).scaled(np.tile(fractions, vessel.lanes))
    together = poured_together(start, dose)
    if capacity_L is not None:
        together.headspace_L = np.maximum(np.repeat(capacity_L, points) - together.volume_L, 1e-3)
        together.air_mol = None if air_mol is None else np.repeat(air_mol, points)
    return _reacted(
        together, (vessel, added), (np.ones(points), fractions), fractions, reactor, surroundings, "minutes"
    )


def at_contact(
    vessel: Mixture, added: Mixture, reactor: Reactor, surroundings: Surroundings, thresholds: dict[str, Threshold]
) -> Course:
    """The place where the stream falls in: a parcel of the addition, undiluted, with growing shares of the vessel's liquid."""
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
    together = poured_together(vessel.repeated(points).scaled(drawn), dose)
    fractions = _CONTACT_SHARES
    mixture, firings = reactor.run(together, surroundings, slowest="at once")
    none = np.zeros(together.lanes)
    return Course(mixture, together, firings, fractions, none, together.temperature_C)


def stored(vessel: Mixture, reactor: Reactor, surroundings: Surroundings, slowest: str) -> Course:
    """What still goes on when the vessel is left: rules of hours and days."""
    mixture, firings = reactor.run(vessel, surroundings, slowest=slowest)
    steps, _ = _reaction_heat(heat_book(vessel.stock), firings)
    heat = sum((kJ for _, kJ in steps), vessel.zeros())
    return Course(mixture, vessel, firings, np.array([1.0]), heat, vessel.temperature_C)


def _reacted(
    together: Mixture,
    sources: tuple[Mixture, Mixture],
    weights: tuple[Array, Array],
    fractions: Array,
    reactor: Reactor,
    surroundings: Surroundings,
    slowest: str,
) -> Course:
    book = heat_book(together.stock)
    mixture, firings = reactor.run(together, surroundings, slowest=slowest)
    points = len(fractions)
    before = together.zeros()
    unknown: list[str] = []
    end = points - 1  # the nominal range at the end of the addition
    parts: list[tuple[str, float]] = []
    for source, weight in zip(sources, weights, strict=True):
        if source.amounts:
            held, missing = _held_by(book, source)
            before = before + np.repeat(held, points) * np.tile(weight, source.lanes)
            unknown += missing
            if source.neat and not missing:
                parts.append((f"dissolving {' and '.join(_names(source))}", float(held[0] * weight[-1])))
    steps, missing = _reaction_heat(book, firings)
    after = book.of_speciation(mixture)
    dissolving = sum(share for _, share in parts)
    parts.append(("dilution, acid and base, complexes, solids and gases", float(before[end] - after[end]) - dissolving))
    parts += [(title, float(kJ[end])) for title, kJ in steps if abs(kJ[end]) > 0]
    heat = sum((kJ for _, kJ in steps), before - after)
    if together.neat:  # solids side by side: nothing dissolves
        heat = together.zeros()
    heat = heat * _wetted(sources, together)
    capacity = np.maximum(book.heat_capacity(together), 1e-6)
    return Course(
        mixture,
        together,
        firings,
        fractions,
        heat,
        reached_C=together.temperature_C + heat / capacity,
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


def _wetted(sources: tuple[Mixture, Mixture], together: Mixture) -> Array:
    """Share of what was dry or neat that the water at hand can take up, ``[L]``: the first drops on a heap do not dissolve the heap."""
    dry = together.zeros()
    for source in sources:
        for name in source.neat:
            if together.stock.index.substances[name].yields:
                dry = dry + together.labelled.get(name, together.zeros())
    return np.clip(
        np.divide(together.total(WATER), _WATER_TO_DISSOLVE * dry, out=np.ones_like(dry), where=dry > 0), 0.0, 1.0
    )


def _held_by(book: HeatBook, source: Mixture) -> tuple[Array, list[str]]:
    """kJ ``[L]`` of a content before pouring, against its components at infinite dilution; and names whose heat of dissolving is unknown."""
    if not source.neat:
        return book.of_speciation(source), []
    missing = [source.stock.index.substances[name].name for name, value in source.neat.items() if value is None]
    if missing:
        return book.of_speciation(source), missing
    return -sum(((value or 0.0) * source.labelled[name] for name, value in source.neat.items()), source.zeros()), []
