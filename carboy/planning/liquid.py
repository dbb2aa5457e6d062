"""Which hazards a liquid holds, by the records of the graph."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from carboy.chemistry.mixture import TRACE, Array, Mixture
from carboy.chemistry.stock import ChemicalStock
from carboy.model.knowledge import LiquidHazard
from carboy.text.formulas import elements


def hazards_of(content: Mixture, stock: ChemicalStock) -> frozenset[str]:
    """Ids of the hazards that stand in some lane."""
    return frozenset(key for key, hazard in stock.index.hazards.items() if _stands(hazard, content, stock))


def unknown_metals(content: Mixture, stock: ChemicalStock) -> list[str]:
    """Poisonous metals in the liquid that no hazard of the graph speaks of."""
    spoken = {token for hazard in stock.index.hazards.values() for token in hazard.species}
    classes = {key for hazard in stock.index.hazards.values() for key in hazard.classes}
    return [
        stock.species(token).name or token
        for token in content.dissolvable
        if token not in spoken
        and "heavy-metal" in stock.classes.get(token, ())
        and not stock.classes.get(token, frozenset()) & classes
        and np.any(content.dissolved(token) > TRACE)
    ]


def _stands(hazard: LiquidHazard, content: Mixture, stock: ChemicalStock) -> bool:
    if hazard.pH_low is not None and np.any(content.pH < hazard.pH_low.magnitude):
        return True
    if hazard.pH_high is not None and np.any(content.pH > hazard.pH_high.magnitude):
        return True
    if hazard.above is None:
        return False
    return bool(np.any(level(hazard, content, stock) > max(hazard.above.magnitude, 1e-6)))


def level(hazard: LiquidHazard, content: Mixture, stock: ChemicalStock) -> Array:
    """mg/L of what a hazard counts, ``[lanes]``: of the element of the report key, or of the whole species or substance."""
    grams = content.zeros()
    for token in hazard.species:
        if token in content.amounts:
            grams = grams + content.dissolved(token) * counted_mass(token, stock)
    if hazard.classes:
        # what has a hazard of its own (formaldehyde) is not counted with its class as well
        own = {token for other in stock.index.hazards.values() for token in other.species}
        for token in content.amounts:
            if token not in own and _belongs(token, hazard, stock):
                there = content.dissolved(token) if token in content.dissolvable else content.total(token)
                grams = grams + there * stock.molar_mass(token)
        for name in content.labelled:
            made = set(stock.yield_of(name))
            if name not in content.amounts and _belongs(name, hazard, stock) and made != {name} and not made <= own:
                grams = grams + content.remaining(name) * stock.molar_mass(name)
    return 1000 * grams / np.maximum(content.volume_L, 1e-9)


def counted_mass(token: str, stock: ChemicalStock) -> float:
    """g per mol in which a species is counted: of its report key's element, else of the whole of it."""
    record = stock.species(token)
    element = elements().get((record.report_key or record.formula).split("(")[0])
    if element is not None and element.weight is not None:
        return element.weight * record.atoms.get(element.symbol, 1.0)
    return stock.molar_mass(token)


def _belongs(token: str, hazard: LiquidHazard, stock: ChemicalStock) -> bool:
    classes = stock.classes.get(token, frozenset())
    return bool(classes & set(hazard.classes)) and not classes & set(hazard.except_classes)


def said(keys: frozenset[str], hazards: Mapping[str, LiquidHazard]) -> list[str]:
    """The names of hazards, sorted."""
    return sorted(hazards[key].name for key in keys)
