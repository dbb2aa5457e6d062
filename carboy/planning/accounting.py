"""Where every gram of an element went: by vessel and by what it is in there, with what left as gas."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from carboy.bench.walk import Walk
from carboy.chemistry.mixture import Mixture
from carboy.chemistry.stock import ChemicalStock
from carboy.hazards.steps import apart
from carboy.text.formulas import elements

_LEAST = 1e-12  # g


@dataclass(frozen=True)
class Entry:
    """A share of an element: ``place`` is a vessel or ``the air``, ``state`` dissolved, solid, gas or liquid apart, ``grams`` nominal."""

    place: str
    state: str
    form: str
    grams: float


def followed(walk: Walk, element: str, stock: ChemicalStock) -> list[Entry]:
    """The shares of ``element`` (its symbol) at the end of a walk, in the nominal lane, the largest first.

    Gas that bubbled out of an open vessel is counted where its step has it.
    """
    entries: list[Entry] = []
    for name, state in walk.vessels.items():
        if state.filled:
            entries += _in_vessel(name, state.content, element, stock)
    for form, grams in gas_lost(walk, element, stock).items():
        entries.append(Entry("the air", "gas", form, grams))
    return sorted((entry for entry in entries if entry.grams > _LEAST), key=lambda entry: -entry.grams)


def put_in(walk: Walk, element: str, stock: ChemicalStock) -> float:
    """g of ``element`` that the pours brought in, and that vessels held at the start; what only moved between vessels is not counted."""
    moved = set(walk.vessels)
    return sum(
        element_grams(trace.added, element, stock)
        for trace in walk.steps
        if trace.added is not None and trace.added_label not in moved
    )


def gas_lost(walk: Walk, element: str, stock: ChemicalStock) -> dict[str, float]:
    """g of ``element`` by formula of the gas that left open vessels."""
    lost: dict[str, float] = {}
    for trace in walk.steps:
        if trace.cover == "sealed":
            continue
        for token, amount in trace.after.gases.items():
            grams = float(amount[0]) * _per_mol(token, element, stock)
            if grams > _LEAST:
                form = stock.label(token)
                lost[form] = lost.get(form, 0.0) + grams
    return lost


def element_grams(content: Mixture, element: str, stock: ChemicalStock) -> float:
    """g of ``element`` in a content, nominal lane."""
    return sum(float(amount[0]) * _per_mol(token, element, stock) for token, amount in content.amounts.items())


def _in_vessel(name: str, content: Mixture, element: str, stock: ChemicalStock) -> list[Entry]:
    entries = []
    bound = 0.0
    for state, found in (("solid", content.solids), ("gas", content.gases)):
        for token, amount in found.items():
            grams = float(np.atleast_1d(amount)[0]) * _per_mol(token, element, stock)
            bound += grams
            entries.append(Entry(name, state, stock.label(token), grams))
    for token, amount in content.aside.items():
        if apart(token, stock):
            grams = float(amount[0]) * _per_mol(token, element, stock)
            bound += grams
            state = "solid" if stock.species(token).phase == "s" else "liquid apart"
            entries.append(Entry(name, state, stock.label(token), grams))
    entries.append(Entry(name, "dissolved", "", element_grams(content, element, stock) - bound))
    return entries


def _per_mol(token: str, element: str, stock: ChemicalStock) -> float:
    known = elements()[element].weight
    record = stock.index.species.get(token) or stock.index.substances.get(token)
    return 0.0 if record is None or known is None else record.atoms.get(element, 0.0) * known
