"""Gas that leaves the liquid: how much, what it does to air, against what stood there before."""

from __future__ import annotations

from typing import Literal

import numpy as np
from msgspec import Struct

from carboy.bench.make_up import MOLAR_VOLUME
from carboy.bench.trace import Course, StepTrace
from carboy.chemistry.mixture import TRACE, Array, Mixture
from carboy.chemistry.stock import WATER, ChemicalStock
from carboy.hazards.draft import DANGER, NONE, NOTE, WARNING, Draft, Levels, Scale, courses, graded, worst_lane
from carboy.hazards.numbers import amount_words, litres_words
from carboy.hazards.ventilation import pace_measures
from carboy.hazards.workings import gas_measures
from carboy.model.knowledge import Gas, Value
from carboy.model.report import Measure
from carboy.model.rule import Kind
from carboy.reasoning.equation import formation_equation

OXYGEN_IN_AIR = 0.209  # volume fraction
UNLIMITED_ATM = 1e-5  # a gas without a published limit is taken to leave down to 10 ppm
_NOTE_SHARE = 0.1  # of the warning threshold: below it a gas is not worth a line


class Load(Struct, frozen=True):
    """What one gas amounts to in a mixture, ``[L]``: mol in the gas phase, mol dissolved that could follow, atm over the liquid, and
    whether what is dissolved is counted as molecules (an acid gas that dissolves as ions has none)."""

    gas: Array
    dissolved: Array
    pressure: Array
    molecular: bool
    swept_L: float  # litres of air that pass over the liquid while one stands by

    @property
    def molecules(self) -> Array:
        """mol of the gas as such, dissolved or not."""
        return self.gas + self.dissolved if self.molecular else self.gas

    def leaving(self, limit_atm: float) -> Array:
        """mol that leave into air until the air over the liquid has fallen to ``limit_atm``: all bubbles, and of what is dissolved the
        share above the equilibrium with that air (Henry's law), but no more than the air that passes over can carry."""
        above = np.maximum(
            1.0 - np.divide(limit_atm, self.pressure, out=np.full_like(self.pressure, np.inf), where=self.pressure > 0),
            0.0,
        )
        carried = self.pressure * self.swept_L / MOLAR_VOLUME
        return self.gas + np.minimum(self.dissolved * above, np.where(above > 0, carried, 0.0))


class Yardstick(Struct, frozen=True):
    """What judges a gas under one kind: a concentration in air, with its name and origin."""

    kind: Kind
    ppm: float
    words: str
    basis: str
    danger: bool  # whether the published figure carries a danger signal
    over_liquid: float  # ppm over the liquid from which a warning stands, inf if none
    source: str


def load(mixture: Mixture, token: str, swept_L: float = np.inf) -> Load:
    """The load of gas ``token``."""
    none = mixture.zeros()
    gas, pressure = mixture.gases.get(token, none), mixture.pressures.get(token, none)
    molecule = mixture.stock.dissolved_form.get(token)
    if molecule is not None:
        held = sum((mixture.aqueous.get(form, none) for form in mixture.stock.carriers(molecule)), none)
        return Load(gas, held, pressure, True, swept_L)
    reserve = [
        mixture.total(part) / count
        for part, count in mixture.stock.components_of(token).items()
        if count > 0 and part != WATER
    ]
    held = np.minimum.reduce(reserve) - gas if reserve else none
    return Load(gas, np.maximum(held, 0.0), pressure, False, swept_L)


def yardsticks(gas: Gas, classes: frozenset[str], scale: Scale) -> list[Yardstick]:
    """By what a gas is judged: one yardstick for each kind of hazard that its classes name."""
    found: list[Yardstick] = []
    short = gas.ceiling.magnitude if gas.ceiling is not None else np.inf
    if "toxic-gas" in classes:
        chain: list[tuple[Value | None, str, bool]] = [
            (gas.idlh, "IDLH", True),
            (gas.aegl3, "AEGL-3 (10 min)", True),
            (gas.aegl2, "AEGL-2 (10 min)", True),
            (gas.ceiling, "short-term limit", False),
        ]
        for value, name, danger in chain:
            if value is not None:
                ppm, words, basis = value.magnitude, name, f"{name} {value.magnitude:g} ppm"
                if not danger:
                    ppm *= scale["acute-over-short-term-factor"]
                    basis = f"{ppm:g} ppm, {scale['acute-over-short-term-factor']:g} times its short-term limit"
                    words = "level taken as acute"
                found.append(Yardstick("toxic-gas", ppm, words, basis, danger, short, value.source))
                break
        else:
            found.append(
                Yardstick(
                    "toxic-gas", np.nan, "", "no published limit in the graph; judged by amount", True, np.inf, ""
                )
            )
    if "flammable-gas" in classes and gas.lower_flammable is not None:
        lower = gas.lower_flammable
        found.append(
            Yardstick(
                "flammable-gas",
                lower.magnitude * 1e4,
                "lower flammable limit",
                f"lower flammable limit {lower.magnitude:g} vol %",
                True,
                np.inf,
                lower.source,
            )
        )
    if "asphyxiant-gas" in classes:
        room = scale["asphyxiant-room-volume"]
        share = scale["asphyxiant-warning-fraction"]
        source = gas.idlh.source if gas.idlh is not None else ""
        found.append(
            Yardstick(
                "asphyxiant-gas",
                share * 1e6,
                f"{100 * share:g} % by volume",
                f"{100 * share:g} % by volume (a small room holds {room:g} m3)",
                True,
                np.inf,
                source,
            )
        )
    if "oxidising-gas" in classes and "toxic-gas" not in classes:
        enriched = scale["oxygen-enriched-fraction"]
        ppm = (
            (enriched - OXYGEN_IN_AIR) / (1.0 - OXYGEN_IN_AIR) * 1e6
        )  # pure oxygen let into air until it holds that much
        found.append(
            Yardstick(
                "oxygen",
                ppm,
                "enriched air",
                f"{100 * enriched:g} vol % oxygen",
                True,
                np.inf,
                "",
            )
        )
    return found


def gas_drafts(trace: StepTrace, stock: ChemicalStock, scale: Scale) -> list[Draft]:
    """All gas findings of a step: along the path, at contact, in storage."""
    drafts: list[Draft] = []
    for where, course in courses(trace):
        for token in course.mixture.gases:
            record = stock.index.gases.get(token)
            if record is None:
                continue
            now = load(course.mixture, token, scale["swept-air"])
            if not np.any(now.gas + now.dissolved * (now.pressure > 0) > TRACE):
                continue
            for stick in yardsticks(record, record_classes(stock, token), scale):
                looked_at = scale.afresh()
                judged = _judge(trace, where, course, token, stick, now, looked_at)
                if judged is not None:
                    draft = _draft(trace, where, course, token, record, stick, judged, stock, looked_at)
                    draft.thresholds = looked_at.used
                    drafts.append(draft)
    return drafts


def record_classes(stock: ChemicalStock, token: str) -> frozenset[str]:
    """Classes of a gas with all above them."""
    species = stock.index.species.get(token)
    keys = species.classes if species is not None else ()
    return frozenset(up for key in keys for up in stock.index.ancestors.get(key, (key,)))


def _standing(
    trace: StepTrace, course: Course, token: str, limit_atm: float, where: str, swept_L: float
) -> tuple[Array, Array, Array]:
    """Molecules, mol that can leave and pressure of the vessel and of the addition before they met, laid out over the course."""
    molecules, leaving, pressure = (np.zeros(course.mixture.lanes) for _ in range(3))
    ones = np.ones(course.points)
    parts: list[tuple[Mixture | None, Array]] = [(trace.before, ones), (trace.added, course.fractions)]
    if where == "storage":
        parts = [(part, ones) for part in trace.left_alone]
    for mixture, along_path in parts:
        if mixture is None or not mixture.amounts:
            continue
        if mixture.neat:
            if _gives_by_itself(mixture, token):
                leaving, pressure = leaving + np.inf, pressure + np.inf
            continue
        own = load(mixture, token, swept_L)
        weight = np.tile(along_path if where == "path" else ones, mixture.lanes)
        if where == "contact":
            whole = np.repeat(mixture.volume_L, course.points)
            weight = np.minimum(
                np.divide(course.mixture.volume_L, whole, out=np.ones_like(whole), where=whole > 0), 1.0
            )
        molecules = molecules + np.repeat(own.molecules, course.points) * weight
        leaving = leaving + np.repeat(own.leaving(limit_atm), course.points) * weight
        pressure = np.maximum(pressure, np.repeat(own.pressure, course.points))
    return molecules, leaving, pressure


def _gives_by_itself(mixture: Mixture, token: str) -> bool:
    """Whether a neat liquid or gas fumes with ``token`` of its own (glacial acetic acid with its vapour)."""
    wanted = {part: count for part, count in mixture.stock.components_of(token).items() if part != WATER}
    for name in mixture.neat:
        if mixture.stock.index.substances[name].state in ("l", "g"):
            brought = mixture.stock.yield_of(name)
            if all(brought.get(part, 0.0) * np.sign(count) >= abs(count) - 1e-9 for part, count in wanted.items()):
                return True
    return False


class Judged(Struct, frozen=True):
    """One gas under one yardstick over a course: levels ``[ranges, points]``, and ``[lanes]`` of mol formed, mol leaving, litres of air."""

    levels: Levels
    formed: Array
    leaving: Array
    air_L: Array
    pressure: Array
    stood: bool
    stood_mol: Array  # that could leave the vessel before anything was poured


def _judge(
    trace: StepTrace,
    where: str,
    course: Course,
    token: str,
    stick: Yardstick,
    now: Load,
    scale: Scale,
) -> Judged | None:
    limit_atm = UNLIMITED_ATM if np.isnan(stick.ppm) else stick.ppm * 1e-6
    before_molecules, before_leaving, before_pressure = _standing(trace, course, token, limit_atm, where, now.swept_L)
    leaving = now.leaving(limit_atm)
    levels, air = _levels(stick, now, leaving, scale, course.mixture.headspace_L is not None)
    factor = scale["markedly-worse-factor"]
    worse = (leaving > factor * before_leaving) & ((now.pressure > factor * before_pressure) | (now.gas > TRACE))
    levels = np.where(worse, levels, np.where(levels >= WARNING, NOTE, NONE))
    if where == "contact":
        levels = np.minimum(levels, WARNING)
    table = course.table(levels)
    if not table.any():
        return None
    stood = not bool((worse & (levels > 0)).any())
    before = trace.before
    own = np.zeros(course.mixture.lanes)
    if before is not None and before.amounts and not before.neat:
        own = np.repeat(load(before, token, now.swept_L).leaving(limit_atm), course.points)
    formed = np.maximum(now.molecules - before_molecules, 0.0)
    return Judged(table, formed, leaving, air, now.pressure, stood, own)


def _levels(stick: Yardstick, now: Load, leaving: Array, scale: Scale, sealed: bool) -> tuple[Levels, Array]:
    if np.isnan(stick.ppm):
        warning, danger = scale["unlimited-gas-warning"], scale["unlimited-gas-danger"]
        return graded(leaving, _NOTE_SHARE * warning, warning, danger), np.full_like(leaving, np.nan)
    air = leaving * MOLAR_VOLUME / (stick.ppm * 1e-6)
    if stick.kind == "asphyxiant-gas":
        share = leaving * MOLAR_VOLUME / (1000 * scale["asphyxiant-room-volume"])
        note, warning, danger = (scale[f"asphyxiant-{level}-fraction"] for level in ("note", "warning", "danger"))
        return graded(share, _NOTE_SHARE * note, warning, danger), air
    key = {"toxic-gas": "toxic-gas", "oxygen": "oxygen"}.get(stick.kind, "flammable-gas")
    warning, danger = scale[f"{key}-warning-air"], scale[f"{key}-danger-air"]
    over = now.pressure * 1e6
    levels = graded(air, _NOTE_SHARE * warning, warning, np.inf)
    levels = np.where(leaving < scale["least-gas"], NONE, levels)
    severe = air >= danger
    if stick.kind == "toxic-gas":
        levels = np.where((over > stick.over_liquid) & (levels == NOTE), WARNING, levels)
        severe = severe & (over > stick.ppm)
    if stick.kind == "flammable-gas" and sealed:
        severe = severe | (over >= scale["closed-vessel-flammable-fraction"] * stick.ppm)
    if not stick.danger:  # only a short-term limit is published: the amount alone tells what is grave
        severe = leaving >= scale["unlimited-gas-danger"]
    return np.where(severe, DANGER, levels), air


def _draft(
    trace: StepTrace,
    where: Literal["path", "contact", "storage"],
    course: Course,
    token: str,
    record: Gas,
    stick: Yardstick,
    judged: Judged,
    stock: ChemicalStock,
    scale: Scale,
) -> Draft:
    size = judged.leaving if np.isnan(stick.ppm) else judged.air_L
    lane = worst_lane(judged.levels, course.table(size))
    equation, left, right = formation_equation(stock, stock.dissolved_form.get(token, token))
    leaving, air = float(judged.leaving[lane]), float(judged.air_L[lane])
    limit = (
        None
        if np.isnan(stick.ppm)
        else Measure(quantity=stick.words, value=stick.ppm, unit="ppm", basis=stick.basis, source=stick.source)
    )
    measures = gas_measures(course, token, leaving, air, limit, stick.words, lane, stock)
    if where == "path" and not judged.stood:
        short = stick.over_liquid if np.isfinite(stick.over_liquid) else stick.ppm
        words = "short-term limit" if np.isfinite(stick.over_liquid) else stick.words
        if stick.kind == "flammable-gas":
            share = scale["closed-vessel-flammable-fraction"]
            short, words = share * stick.ppm, f"{share:g} of the lower flammable limit"
        also = ((stick.ppm, stick.words),) if np.isfinite(stick.over_liquid) and np.isfinite(stick.ppm) else ()
        stood = judged.stood_mol if np.any(judged.stood_mol > 0) else None
        measures += pace_measures(trace, course, judged.leaving, short, words, scale, also=also, stood=stood)
    if record.odour_warning:
        measures.append(
            Measure(
                quantity="warning by smell",
                value=None,
                unit=record.odour_warning,
                basis="odour threshold against the limit",
            )
        )
    summary = _summary(record, stick, float(judged.formed[lane]), leaving, air, where, judged.stood)
    return Draft(
        stick.kind,
        (token,),
        judged.levels,
        course.fractions,
        where,
        trace,
        summary,
        course.table(judged.formed),
        measures,
        equations=[("equilibrium", equation, left, right)],
        sources=[stick.source] if stick.source else [],
        lane=lane,
    )


def _summary(
    record: Gas, stick: Yardstick, formed: float, leaving: float, air_L: float, where: str, stood: bool
) -> str:
    name = record.name[:1].upper() + record.name[1:]
    its = "" if stick.basis[:1].isdigit() else "its "
    reach = f", enough to bring {litres_words(air_L)} of air to {its}{stick.basis}" if not np.isnan(air_L) else ""
    if stood:
        return f"{name} stands over the liquid as it did before ({amount_words(leaving)} can leave{reach})."
    place = {
        "contact": "may puff out where the stream falls in",
        "path": "is set free",
        "storage": "is set free while it stands",
    }[where]
    forms = f"{amount_words(formed)} forms, " if formed > TRACE else ""
    return f"{name} {place}: {forms}{amount_words(leaving)} ({litres_words(leaving * MOLAR_VOLUME)}) can leave the liquid{reach}."
