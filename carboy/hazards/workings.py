"""How numbers were had: the equation, the numbers that went in, and each constant with its source."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from carboy.bench.make_up import MOLAR_VOLUME
from carboy.bench.trace import Course
from carboy.chemistry.stock import ChemicalStock
from carboy.model.knowledge import Limit, Value
from carboy.model.report import Measure
from carboy.text.formulas import molar_mass


def plain(quantity: str, value: float, unit: str, basis: str = "") -> Measure:
    """A number that goes into another one."""
    return Measure(quantity=quantity, value=value, unit=unit, basis=basis)


def looked_up(quantity: str, value: Value) -> Measure:
    """A value of the graph, with how it was had and from where."""
    basis = ", ".join(part for part in (value.basis, value.note) if part)
    return Measure(quantity=quantity, value=value.magnitude, unit=value.unit, basis=basis, source=value.source)


def constants(stock: ChemicalStock, token: str) -> list[Measure]:
    """The equilibrium constants by which a gas stands over the liquid: its Henry constant and those of the molecule in water."""
    return formation_constants(stock, [token, stock.dissolved_form.get(token, "")])


def formation_constants(stock: ChemicalStock, tokens: Iterable[str]) -> list[Measure]:
    """The equilibrium constants of species, solids and gases; nothing for components, which are given."""
    made = [stock.formation[token] for token in dict.fromkeys(tokens) if token in stock.formation]
    return [looked_up(f"log10 K of {one.reaction}", one.printed) for one in made]


def limit_measure(element: str, limit: Limit) -> Measure:
    """The limit on a liquid that judges what is dissolved of an element."""
    return Measure(
        quantity=f"limit for {element}",
        value=limit.value.magnitude,
        unit="mg/L",
        basis=limit.kind.replace("-", " "),
        source=limit.value.source,
    )


def dissolved_measure(
    element: str, mg_L: float, moles: float, litres: float, basis: str, constants_used: Iterable[Measure] = ()
) -> Measure:
    """mg/L of an element in the liquid, from mol and L."""
    return Measure(
        quantity=f"dissolved {element}",
        value=mg_L,
        unit="mg/L",
        basis=basis,
        equation="c = 1000 x n x M / V",
        inputs=[
            plain("n, all dissolved forms", moles, "mol"),
            plain("M", molar_mass({element: 1.0}), "g/mol"),
            plain("V", litres, "L"),
            *constants_used,
        ],
    )


def gas_measures(
    course: Course,
    token: str,
    leaving: float,
    air_L: float,
    limit: Measure | None,
    limit_words: str,
    lane: int,
    stock: ChemicalStock,
) -> list[Measure]:
    """The numbers that judge a gas at one lane of a course, each with its equation and inputs."""
    mixture = course.mixture
    none = mixture.zeros()
    bubbles = float(mixture.gases.get(token, none)[lane])
    pressure = float(mixture.pressures.get(token, none)[lane])
    molecule = stock.dissolved_form.get(token)
    held = float(mixture.aqueous.get(molecule, none)[lane]) if molecule else 0.0
    shown = [plain("in bubbles or headspace", bubbles, "mol"), plain("dissolved as molecules", held, "mol")]
    state = [plain("pH", float(mixture.pH[lane]), "1"), *constants(stock, token)]
    over = Measure(
        quantity="in the air over the liquid",
        value=min(pressure, 1.0) * 1e6,
        unit="ppm",
        basis="Henry's law at equilibrium",
        equation="p = molality of the molecule (with its activity) / Henry constant, at most 1 atm",
        inputs=[plain("partial pressure", pressure, "atm"), *state],
    )
    measures = [
        Measure(
            quantity="gas that can leave",
            value=leaving,
            unit="mol",
            basis="bubbles, and what passes from the liquid into air that is still below the limit",
            equation="n = n(bubbles) + n(dissolved) x (1 - limit / p)",
            inputs=[*shown, *([limit] if limit is not None else []), plain("partial pressure", pressure, "atm")],
        ),
        Measure(
            quantity="volume of that gas",
            value=leaving * MOLAR_VOLUME,
            unit="L",
            basis="ideal gas, 25 degC, 1 atm",
            equation="V = n x 24.465 L/mol",
            inputs=[plain("gas that can leave", leaving, "mol")],
        ),
        over,
    ]
    if limit is not None and not np.isnan(air_L):
        measures.append(
            Measure(
                quantity=f"air brought to the {limit_words}",
                value=air_L / 1000,
                unit="m3",
                basis=limit.basis,
                source=limit.source,
                equation="V(air) = n x 24.465 L/mol / limit",
                inputs=[plain("gas that can leave", leaving, "mol"), limit],
            )
        )
    return measures
