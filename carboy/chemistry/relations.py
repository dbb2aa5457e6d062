"""Relations between a bound thing and a species, as ``?m.ion`` and ``?s.metal`` of the rule language ask for them.

The engine and the linter both take them from here, so that a rule which passes the one runs in the other.
"""

from __future__ import annotations

from carboy.chemistry.stock import PROTON, WATER, ChemicalStock

_EXACT = 1e-9


def part_of(token: str, part: str, stock: ChemicalStock) -> str | None:
    """The species in the relation ``part`` to a species or substance; None where the graph gives none, or several.

    * ``ion``: the cation that a metal gives, as stated for its substance;
    * ``metal``: the one cation among the components of a solid or salt;
    * ``anion``: the one anion among its components;
    * ``acid``: the uncharged molecule that is an anion and its protons (``CN-``: ``HCN``);
    * ``oxidised``, ``reduced``: the graph has no such relation yet.
    """
    if not part:
        return token
    if part == "ion":
        substance = stock.index.substances.get(token)
        return substance.ion or None if substance is not None else None
    if part in ("metal", "anion"):
        return _component_of_charge(token, 1 if part == "metal" else -1, stock)
    if part == "acid":
        return _acid(token, stock)
    return None


def _components(token: str, stock: ChemicalStock) -> dict[str, float]:
    try:
        return stock.components_of(token)
    except KeyError:
        return {}


def _component_of_charge(token: str, sign: int, stock: ChemicalStock) -> str | None:
    found = [
        component
        for component, count in _components(token, stock).items()
        if component not in (PROTON, WATER, token)
        and count > _EXACT
        and component in stock.index.species
        and stock.species(component).charge * sign > 0
    ]
    return found[0] if len(found) == 1 else None


def _acid(token: str, stock: ChemicalStock) -> str | None:
    """The molecule in water whose make-up is that of ``token`` and more protons, and whose charge is 0."""
    record = stock.index.species.get(token)
    if record is None or record.charge >= 0:
        return None
    wanted = dict(_components(token, stock))
    wanted[PROTON] = wanted.get(PROTON, 0.0) - record.charge
    wanted = {component: count for component, count in wanted.items() if abs(count) > _EXACT}
    found = [
        other.token
        for other in stock.index.species.values()
        if other.phase == "aq" and other.charge == 0 and _same(_components(other.token, stock), wanted)
    ]
    return found[0] if len(found) == 1 else None


def _same(first: dict[str, float], second: dict[str, float]) -> bool:
    return first.keys() == second.keys() and all(abs(count - second[key]) < _EXACT for key, count in first.items())
