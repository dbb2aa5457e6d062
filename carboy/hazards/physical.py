"""Heat, foam and pressure: magnitudes of the vessel as a whole."""

from __future__ import annotations

import numpy as np

from carboy.bench.make_up import MOLAR_VOLUME
from carboy.bench.trace import Course, StepTrace
from carboy.chemistry.heat import LIQUID_HEAT_CAPACITY, SOLUTE_HEAT_CAPACITY, WATER_HEAT_CAPACITY
from carboy.chemistry.mixture import GAS_CONSTANT_KPA, TRACE, Array, water_vapour_kPa
from carboy.chemistry.stock import ChemicalStock
from carboy.hazards.draft import DANGER, NOTE, Draft, Scale, courses, graded, worst_lane
from carboy.hazards.gas import load
from carboy.hazards.numbers import figures, litres_words
from carboy.hazards.workings import constants, plain
from carboy.model.report import Measure
from carboy.reasoning.equation import formation_equation

BOILING_WATER = 100.0  # degC at one atmosphere
WATER_BOILS = 2257.0  # kJ/kg, enthalpy of vaporisation at 100 degC, CRC Handbook (from memory)
KELVIN = 273.15
ICE_MELTS = 334.0  # kJ/kg, enthalpy of fusion, CRC Handbook (from memory)


def heat_drafts(trace: StepTrace, stock: ChemicalStock, scale: Scale) -> list[Draft]:
    """Warming along the path: by how much, near boiling, above an onset of decomposition of something put in."""
    course = trace.path
    if course is None:
        return []
    start = course.unreacted.temperature_C
    rise = course.table(course.reached_C - start)
    reached = course.table(course.reached_C)
    levels = graded(rise, scale["heat-note"], scale["heat-warning"], scale["heat-danger"])
    warmed = rise >= scale["heat-note"]
    watery = course.table(course.mixture.water_fraction) > 0.05
    boils = warmed & watery & (reached >= BOILING_WATER - scale["boiling-margin"])
    levels = np.where(boils, DANGER, levels)
    levels = np.where(course.table(course.heat_kJ) < scale["least-heat"], np.minimum(levels, NOTE), levels)
    reasons: list[str] = []
    for name, amount in course.unreacted.labelled.items():
        onset = stock.index.substances[name].onset
        if onset is not None and np.any(amount > 0):
            past = warmed & (reached >= onset.magnitude)
            if past.any():
                levels = np.where(past, DANGER, levels)
                reasons.append(f"{stock.index.substances[name].name} begins to decompose at {onset.magnitude:g} °C")
    if not levels.any():
        return []
    lane = worst_lane(levels, rise)
    most, top = float(rise.flat[lane]), float(reached.flat[lane])
    if top >= BOILING_WATER and boils.any():
        words = f"Heat enough to warm the mixture by {figures(most)} K: it boils and spatters"
    else:
        words = f"The mixture warms by {figures(most)} K to about {figures(top, 3)} °C if no heat is lost"
        words += "; so near boiling it spatters" if boils.any() else ""
    summary = "; ".join([words, *reasons]) + "."
    measures = _heat_measures(course, lane, most, top, scale)
    draft = Draft("heat", (), levels, course.fractions, "path", trace, summary, None, measures, lane=lane)
    if course.unknown_heat:
        draft.measures.append(
            Measure(
                quantity="heat not known",
                value=None,
                unit="",
                basis="no enthalpy in the graph: " + "; ".join(course.unknown_heat),
            )
        )
    return [draft]


def _heat_measures(course: Course, lane: int, rise: float, top: float, scale: Scale) -> list[Measure]:
    """Heat, warming, and what carries it off: ice or cooling for the whole addition, water boiled away."""
    heat = float(course.heat_kJ[lane])
    capacity = heat / rise if rise else 0.0
    ceiling = scale["heat-warning"]
    whole = float(course.table(course.heat_kJ)[0, -1])
    capacity_basis = (
        f"water {WATER_HEAT_CAPACITY:g} (CRC Handbook, from memory), dissolved {SOLUTE_HEAT_CAPACITY:g}, organic liquids "
        f"{LIQUID_HEAT_CAPACITY:g} kJ/(kg K) (common practice)"
    )
    inputs = [
        plain("heat set free", heat, "kJ"),
        plain("heat capacity of the content", capacity, "kJ/K", capacity_basis),
    ]
    measures = [
        Measure(
            quantity="heat set free",
            value=heat,
            unit="kJ",
            basis="Hess's law from enthalpies of formation and dilution",
            equation="Q = H(parts before) - H(mixture) - sum of reaction enthalpy x extent",
            inputs=[
                Measure(
                    quantity="once all is in, as stated",
                    value=whole,
                    unit="kJ",
                    basis="the sum of its parts",
                    inputs=[plain(words, share, "kJ") for words, share in course.heat_parts],
                )
            ],
        ),
        Measure(
            quantity="warming without loss",
            value=rise,
            unit="K",
            basis="heat over heat capacity of the content",
            equation="rise = Q / C",
            inputs=inputs,
        ),
        Measure(
            quantity="temperature reached",
            value=top,
            unit="degC",
            basis="start temperature of the mixed liquids plus the warming; water boils before it goes beyond 100 degC",
            equation="T = T(start) + rise",
            inputs=[plain("T(start)", float(course.unreacted.temperature_C[lane]), "degC"), plain("rise", rise, "K")],
        ),
    ]
    row = lane // course.points
    heats, capacities = course.table(course.heat_kJ)[row], course.table(course.capacity_kJ_K)[row]
    beyond = heats - ceiling * capacities
    most = int(np.argmax(beyond))
    surplus = float(beyond[most])
    if surplus > 0:
        power = scale["bath-cooling"]
        slowest = int(np.argmax(beyond / course.fractions))  # where the heat runs furthest ahead of an even bath
        measures += [
            Measure(
                quantity=f"to be carried off so that it stays within {ceiling:g} K",
                value=surplus,
                unit="kJ",
                basis=f"as much as {figures(surplus / ICE_MELTS)} kg of melting ice takes up",
                equation="surplus = Q - C x allowed rise, where it is most",
                inputs=[
                    plain("Q", float(heats[most]), "kJ"),
                    plain("C", float(capacities[most]), "kJ/K", capacity_basis),
                    plain("allowed rise", ceiling, "K"),
                ],
            ),
            Measure(
                quantity=f"shortest time of addition in a bath that takes away {power:g} W",
                value=float(beyond[slowest] / course.fractions[slowest]) / (power / 1000) / 60,
                unit="min",
                basis=f"even addition; what is beyond {ceiling:g} K goes into the bath; half the power, twice the time",
                equation="time = (Q - C x allowed rise) / (fraction added x power), where it is most",
                inputs=[
                    plain("Q", float(heats[slowest]), "kJ"),
                    plain("C", float(capacities[slowest]), "kJ/K", capacity_basis),
                    plain("allowed rise", ceiling, "K"),
                    plain("fraction added", float(course.fractions[slowest]), "1"),
                    plain("power", power, "W", "bath-cooling of the assessment"),
                ],
            ),
        ]
    if top > BOILING_WATER:
        boiled = (top - BOILING_WATER) * capacity / WATER_BOILS
        measures.append(
            Measure(
                quantity="water that would boil away",
                value=boiled,
                unit="kg",
                basis="2257 kJ/kg at 100 degC (CRC Handbook, from memory)",
                equation="m = C x (T - 100 degC) / 2257 kJ/kg",
                inputs=inputs,
            )
        )
    return measures


def foam_drafts(trace: StepTrace, stock: ChemicalStock, scale: Scale) -> list[Draft]:
    """Gas that bubbles through the liquid at once, against the free space above it."""
    course = trace.path
    if course is None or course.mixture.headspace_L is not None:
        return []
    slow = {
        token for firing in course.firings if firing.rule.speed != "at once" for token, _ in firing.reaction.products
    }
    gas = course.mixture.zeros()
    most: dict[str, float] = {}
    bubbling: list[tuple[str, Array, bool]] = []
    for token, amount in course.mixture.gases.items():
        slowed = stock.dissolved_form.get(token, token) in slow
        bubbling.append((token, amount, slowed))
        pace = scale["foam-share-of-slow-gas"] if slowed else 1.0
        gas = gas + pace * amount
        most[token] = pace * float(amount.max())
    litres = course.table(gas) * MOLAR_VOLUME
    if not np.any(litres > 0):
        return []
    if trace.duration_s is not None:
        window = 60.0 * scale["foam-time"]
        litres = litres * np.minimum(window / np.maximum(trace.duration_s, 1.0), 1.0)[:, None]
    room = np.maximum(course.table(np.repeat(trace.capacity_L, course.points) - course.mixture.volume_L), 1e-6)
    ratio = litres / room
    levels = graded(
        ratio, scale["foam-note-freeboard-fraction"], scale["foam-warning-freeboard"], scale["foam-danger-freeboard"]
    )
    if not levels.any():
        return []
    token = max(most, key=most.__getitem__)
    lane = worst_lane(levels, ratio)
    molecules = load(course.mixture, token).molecules
    record = stock.index.gases.get(token)
    name = record.name if record is not None else token
    spread = "" if trace.duration_s is None else f" within {scale['foam-time']:g} min"
    summary = (
        f"{name[:1].upper() + name[1:]} bubbles through the liquid: {litres_words(float(litres.flat[lane]))} of gas{spread} against "
        f"{litres_words(float(room.flat[lane]))} of free space above it."
    )
    equation, left, right = formation_equation(stock, stock.dissolved_form.get(token, token))
    measures = [
        Measure(
            quantity=f"gas in bubbles{spread}",
            value=float(litres.flat[lane]),
            unit="L",
            basis="bubbles of an open vessel at 1 atm, 25 degC",
            equation="V = n x 24.465 L/mol" + (" x time that foam lasts / time of addition" if spread else ""),
            inputs=[
                *(
                    plain(
                        f"n({stock.label(one)})",
                        float(amount[lane]),
                        "mol",
                        "slow: a share of it counts" if slowed else "",
                    )
                    for one, amount, slowed in bubbling
                    if amount[lane] > TRACE
                ),
                *(
                    [
                        plain("time that foam lasts", scale["foam-time"], "min"),
                        plain("time of addition", float(trace.duration_s[0]) / 60, "min"),
                    ]
                    if trace.duration_s is not None
                    else []
                ),
            ],
        ),
        Measure(
            quantity="free space (freeboard)",
            value=float(room.flat[lane]),
            unit="L",
            basis="vessel volume less liquid volume",
            equation="V(free) = V(vessel) - V(liquid)",
            inputs=[
                plain("V(vessel)", float(np.repeat(trace.capacity_L, course.points)[lane]), "L"),
                plain("V(liquid)", float(course.mixture.volume_L[lane]), "L"),
            ],
        ),
    ]
    return [
        Draft(
            "foam",
            (token,),
            levels,
            course.fractions,
            "path",
            trace,
            summary,
            course.table(molecules),
            measures,
            equations=[("equilibrium", equation, left, right)],
            lane=lane,
        )
    ]


def pressure_drafts(trace: StepTrace, stock: ChemicalStock, scale: Scale) -> list[Draft]:
    """Gauge pressure in a sealed vessel."""
    drafts: list[Draft] = []
    for where, course in courses(trace):
        if where == "contact" or course.mixture.headspace_L is None:
            continue
        gauge = course.table(course.mixture.gauge_kPa())
        standing = (
            0.0 if trace.before is None or trace.before.headspace_L is None else float(trace.before.gauge_kPa().max())
        )
        danger = np.full(course.ranges, scale["pressure-danger"])
        if trace.rating_kPa is not None:
            danger = np.minimum(danger, scale["pressure-rating-fraction"] * trace.rating_kPa)
        levels = np.stack(
            [
                graded(row, 0.1 * scale["pressure-warning"], scale["pressure-warning"], limit)
                for row, limit in zip(gauge, danger, strict=True)
            ]
        )
        if standing > 0 and float(gauge.max()) <= scale["markedly-worse-factor"] * standing:
            stood = graded(np.array([standing]), scale["pressure-warning"], scale["pressure-warning"], danger.min())[0]
            levels = np.where(levels <= stood, np.minimum(levels, NOTE), levels)  # a bottle bursts at what it bears
        if not levels.any():
            continue
        lane = worst_lane(levels, gauge)
        top = float(gauge.flat[lane])
        gases = {token: float(amount[lane]) for token, amount in course.mixture.gases.items()}
        token = max(gases, key=gases.__getitem__) if gases else ""
        room = float(course.mixture.headspace_L[lane])
        record = stock.index.gases.get(token)
        summary = (
            f"The closed vessel reaches {figures(top)} kPa above the atmosphere"
            + (f", most of it {record.name}" if record is not None else "")
            + f", in {litres_words(room)} of headspace."
        )
        measures = [
            Measure(
                quantity="gauge pressure",
                value=top,
                unit="kPa",
                basis="ideal gas in the headspace: air shut in, water vapour and the gases at equilibrium with the liquid",
                equation="p = (n(air) + sum of n(gas)) x R x T / V + p(water) - 101.325 kPa",
                inputs=[
                    plain(
                        "n(air)", 0.0 if course.mixture.air_mol is None else float(course.mixture.air_mol[lane]), "mol"
                    ),
                    *(
                        plain(f"n({stock.label(one)})", amount, "mol")
                        for one, amount in gases.items()
                        if amount > TRACE
                    ),
                    plain("R", GAS_CONSTANT_KPA, "kPa L/(mol K)"),
                    plain("T", float(course.mixture.temperature_C[lane]) + KELVIN, "K"),
                    plain("V", room, "L"),
                    plain("p(water)", float(water_vapour_kPa(course.mixture.temperature_C)[lane]), "kPa"),
                    *(constants(stock, token) if token else []),
                ],
            ),
            Measure(
                quantity="headspace",
                value=room,
                unit="L",
                basis="vessel volume less liquid volume",
                equation="V = V(vessel) - V(liquid)",
                inputs=[
                    plain("V(vessel)", float(np.repeat(trace.capacity_L, course.points)[lane]), "L"),
                    plain("V(liquid)", float(course.mixture.volume_L[lane]), "L"),
                ],
            ),
        ]
        if trace.rating_kPa is not None:
            measures.append(
                Measure(
                    quantity="rating of the vessel", value=float(trace.rating_kPa[0]), unit="kPa", basis="as stated"
                )
            )
        draft = Draft(
            "pressure",
            (token,) if token else (),
            levels,
            course.fractions,
            where,
            trace,
            summary,
            None,
            measures,
            lane=lane,
        )
        if token:
            draft.amount = course.table(load(course.mixture, token).molecules)
            equation, left, right = formation_equation(stock, stock.dissolved_form.get(token, token))
            draft.equations = [("equilibrium", equation, left, right)]
        drafts.append(draft)
    return drafts
