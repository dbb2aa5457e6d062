"""The vessel after a step, in the report's form."""

from __future__ import annotations

import numpy as np

from carboy.bench.trace import StepTrace
from carboy.chemistry.mixture import TRACE, Array, Mixture
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.model.report import Pair, Pour, StepReport


def pair(values: Array) -> Pair:
    """Least and most over the lanes."""
    return float(np.min(values)), float(np.max(values))


def dissolved_by_key(mixture: Mixture, stock: ChemicalStock) -> dict[str, Array]:
    """mol of each report key in the liquid: an element in its oxidation state, and the element as a whole where states are kept apart."""
    found: dict[str, Array] = {}

    def add(key: str, amount: Array) -> None:
        found[key] = found[key] + amount if key in found else amount

    for token in mixture.amounts:
        if token in (PROTON, WATER):
            continue
        record = stock.species(token)
        if stock.kind(token) == "aside":
            if not apart(token, stock):
                add(record.formula, mixture.total(token))
            continue
        key = record.report_key or record.formula
        element = key.split("(")[0]
        amount = mixture.dissolved(token) * record.atoms.get(element, 1.0)
        add(key, amount)
        if "(" in key:
            add(element, amount)
    return {key: amount for key, amount in found.items() if np.any(amount > 0)}


def apart(token: str, stock: ChemicalStock) -> bool:
    """Whether a thing that stands aside lies apart from the liquid: a solid, or a metal that is liquid."""
    return stock.species(token).phase == "s" or "metal" in stock.classes.get(token, ())


def poured(trace: StepTrace, stock: ChemicalStock) -> Pour | None:
    """What came into the vessel in a step; None where nothing did."""
    added = trace.added
    if added is None or not trace.added_label:
        return None
    return Pour(
        label=trace.added_label,
        volume_L=pair(added.volume_L),
        mass_g=pair(added.mass_g),
        holds_mol={stock.index.substances[name].name: pair(amount) for name, amount in added.labelled.items()},
    )


def step_report(trace: StepTrace, stock: ChemicalStock) -> StepReport:
    """The numbers of a step over the stated ranges."""
    mixture = trace.after
    solids: dict[str, Array] = {}
    for token, amount in (
        *mixture.solids.items(),
        *((t, a) for t, a in mixture.aside.items() if apart(t, stock)),
    ):
        formula = stock.species(token).formula
        solids[formula] = solids[formula] + amount if formula in solids else amount
    gases = {stock.species(token).formula: amount for token, amount in mixture.gases.items() if np.any(amount > TRACE)}
    with_pH = mixture.solved is not None and np.any(mixture.total(WATER) > 0) and not trace.unknown
    return StepReport(
        step=trace.number,
        action=trace.action,
        vessel=trace.vessel,
        pH=pair(mixture.pH) if with_pH else None,
        temperature_C=pair(mixture.temperature_C),
        gauge_kPa=pair(mixture.gauge_kPa()),
        volume_L=pair(mixture.volume_L),
        dissolved_mol={key: pair(amount) for key, amount in sorted(dissolved_by_key(mixture, stock).items())},
        solids_mol={key: pair(amount) for key, amount in sorted(solids.items()) if np.any(amount > TRACE)},
        gas_mol={key: pair(amount) for key, amount in sorted(gases.items())},
        poured=poured(trace, stock),
    )
