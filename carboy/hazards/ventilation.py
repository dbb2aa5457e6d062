"""Gas in the air of a hood or room: at the pace of the addition, and if all of it came out at once.

Dilution ventilation of well-mixed air: at a steady release of ``G`` litres of gas a second into ``Q`` cubic metres of air a second the
concentration is ``G / (1000 Q)`` (ACGIH, Industrial Ventilation, dilution equation with a mixing factor of one; from memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from carboy.bench.make_up import MOLAR_VOLUME
from carboy.bench.trace import Course, StepTrace
from carboy.chemistry.mixture import Array
from carboy.hazards.draft import Scale
from carboy.hazards.numbers import figures
from carboy.hazards.workings import plain
from carboy.model.plan import Interval, Setting
from carboy.model.report import Measure

_HOUR = 3600.0
_ROOMS = ("room", "bench", "store", "corridor")


@dataclass(frozen=True)
class Air:
    """The air about the vessel: its flow in m3/s, the volume of the room in m3, and how one says where it is."""

    flow: float
    room: float
    words: str
    assumed: bool


def air_of(setting: Setting, scale: Scale) -> Air:
    """The air of a setting; what is not stated is taken from the thresholds of the graph."""
    room = _middle(setting.room_volume, scale["room-air-volume"])
    if any(word in setting.place.lower() for word in _ROOMS) and setting.hood_flow is None:
        changes = _middle(setting.air_changes, scale["room-air-changes-per-hour"])
        assumed = setting.air_changes is None or setting.room_volume is None
        return Air(
            changes * room / _HOUR, room, f"the room ({figures(room)} m3, {figures(changes)} changes an hour)", assumed
        )
    flow = _middle(setting.hood_flow, scale["hood-air-per-second"])
    return Air(flow, room, f"a hood drawing {figures(flow)} m3/s", setting.hood_flow is None)


def _middle(stated: Interval | None, otherwise: float) -> float:
    return otherwise if stated is None else 0.5 * (stated.low + stated.high)


def pace_measures(
    trace: StepTrace, course: Course, leaving: Array, limit_ppm: float, limit_words: str, scale: Scale
) -> list[Measure]:
    """What the pace of the addition does to the air: ppm at the stated pace, the shortest time of addition that keeps to the limit, and the
    room if all came out at once. ``leaving`` is mol ``[lanes]``."""
    air = air_of(trace.setting, scale)
    along = course.table(leaving).max(axis=0)
    steepest = _steepest(along, course.fractions)
    total = float(along.max())
    basis = f"dilution by {air.words}{', taken since none is stated' if air.assumed else ''}"
    measures = []
    if trace.duration_s is not None and float(trace.duration_s[0]) > 0:
        seconds = float(trace.duration_s[0])
        ppm = steepest / seconds * MOLAR_VOLUME / 1000 / air.flow * 1e6
        measures.append(
            Measure(
                quantity="in that air at this pace",
                value=ppm,
                unit="ppm",
                basis=basis,
                equation="ppm = 1e6 x (mol per unit of the addition / time) x 24.465 L/mol / (1000 x flow)",
                inputs=[
                    plain("steepest release", steepest, "mol"),
                    plain("time of addition", seconds, "s"),
                    plain("flow", air.flow, "m3/s"),
                ],
            )
        )
    if np.isfinite(limit_ppm) and limit_ppm > 0:
        shortest = steepest * MOLAR_VOLUME / 1000 / (air.flow * limit_ppm * 1e-6)
        measures.append(
            Measure(
                quantity=f"shortest time of addition that keeps that air below its {limit_words}",
                value=shortest / 60,
                unit="min",
                basis=basis,
                equation="time = steepest release x 24.465 L/mol / (1000 x flow x limit)",
                inputs=[
                    plain("steepest release", steepest, "mol"),
                    plain("flow", air.flow, "m3/s"),
                    plain(limit_words, limit_ppm, "ppm"),
                ],
            )
        )
    measures.append(
        Measure(
            quantity="in the room if all of it came out at once",
            value=total * MOLAR_VOLUME / (1000 * air.room) * 1e6,
            unit="ppm",
            basis=f"evenly in {figures(air.room)} m3",
            equation="ppm = 1e6 x mol x 24.465 L/mol / (1000 x room)",
            inputs=[plain("gas that can leave", total, "mol"), plain("room", air.room, "m3")],
        )
    )
    return measures


def _steepest(along: Array, fractions: Array) -> float:
    """mol set free per whole addition where it comes fastest along the path."""
    if len(fractions) < 2:
        return float(along.max())
    slopes = np.diff(np.concatenate([[0.0], along])) / np.diff(np.concatenate([[0.0], fractions]))
    return max(float(slopes.max()), 0.0)
