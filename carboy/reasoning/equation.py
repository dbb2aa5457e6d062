"""Equations in words: how a species comes from the components, with base written as OH-."""

from __future__ import annotations

from collections.abc import Mapping

from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.model.knowledge import Substance

HYDROXIDE = "OH-"


def consumed_for(stock: ChemicalStock, token: str, moles: float) -> dict[str, float]:
    """Components (and ``OH-`` for protons taken away) that ``moles`` of a species draw on."""
    drawn: dict[str, float] = {}
    for component, count in stock.components_of(token).items():
        if component == WATER:
            continue
        if component == PROTON and count < 0:
            drawn[HYDROXIDE] = -count * moles
        elif count > 0:
            drawn[component] = count * moles
    return drawn


def formation_equation(stock: ChemicalStock, token: str) -> tuple[str, tuple[str, ...], tuple[str, ...]]:
    """``HS- + H+ -> H2S`` with the terms of both sides."""
    left: dict[str, float] = {}
    right: dict[str, float] = {token: 1.0}
    water = 0.0
    for component, count in stock.components_of(token).items():
        if component == WATER:
            water += count
        elif component == PROTON and count < 0:
            left[HYDROXIDE] = -count
            water += count  # n OH- taken up leave n H2O
        elif count > 0:
            left[component] = count
        else:
            right[component] = -count
    if water > 0:
        left[WATER] = water
    elif water < 0:
        right[WATER] = -water
    return f"{side_words(left, stock)} -> {side_words(right, stock)}", tuple(left), tuple(right)


def dissolution_equation(substance: Substance, stock: ChemicalStock) -> str:
    """``Na2S + H2O -> 2 Na+ + HS- + OH-``; the formula alone for what stays as it is."""
    made = {token: count for token, count in substance.yields.items() if token != substance.id}
    if not made:
        return substance.formula
    taken = {token: -count for token, count in made.items() if count < 0}
    left = " + ".join(filter(None, (substance.formula, side_words(taken, stock))))
    return f"{left} -> {side_words({token: count for token, count in made.items() if count > 0}, stock)}"


def side_words(side: Mapping[str, float], stock: ChemicalStock) -> str:
    """``2 H+ + CO3-2``."""
    return " + ".join(
        stock.label(token) if abs(count - 1) < 1e-9 else f"{count:g} {stock.label(token)}"
        for token, count in side.items()
    )
