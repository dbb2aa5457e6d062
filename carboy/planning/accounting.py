"""Where every gram of an element went: by place and by what it is there, with what left as gas, at the end and after each step."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from carboy.bench.vessels import VesselState
from carboy.bench.walk import Walk
from carboy.chemistry.mixture import Array, Mixture
from carboy.chemistry.stock import ChemicalStock
from carboy.errors import InputError
from carboy.hazards.steps import apart, pair
from carboy.model.report import AccountStep, ElementAccount, Share, Stream
from carboy.text.formulas import elements
from carboy.text.passages import closest

_LEAST = 1e-12  # g
AIR = "the air"  # the place of a gas that left an open vessel


@dataclass(frozen=True)
class Entry:
    """A share of an element: ``place`` is a vessel or ``the air``, ``state`` dissolved, solid, gas or liquid apart, ``values`` g ``[ranges]``."""

    place: str
    state: str
    form: str
    values: Array
    stream: Stream = "vessel"
    carrier: str = ""

    @property
    def grams(self) -> float:
        """g in the nominal lane."""
        return float(self.values[0])


def element_symbol(words: str) -> str:
    """The symbol of an element given by its symbol or name, in any case. Raises InputError with what may have been meant."""
    word = words.strip()
    known = elements()
    for symbol, element in known.items():
        if word.casefold() in (symbol.casefold(), element.name.casefold()) and element.weight is not None:
            return symbol
    names = [element.name for element in known.values() if element.weight is not None]
    raise InputError(
        f"'{word}' is no element that can be followed; give a name or a symbol, such as 'mercury' or 'Hg'",
        suggestions=closest(word, names, 2),
    )


def account(walk: Walk, element: str, stock: ChemicalStock) -> ElementAccount:
    """The account of ``element`` (its symbol) over a whole walk, with how nearly it closes."""
    came = _put_in(walk, element, stock)
    nominal = float(came[0])
    entries = followed(walk, element, stock)
    found = sum((entry.values for entry in entries), np.zeros_like(came))
    worst = int(np.argmax(np.abs(came - found)))
    gap = float(came[worst] - found[worst])
    return ElementAccount(
        element=element,
        name=elements()[element].name,
        put_in_g=pair(came),
        shares=[
            Share(
                place=entry.place,
                stream=entry.stream,
                state=entry.state,  # type: ignore[arg-type]
                form=entry.form,
                grams=pair(entry.values),
                nominal_g=entry.grams,
                percent=100 * entry.grams / nominal if nominal > _LEAST else None,
                carrier=entry.carrier,
            )
            for entry in entries
        ],
        steps=_steps(walk, element, stock),
        gap_g=gap,
        gap_share=abs(gap) / float(came[worst]) if came[worst] > _LEAST else 0.0,
    )


def _steps(walk: Walk, element: str, stock: ChemicalStock) -> list[AccountStep]:
    rows = []
    put_in = gone = 0.0
    for page in walk.ledger:
        put_in += sum(element_grams(content, element, stock) for content in page.brought)
        gone += sum(float(amount[0]) * grams_per_mol(gas, element, stock) for gas, amount in page.left.items())
        places = {name: element_grams(content, element, stock) for name, content in page.contents.items()}
        places[AIR] = gone
        rows.append(
            AccountStep(
                step=page.step,
                action=page.action,
                put_in_g=put_in,
                grams={name: grams for name, grams in places.items() if grams > _LEAST},
            )
        )
    return [row for row in rows if row.step > 0 or row.put_in_g > 0]


def followed(walk: Walk, element: str, stock: ChemicalStock) -> list[Entry]:
    """The shares of ``element`` (its symbol) at the end of a walk, the largest (nominal) first."""
    entries: list[Entry] = []
    for name, state in walk.vessels.items():
        if state.filled:
            entries += _in_vessel(name, state, element, stock)
    lost: dict[str, Array] = {}
    for page in walk.ledger:
        for gas, amount in page.left.items():
            values = amount * grams_per_mol(gas, element, stock)
            lost[gas] = lost[gas] + values if gas in lost else values
    entries += [Entry(AIR, "gas", stock.species(gas).formula, values, "gas") for gas, values in lost.items()]
    return sorted((one for one in entries if np.max(np.abs(one.values)) > _LEAST), key=lambda entry: -entry.grams)


def put_in(walk: Walk, element: str, stock: ChemicalStock) -> float:
    """g of ``element`` (nominal) that the pours brought in, and that vessels held at the start; what only moved is not counted."""
    return float(_put_in(walk, element, stock)[0])


def _put_in(walk: Walk, element: str, stock: ChemicalStock) -> Array:
    total = np.zeros(walk.ranges.lanes)
    for page in walk.ledger:
        for content in page.brought:
            total = total + element_values(content, element, stock)
    return total


def element_grams(content: Mixture, element: str, stock: ChemicalStock) -> float:
    """g of ``element`` in a content, nominal lane."""
    return float(element_values(content, element, stock)[0]) if content.amounts else 0.0


def element_values(content: Mixture, element: str, stock: ChemicalStock) -> Array:
    """g of ``element`` in a content, ``[ranges]``."""
    parts = (amount * grams_per_mol(token, element, stock) for token, amount in content.amounts.items())
    return sum(parts, content.zeros())


def grams_per_mol(token: str, element: str, stock: ChemicalStock) -> float:
    """g of ``element`` (its symbol) in a mol of a species, component or substance."""
    known = elements()[element].weight
    record = stock.index.species.get(token) or stock.index.substances.get(token)
    return 0.0 if record is None or known is None else record.atoms.get(element, 0.0) * known


def _in_vessel(name: str, vessel: VesselState, element: str, stock: ChemicalStock) -> list[Entry]:
    content = vessel.content
    carrier = " and ".join(f"{grams:g} g of {words}" for words, (grams, _) in vessel.carriers.items() if grams > 0)
    parts: list[tuple[str, str, Array]] = []
    bound = content.zeros()
    for state, found in (("solid", content.solids), ("gas", content.gases)):
        for token, amount in found.items():
            if per_mol := grams_per_mol(token, element, stock):
                bound = bound + amount * per_mol
                parts.append((state, stock.species(token).formula, amount * per_mol))
    for token, amount in content.aside.items():
        per_mol = grams_per_mol(token, element, stock)
        if per_mol and apart(token, stock):
            bound = bound + amount * per_mol
            state = "solid" if stock.species(token).phase == "s" else "liquid apart"
            parts.append((state, stock.species(token).formula, amount * per_mol))
    rest = element_values(content, element, stock) - bound
    parts.append(("solid" if _dry(content, stock) else "dissolved", "", rest))
    return [Entry(name, state, form, values, vessel.stream, carrier) for state, form, values in parts]


def _dry(content: Mixture, stock: ChemicalStock) -> bool:
    """Whether a content that nothing has wetted is made of solids alone: it has no speciation that would say so."""
    return bool(content.neat) and all(stock.index.substances[name].state == "s" for name in content.neat)
