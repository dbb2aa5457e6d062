"""Toxic metals put back into solution."""

from __future__ import annotations

import numpy as np

from carboy.bench.trace import StepTrace
from carboy.chemistry.mixture import TRACE, Mixture
from carboy.chemistry.stock import ChemicalStock
from carboy.hazards.draft import Draft, Scale, courses, graded, worst_lane
from carboy.hazards.numbers import amount_words, figures
from carboy.hazards.workings import dissolved_measure, formation_constants, limit_measure, plain
from carboy.model.knowledge import Limit
from carboy.model.report import Measure
from carboy.reasoning.equation import formation_equation
from carboy.text.formulas import elements, molar_mass

_NOTE_SHARE = 0.1  # of the limit: below it a metal going back is not worth a line


def element_of(report_key: str) -> str:
    """``Hg`` of ``Hg(II)``."""
    return report_key.split("(", 1)[0]


def limit_for(report_key: str, limits: tuple[Limit, ...]) -> Limit | None:
    """The limit on a liquid that applies to a metal: the toxicity characteristic, else the wastewater treatment standard, else that
    of metal finishing."""
    for kind in ("toxicity-characteristic", "universal-treatment-wastewater", "metal-finishing-daily-maximum"):
        for limit in limits:
            if limit.kind == kind and limit.subject in (report_key, element_of(report_key)):
                return limit
    return None


def _solid_metal(mixture: Mixture, token: str) -> np.ndarray:
    total = mixture.zeros()
    for solid, amount in mixture.solids.items():
        total = total + amount * mixture.stock.components_of(solid).get(token, 0.0)
    return total


def remobilised_drafts(trace: StepTrace, stock: ChemicalStock, scale: Scale) -> list[Draft]:
    """For every toxic metal: solid that was in the vessel, or came down on the way, and has gone back into the liquid."""
    drafts: list[Draft] = []
    for where, course in courses(trace):
        if where == "contact":
            continue
        mixture = course.mixture
        before = trace.before
        limited = {limit.subject for limit in stock.index.limits if limit.subject in elements()}
        metals = {
            token
            for token in mixture.dissolvable
            if element_of(stock.species(token).report_key) in limited and np.any(mixture.total(token) > TRACE)
        }
        for element in sorted({element_of(stock.species(token).report_key) for token in metals}):
            tokens = [token for token in metals if element_of(stock.species(token).report_key) == element]
            limit = limit_for(element, stock.index.limits)
            if limit is None:
                continue
            weight = molar_mass({element: 1.0})
            counts = {token: stock.species(token).atoms.get(element, 1.0) for token in tokens}
            solid = course.table(
                sum((_solid_metal(mixture, token) * counts[token] for token in tokens), mixture.zeros())
            )
            free = course.table(sum((mixture.dissolved(token) * counts[token] for token in tokens), mixture.zeros()))
            held = np.maximum.accumulate(solid, axis=1)
            if before is not None:
                first = sum(
                    (
                        _solid_metal(before, token) * stock.species(token).atoms.get(element, 1.0)
                        for token in before.amounts
                        if token in metals
                    ),
                    before.zeros(),
                )
                held = np.maximum(held, first[:, None])
            volume = course.table(mixture.volume_L)
            back = np.minimum(np.maximum(held - solid, 0.0), free)
            dose = course.fractions if where == "path" and trace.added is not None else np.zeros(course.points)
            came = np.zeros_like(free)
            if trace.added is not None and where == "path":
                own = sum((trace.added.dissolved(token) * counts[token] for token in tokens), trace.added.zeros())
                came = own[:, None] * dose[None, :]
            least = np.minimum.accumulate(free, axis=1)
            if before is not None:
                start = sum((before.dissolved(token) * counts[token] for token in tokens), before.zeros())
                least = np.minimum(least, start[:, None])
            risen = free > scale["markedly-worse-factor"] * (least + came)
            back = np.where(risen, back, 0.0)
            strength = np.divide(back * weight * 1000, volume, out=np.zeros_like(back), where=volume > 0)
            dissolved = np.divide(free * weight * 1000, volume, out=np.zeros_like(back), where=volume > 0)
            magnitude = limit.value.magnitude
            levels = graded(
                strength, _NOTE_SHARE * magnitude, magnitude, scale["remobilised-danger-factor"] * magnitude
            )
            if not levels.any():
                continue
            lane = worst_lane(levels, strength)
            forms = _main_forms(mixture, tokens, lane)
            summary = (
                f"{element} goes back into solution: {amount_words(float(back.flat[lane]))}, {figures(float(dissolved.flat[lane]))} mg/L dissolved"
                + (f", mostly as {forms[0]}" if forms else "")
                + f", against a limit of {magnitude:g} mg/L."
            )
            drafts.append(
                Draft(
                    "remobilised",
                    (forms[0] if forms else tokens[0],),
                    levels,
                    course.fractions,
                    where,
                    trace,
                    summary,
                    back,
                    [
                        Measure(
                            quantity=f"{element} gone back into the liquid",
                            value=float(back.flat[lane]),
                            unit="mol",
                            basis="the most that was solid before or on the way, less what is solid now",
                            equation="n(back) = n(solid, most so far) - n(solid, now), no more than is dissolved",
                            inputs=[
                                plain("n(solid, most so far)", float(held.flat[lane]), "mol"),
                                plain("n(solid, now)", float(solid.flat[lane]), "mol"),
                            ],
                        ),
                        dissolved_measure(
                            element,
                            float(dissolved.flat[lane]),
                            float(free.flat[lane]),
                            float(volume.flat[lane]),
                            "equilibrium with the solids present",
                            formation_constants(stock, [*forms, *_solids_with(mixture, before, tokens)]),
                        ),
                        limit_measure(element, limit),
                    ],
                    sources=[limit.value.source],
                    equations=_dissolution(stock, forms, tokens),
                    lane=lane,
                )
            )
    return drafts


def _solids_with(mixture: Mixture, before: Mixture | None, tokens: list[str]) -> list[str]:
    """The solids of a metal that are there, or were there before."""
    solids = [*mixture.solids, *(before.solids if before is not None else ())]
    return [one for one in solids if any(mixture.stock.components_of(one).get(token, 0.0) > 0 for token in tokens)]


def _main_forms(mixture: Mixture, tokens: list[str], lane: int) -> list[str]:
    found = [
        (float(amount[lane]), name)
        for name, amount in mixture.aqueous.items()
        if any(mixture.stock.components_of(name).get(token, 0.0) > 0 for token in tokens)
    ]
    return [name for amount, name in sorted(found, reverse=True) if amount > 0][:3]


def _dissolution(
    stock: ChemicalStock, forms: list[str], tokens: list[str]
) -> list[tuple[str, str, tuple[str, ...], tuple[str, ...]]]:
    target = forms[0] if forms else tokens[0]
    equation, left, right = formation_equation(stock, target)
    return [("equilibrium", equation, left, right)]
