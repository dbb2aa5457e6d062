"""Gas in the air of a hood or room: at the pace of the addition, and if all of it came out at once.

Dilution ventilation of well-mixed air with a mixing factor of one (ACGIH, Industrial Ventilation, build-up and decay equations; from memory).
While ``G`` litres of gas a second come into a room of ``V`` m3 that is swept by ``Q`` m3/s, the concentration goes from ``c`` to
``c exp(-Q t / V) + G / (1000 Q) (1 - exp(-Q t / V))``. The air of a hood is renewed within seconds, so there it is ``G / (1000 Q)`` at once.
Where flow or room are stated as a range, the least of it is taken.
"""

from __future__ import annotations

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from carboy.bench.make_up import MOLAR_VOLUME
from carboy.bench.trace import Course, StepTrace
from carboy.chemistry.mixture import Array
from carboy.hazards.draft import Scale
from carboy.hazards.numbers import figures
from carboy.hazards.workings import plain
from carboy.model.plan import Interval, Setting
from carboy.model.report import Measure

_HOUR = 3600.0
_ROOMS = ("room", "bench", "store")
_NO_SUCH_AIR = (
    "outdoors",
    "glovebox",
    "cabinet",
)  # neither a hood nor a room: without a stated flow there is no telling
_PRECISION = 1e-4  # of a time of addition
_AT_ONCE = 1e-9  # s


class Air(Struct, frozen=True):
    """The air about the vessel: its flow in m3/s, the volume in m3 in which gas gathers (None: swept away at once), the volume of the
    room, and how one says where it is."""

    flow: float
    gathers: float | None
    room: float
    words: str
    assumed: bool


def air_of(setting: Setting, scale: Scale) -> Air | None:
    """The air of a setting; what is not stated is taken from the thresholds of the graph. None where nothing is known of it."""
    place = setting.place.lower()
    room = _least(setting.room_volume, scale["room-air-volume"])
    if setting.hood_flow is None and (place in _ROOMS or (place != "hood" and setting.air_changes is not None)):
        changes = _least(setting.air_changes, scale["room-air-changes-per-hour"])
        assumed = setting.air_changes is None or setting.room_volume is None
        words = f"the room ({figures(room)} m3, {figures(changes)} changes an hour)"
        return Air(changes * room / _HOUR, room, room, words, assumed)
    if setting.hood_flow is None and place in _NO_SUCH_AIR:
        return None
    flow = _least(setting.hood_flow, scale["hood-air-per-second"])
    return Air(flow, None, room, f"a hood drawing {figures(flow)} m3/s", setting.hood_flow is None)


def _least(stated: Interval | None, otherwise: float) -> float:
    return otherwise if stated is None else stated.low


def peak_fraction(release: Array, fractions: Array, seconds: float, air: Air) -> float:
    """Highest volume fraction in the air while an addition of ``seconds`` is under way.

    ``release`` is mol ``[ranges, points]`` set free until each of the ``fractions``, from nothing at the start. What is taken up by the
    liquid again has left no air.
    """
    width = np.diff(np.concatenate([[0.0], fractions]))
    freed = np.maximum(np.diff(release, axis=1, prepend=0.0), 0.0) * MOLAR_VOLUME / 1000  # m3 in each part of the path
    if air.gathers is None:
        return float((freed / (width * seconds * air.flow)).max())
    there = np.zeros(len(release))
    highest = 0.0
    for part, share in zip(freed.T, width, strict=True):
        turnover = air.flow * share * seconds / air.gathers
        kept = np.exp(-turnover)
        # at no time at all the part goes into the room as it is
        gained = part / air.gathers * (-np.expm1(-turnover) / turnover if turnover > 1e-12 else 1.0)
        there = there * kept + gained
        highest = max(highest, float(there.max()))
    return highest


def shortest_time(release: Array, fractions: Array, limit: float, air: Air) -> float:
    """The least time of addition, s, at which :func:`peak_fraction` stays within ``limit``; 0 where even all at once does."""
    steady = peak_fraction(release, fractions, 1.0, replace(air, gathers=None)) / limit  # long enough for any room
    if air.gathers is None or steady == 0.0:
        return steady
    if peak_fraction(release, fractions, _AT_ONCE, air) <= limit:
        return 0.0
    low, high = 0.0, steady
    while high - low > _PRECISION * high:
        middle = 0.5 * (low + high)
        low, high = (middle, high) if peak_fraction(release, fractions, middle, air) > limit else (low, middle)
    return high


def pace_measures(
    trace: StepTrace,
    course: Course,
    leaving: Array,
    limit_ppm: float,
    limit_words: str,
    scale: Scale,
    *,
    also: tuple[tuple[float, str], ...] = (),
    stood: Array | None = None,
) -> list[Measure]:
    """What the pace of the addition does to the air: ppm at the stated pace, the shortest time of addition that keeps to the limit, and the
    room if all came out at once. ``leaving`` is mol ``[lanes]``; ``also`` further limits in ppm with their words; ``stood`` mol ``[lanes]``
    that could leave before anything was poured, which is no doing of the addition."""
    air = air_of(trace.setting, scale)
    release = course.table(leaving if stood is None else np.maximum(leaving - stood, 0.0))
    total = float(release.max())
    if air is None:
        return []
    basis = f"well-mixed air of {air.words}{', taken since none is stated' if air.assumed else ''}"
    place = "the hood" if air.gathers is None else "the room"
    swept = [plain("flow", air.flow, "m3/s")]
    equation = "ppm = 1e6 x (mol set free per second) x 24.465 L/mol / (1000 x flow)"
    if air.gathers is not None:
        swept.append(plain("volume of the room", air.gathers, "m3"))
        equation += ", reached as 1 - exp(-flow x time / volume)"
    measures = []
    if trace.duration_s is not None and float(trace.duration_s[0]) > 0:
        seconds = float(trace.duration_s[0])
        measures.append(
            Measure(
                quantity=f"at this pace, in the air of {place}",
                value=1e6 * peak_fraction(release, course.fractions, seconds, air),
                unit="ppm",
                basis=basis,
                equation=equation,
                inputs=[plain("gas that can leave", total, "mol"), plain("time of addition", seconds, "s"), *swept],
            )
        )
    for ppm, words in ((limit_ppm, limit_words), *also):
        if np.isfinite(ppm) and ppm > 0:
            measures.append(
                Measure(
                    quantity=f"shortest time of addition that keeps the air of {place} below its {words}",
                    value=shortest_time(release, course.fractions, ppm * 1e-6, air) / 60,
                    unit="min",
                    basis=basis,
                    equation=f"the time at which, where the gas comes fastest, {equation} is the limit",
                    inputs=[plain("gas that can leave", total, "mol"), *swept, plain(words, ppm, "ppm")],
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
