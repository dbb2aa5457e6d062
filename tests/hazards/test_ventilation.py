"""Gas in closed headspaces and in the air of hoods and rooms, worked by hand.

Dilution ventilation: ACGIH, Industrial Ventilation (build-up and steady state, mixing factor one; from memory). Henry constants at
25 degC, mol/(kg atm), Sander's compilation (Atmos. Chem. Phys. 15, 4399, 2015): H2S 0.10, CO2 0.034. Vapour pressure of water, CRC
Handbook: 3.17 kPa at 25 degC, 4.25 at 30, 7.38 at 40, 12.35 at 50. Limits in air, NIOSH Pocket Guide: H2S ceiling 10 ppm, IDLH 100 ppm.
Molar volume 24.465 L at 25 degC and 1 atm, RT 2.479 kJ/mol.
"""

from __future__ import annotations

from math import exp
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from carboy.hazards.draft import Scale
from carboy.hazards.ventilation import Air, air_of, pace_measures, peak_fraction, shortest_time
from carboy.model.plan import Interval, Setting
from carboy.model.report import Finding, Report
from carboy.text.cases import case_from_mapping
from carboy.vetting import laboratory
from tests.bench.reports import measure, only, outline, select

CUBIC_METRES_PER_MOL = 0.024465
H2S_CEILING = 10e-6
SCALE = Scale(laboratory().index)


def vetted(*steps: Any, setting: dict[str, str] | None = None, **vessel: Any) -> Report:
    lab = laboratory()
    plan: dict[str, Any] = {"title": "A test", "vessels": {"tank": {"volume": "5 L", **vessel}}, "steps": list(steps)}
    if setting is not None:
        plan["setting"] = setting
    return lab.vet(case_from_mapping(plan, lab.names))


def gauge(report: Report, step: int) -> float:
    pair = report.steps[step - 1].gauge_kPa
    assert pair is not None
    assert pair[0] == pytest.approx(pair[1])
    return pair[0]


# --- closed: partition, water vapour, rating ---------------------------------------------------------------------


@pytest.mark.parametrize(
    ("celsius", "kPa"),
    # closed at 25 degC over 98.155 kPa of air and 3.17 of vapour; the air follows the gas law, the vapour its table.
    # 30: 98.155 x 303.15/298.15 = 99.80, + 4.25 - 101.325; 40: 103.09 + 7.38 - 101.325; 50: 106.39 + 12.35 - 101.325
    [(25, 0.0), (30, 2.73), (40, 9.15), (50, 17.41)],
)
def test_water_closed_up_and_warmed(celsius: int, kPa: float) -> None:
    report = vetted(
        {"add": "100 mL of water"}, {"seal": "tank"}, {"heat": "tank", "to": f"{celsius} degC"}, volume="1 L"
    )
    assert gauge(report, 3) == pytest.approx(kPa, abs=0.06)


def carbonated(*more: Any, **vessel: Any) -> Report:
    """0.5 g of hydrogencarbonate, 5.952 mmol, in 100 mL of acid, closed in 1 L and treated further."""
    steps = ({"add": "100 mL of 1 M hydrochloric acid"}, {"add": "0.5 g of sodium bicarbonate"})
    return vetted(*steps, *more, volume="1 L", cover="sealed", **vessel)


def test_carbon_dioxide_and_vapour_at_two_temperatures() -> None:
    # n_g = 5.952 / (1 + 0.034 x 0.1 x 24.465 / 0.9) = 5.952 / 1.092 = 5.45 mmol; x 2.479 / 0.9 = 15.0 kPa at 25 degC.
    # At 40 the same moles (the partition stays that of 25): 15.0 x 313.15 / 298.15 = 15.8, and 9.15 of air and vapour
    report = carbonated({"heat": "tank", "to": "40 degC"})
    gas = report.steps[1].gas_mol["CO2"]
    assert gas[1] == pytest.approx(5.45e-3, rel=0.02)
    assert gauge(report, 2) == pytest.approx(15.0, abs=0.8)  # and half a kelvin either way
    assert gauge(report, 3) == pytest.approx(15.8 + 9.15, abs=0.5)


@pytest.mark.parametrize(
    ("rating", "signal"),
    # 15 kPa: beyond half of 20 and of 28 kPa, not of 40; without a rating below the 50 kPa that any bottle is trusted with
    [("20 kPa", "danger"), ("28 kPa", "danger"), ("40 kPa", "warning"), (None, "warning")],
)
def test_rating_against_pressure(rating: str | None, signal: str) -> None:
    report = carbonated(**({} if rating is None else {"rating": rating}))
    found = only(report, "pressure", "CO2")
    assert found.signal == signal
    assert found.moment in ("during", "after")
    named = [one for one in found.measures if one.quantity == "rating of the vessel"]
    assert [one.value for one in named] == ([] if rating is None else [float(rating.split()[0])])


def test_warmed_beyond_what_it_bears_is_a_danger_though_it_pressed_before() -> None:
    # 1.25 g: 37.5 kPa, a warning; at 60 degC 37.5 x 1.117 = 41.9 and 98.155 x 1.117 + 19.9 - 101.3 = 28.3: 70 kPa, less
    # than double, yet beyond 50
    steps = ({"add": "100 mL of 1 M hydrochloric acid"}, {"add": "1.25 g of sodium bicarbonate"})
    report = vetted(*steps, {"heat": "tank", "to": "60 degC"}, volume="1 L", cover="sealed")
    assert only(report, "pressure", step=2).signal == "warning"
    assert gauge(report, 3) == pytest.approx(70, abs=3)
    assert only(report, "pressure", step=3).signal == "danger", outline(report)


def test_standing_on_as_it_was_is_no_news() -> None:
    report = carbonated({"stand": "1 h"})
    assert gauge(report, 3) == pytest.approx(gauge(report, 2), abs=1.5)
    assert all(one.signal == "note" for one in select(report, "pressure", step=3)), outline(report)


# --- open: bubbles and stripping ----------------------------------------------------------------------------------


def inputs_of(finding: Finding, quantity: str) -> dict[str, float]:
    (found,) = (one for one in finding.measures if one.quantity == quantity)
    return {one.quantity: one.value for one in found.inputs if isinstance(one.value, float)}


def test_hydrogen_sulfide_bubbles_beyond_an_atmosphere() -> None:
    # 1.2 mol of acid on 0.3 mol of sulfide in 1.2 L: 0.25 mol/L, 2.5 atm: all but 0.10 x 0.97 x 1.2 = 0.116 mol bubbles; less
    # in brine of 1 mol/kg, 0.116 / 10**0.1 = 0.092; the rest can be stripped
    report = vetted({"add": "600 mL of 2 M hydrochloric acid"}, {"add": "600 mL of 0.5 M sodium sulfide"})
    found = only(report, "toxic-gas", "H2S")
    parts = inputs_of(found, "gas that can leave")
    assert parts["in bubbles or headspace"] == pytest.approx(0.3 - 0.092, abs=0.006)
    assert parts["in bubbles or headspace"] + parts["dissolved as molecules"] == pytest.approx(0.3, rel=0.01)
    assert measure(found, "gas that can leave") == pytest.approx(0.3, rel=0.01)


def test_hydrogen_sulfide_below_an_atmosphere_is_stripped() -> None:
    # 1 mmol in 1.01 L: 9.9e-3 atm, no bubble; it leaves until the air over it is at 100 ppm: 1 x (1 - 1e-4 / 9.9e-3)
    report = vetted({"add": "1 L of 0.1 M hydrochloric acid"}, {"add": "10 mL of 0.1 M sodium sulfide"})
    found = only(report, "toxic-gas", "H2S")
    parts = inputs_of(found, "gas that can leave")
    assert parts["in bubbles or headspace"] == pytest.approx(0.0, abs=1e-9)
    assert measure(found, "gas that can leave") == pytest.approx(0.99e-3, rel=0.01)


# --- the pace of an addition in the air of a hood -----------------------------------------------------------------

SULFIDE = {"add": "100 mL of 0.1 M sodium sulfide", "over": "30 min"}  # 10 mmol
HOOD = {"place": "hood", "hood_flow": "0.5 m3/s"}


def test_ppm_in_a_hood_along_a_dose() -> None:
    # 10 mmol in 1800 s: 0.01 x 0.024465 / 1800 = 1.359e-7 m3/s into 0.5 m3/s: 0.272 ppm
    found = only(vetted({"add": "1 L of 0.1 M hydrochloric acid"}, SULFIDE, setting=HOOD), "toxic-gas", "H2S")
    assert measure(found, "at this pace") == pytest.approx(0.272, rel=0.01)
    # 10 ppm of 0.5 m3/s is 5e-6 m3/s: 0.01 x 0.024465 / 5e-6 = 48.9 s
    assert measure(
        found, "shortest time of addition that keeps the air of the hood below its short-term limit"
    ) == pytest.approx(48.9 / 60, rel=0.01)
    # all at once in the 50 m3 that stand for a room: 0.01 x 0.024465 / 50 = 4.9 ppm
    assert measure(found, "in the room if all") == pytest.approx(4.89, rel=0.01)


def test_ten_times_slower_is_ten_times_less() -> None:
    def ppm(over: str) -> float:
        step = {**SULFIDE, "over": over}
        found = only(vetted({"add": "1 L of 0.1 M hydrochloric acid"}, step, setting=HOOD), "toxic-gas", "H2S")
        return measure(found, "at this pace")

    assert ppm("3 min") == pytest.approx(10 * ppm("30 min"), rel=1e-6)


def test_gas_that_comes_late_comes_faster() -> None:
    # 0.1 mol of base, then 50 mmol of sulfide that takes 50 mmol to HS- and 50 to H2S: of 200 mmol of acid only the last
    # quarter sets H2S free, four times as fast as the mean: 0.05 x 4 x 0.024465 / 3600 / 0.5 = 2.72 ppm
    report = vetted(
        {"add": "1 L of (0.05 M sodium sulfide + 0.1 M sodium hydroxide)"},
        {"add": "1 L of 0.2 M hydrochloric acid", "over": "60 min"},
        setting=HOOD,
    )
    found = only(report, "toxic-gas", "H2S")
    assert 0.95 * 2.72 < measure(found, "at this pace") < 1.15 * 2.72


def test_no_pace_no_concentration_but_a_time() -> None:
    step = {"add": "100 mL of 0.1 M sodium sulfide"}
    found = only(vetted({"add": "1 L of 0.1 M hydrochloric acid"}, step, setting=HOOD), "toxic-gas", "H2S")
    assert not [one for one in found.measures if one.quantity.startswith("at this pace")]
    assert measure(
        found, "shortest time of addition that keeps the air of the hood below its short-term limit"
    ) == pytest.approx(48.9 / 60, rel=0.01)


def test_of_a_stated_range_of_flow_the_least_counts() -> None:
    setting = {"place": "hood", "hood_flow": "0.25-0.75 m3/s"}
    found = only(vetted({"add": "1 L of 0.1 M hydrochloric acid"}, SULFIDE, setting=setting), "toxic-gas", "H2S")
    assert measure(found, "at this pace") == pytest.approx(0.544, rel=0.01)


def test_a_second_limit_and_what_stood_before() -> None:
    lab = laboratory()
    plan = {"title": "A test", "steps": [{"add": "1 L of 0.1 M hydrochloric acid"}, SULFIDE], "setting": HOOD}
    trace = lab.walk(case_from_mapping(plan, lab.names)).steps[1]
    course = trace.path
    assert course is not None
    even = 0.02 + 0.01 * np.tile(course.fractions, course.ranges)  # 20 mmol were there, 10 come with the addition
    both = pace_measures(
        trace, course, even, 10.0, "limit", SCALE, also=((100.0, "IDLH"),), stood=np.full(len(even), 0.02)
    )
    times = [one.value for one in both if one.quantity.startswith("shortest")]
    # 0.01 x 0.024465 m3 into 0.5 m3/s: 48.9 s at 10 ppm, 4.89 s at 100
    assert times == pytest.approx([48.93 / 60, 4.893 / 60], rel=1e-3)
    (pace,) = (one.value for one in both if one.quantity.startswith("at this pace"))
    assert pace == pytest.approx(0.2718, rel=1e-3)


# --- a room ---------------------------------------------------------------------------------------------------------

ROOM = {"place": "room", "room_volume": "30 m3", "air_changes": "4 /h"}


def test_build_up_in_a_room() -> None:
    # 0.1 mol in 1800 s: 1.359e-6 m3/s; 30 m3 x 4/h = 0.03333 m3/s: 40.8 ppm in the end, of which 1 - exp(-4 x 0.5 h)
    # = 0.865 in half an hour: 35.3 ppm
    report = vetted(
        {"add": "1 L of 1 M hydrochloric acid"},
        {"add": "500 mL of 0.2 M sodium sulfide", "over": "30 min"},
        setting=ROOM,
    )
    found = only(report, "toxic-gas", "H2S")
    assert measure(found, "at this pace") == pytest.approx(35.3, rel=0.015)
    # 81.5 ppm if all came at once (0.1 x 0.024465 / 30); 81.5 (1 - exp(-x)) / x = 10 at x = 8.153: 2.038 h
    assert measure(found, "in the room if all") == pytest.approx(81.5, rel=0.01)
    quantity = "shortest time of addition that keeps the air of the room below its short-term limit"
    assert measure(found, quantity) == pytest.approx(2.038 * 60, rel=0.015)


def test_too_little_for_the_room_needs_no_time() -> None:
    # 10 mmol at once in 30 m3: 8.2 ppm, below the ceiling of 10
    found = only(vetted({"add": "1 L of 0.1 M hydrochloric acid"}, SULFIDE, setting=ROOM), "toxic-gas", "H2S")
    assert measure(found, "in the room if all") == pytest.approx(8.15, rel=0.01)
    assert measure(found, "shortest time of addition that keeps the air of the room below its short-term limit") == 0.0


def test_where_nothing_is_known_of_the_air_nothing_is_said_of_it() -> None:
    found = only(
        vetted({"add": "1 L of 0.1 M hydrochloric acid"}, SULFIDE, setting={"place": "outdoors"}), "toxic-gas", "H2S"
    )
    assert not [one for one in found.measures if "at this pace" in one.quantity or "shortest" in one.quantity]


def test_air_of_a_setting() -> None:
    def exactly(value: float) -> Interval:
        return Interval(low=value, high=value)

    room = air_of(Setting(place="bench", room_volume=exactly(60.0), air_changes=exactly(6.0)), SCALE)
    assert room is not None
    assert (room.flow, room.gathers, room.assumed) == (pytest.approx(0.1), 60.0, False)
    hood = air_of(Setting(), SCALE)
    assert hood is not None
    assert hood.assumed
    assert hood.gathers is None
    stated = air_of(Setting(place="room", hood_flow=exactly(0.3)), SCALE)
    assert stated is not None
    assert (stated.flow, stated.assumed) == (0.3, False)
    assert air_of(Setting(place="glovebox"), SCALE) is None


# --- the equations by themselves ------------------------------------------------------------------------------------

EVEN = np.linspace(0.1, 1.0, 10)


def room(flow: float, volume: float) -> Air:
    return Air(flow, volume, volume, "a room", False)


def test_even_release_is_the_closed_formula() -> None:
    # 1 mol in 600 s into 20 m3 at 0.05 m3/s: 0.024465 / 600 / 0.05 x (1 - exp(-0.05 x 600 / 20)) = 8.155e-4 x 0.7769
    assert peak_fraction(EVEN[None, :], EVEN, 600.0, room(0.05, 20.0)) == pytest.approx(
        CUBIC_METRES_PER_MOL / 600 / 0.05 * (1 - exp(-1.5)), rel=1e-9
    )


def test_release_that_has_ended_is_flushed_out() -> None:
    # all in the first tenth, 60 of 600 s, then nothing: the peak is that of the first minute
    release = np.ones((1, 10))
    assert peak_fraction(release, EVEN, 600.0, room(0.05, 20.0)) == pytest.approx(
        CUBIC_METRES_PER_MOL / 60 / 0.05 * (1 - exp(-0.15)), rel=1e-9
    )


_RELEASES = arrays(float, (2, 10), elements=st.floats(0.0, 2.0))


@settings(max_examples=60, deadline=None)
@given(_RELEASES, st.floats(1.0, 1e5), st.floats(0.01, 1.0), st.one_of(st.none(), st.floats(5.0, 300.0)))
def test_slower_never_fouls_the_air_more(
    release: np.ndarray, seconds: float, flow: float, gathers: float | None
) -> None:
    air = Air(flow, gathers, 50.0, "air", False)
    fast, slow = (peak_fraction(release, EVEN, time, air) for time in (seconds, 2 * seconds))
    assert slow <= fast * (1 + 1e-9)
    if gathers is not None:  # never above what all of it at once makes of the room
        freed = np.maximum(np.diff(release, axis=1, prepend=0.0), 0.0).sum(axis=1).max()
        assert fast <= freed * CUBIC_METRES_PER_MOL / gathers * (1 + 1e-9)


@settings(max_examples=60, deadline=None)
@given(_RELEASES, st.floats(1e-6, 1e-3), st.floats(0.01, 1.0), st.one_of(st.none(), st.floats(5.0, 300.0)))
def test_the_shortest_time_keeps_the_limit_and_no_shorter_one_does(
    release: np.ndarray, limit: float, flow: float, gathers: float | None
) -> None:
    air = Air(flow, gathers, 50.0, "air", False)
    shortest = shortest_time(release, EVEN, limit, air)
    if shortest > 0:
        assert peak_fraction(release, EVEN, shortest, air) <= limit * (1 + 1e-9)
        assert peak_fraction(release, EVEN, 0.99 * shortest, air) > limit * (1 - 1e-9)


# --- flammable gas and oxygen ---------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("milligrams", "percent", "danger"),
    # Zn gives 1 H2: 5 mg 0.0765 mmol, 1.87 mL in 0.4 L 0.47 %; 20 mg 1.87 %. A quarter of the lower limit of 4 is 1 vol %
    [(5, 0.47, False), (20, 1.87, True)],
)
def test_hydrogen_in_a_closed_headspace(milligrams: int, percent: float, danger: bool) -> None:
    report = vetted(
        {"add": "100 mL of 2 M hydrochloric acid"},
        {"add": f"{milligrams} mg of zinc powder"},
        volume="0.5 L",
        cover="sealed",
    )
    litres = report.steps[1].gas_mol["H2"][1] * 24.465
    assert 100 * litres / 0.4 == pytest.approx(percent, rel=0.05)
    found = select(report, "flammable-gas", "H2")
    assert any(one.signal == "danger" for one in found) == danger, outline(report)


@pytest.mark.parametrize(
    ("mL", "signal"),
    # 10 % peroxide, 1.03 kg/L: 3.03 mol/L, 1.51 mol of O2 a litre, 37 L; it stays enriched above 23.5 % in some 30 to 40
    # times that: 20 mL 22 to 29 L of air, a note; 200 mL 220 to 290 L, a warning; 2 L 2.2 m3, a danger
    [(20, "note"), (200, "warning"), (2000, "danger")],
)
def test_oxygen_enrichment(mL: int, signal: str) -> None:
    report = vetted({"add": f"{mL} mL of 10 % hydrogen peroxide"}, {"add": "5 g of manganese dioxide"}, volume="10 L")
    found = only(report, "oxygen", "O2")
    assert found.signal == signal, outline(report)
    assert found.amount_mol is not None
    assert found.amount_mol[1] == pytest.approx(1.51e-3 * mL, rel=0.05)
    litres = found.amount_mol[1] * 24.465
    assert 29 * litres < 1000 * measure(found, "air brought") < 40 * litres
