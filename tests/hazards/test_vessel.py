"""Foam against free space, pressure against what a bottle stands, metals against their limits."""

from __future__ import annotations

from typing import Any

import pytest

from carboy.model.report import Report
from carboy.text.cases import case_from_mapping
from carboy.vetting import laboratory
from tests.bench.reports import combined, measure, only, outline, select

LITRES_PER_MOL = 24.465


def vetted(steps: list[dict[str, Any]], **vessel: Any) -> Report:
    lab = laboratory()
    plan = {"title": "A test", "vessels": {"tank": {"volume": "5 L", **vessel}}, "steps": steps}
    return lab.vet(case_from_mapping(plan, lab.names))


# --- foam ------------------------------------------------------------------------------------------------------


def test_foam_of_gas_against_freeboard() -> None:
    # 8.4 g = 0.1 mol, freed by the first tenth of the acid, of which 0.1 L keeps 3 mmol: 0.097 mol, 2.37 L, against
    # 4.9 L free: a note
    foam = only(vetted([{"add": "8.4 g of sodium bicarbonate"}, {"add": "1 L of 1 M hydrochloric acid"}]), "foam")
    assert measure(foam, "gas") == pytest.approx(0.097 * LITRES_PER_MOL, rel=0.02)
    assert measure(foam, "free space") == pytest.approx(4.9, rel=0.01)
    assert foam.signal == "note"


@pytest.mark.parametrize(
    ("grams", "signal"),
    # 4 to 4.9 L free: 1 g 0.29 L, less than a tenth; 25 g 7.2 L, 1.6 times; 84 g (all the acid) 23.8 L, 5.9 times
    [(1, ""), (25, "warning"), (84, "danger")],
)
def test_signal_of_foam(grams: int, signal: str) -> None:
    found = select(
        vetted([{"add": f"{grams} g of sodium bicarbonate"}, {"add": "1 L of 1 M hydrochloric acid"}]), "foam"
    )
    assert [one.signal for one in found] == ([signal] if signal else [])


def test_slow_pouring_spares_the_foam() -> None:
    # 84 g over 100 min: a tenth of the gas within 10 min: 2.4 L against 4 L
    steps = [{"add": "1 L of 1 M hydrochloric acid"}, {"add": "84 g of sodium bicarbonate", "over": "100 min"}]
    foam = only(vetted(steps), "foam")
    assert foam.signal == "note"
    assert measure(foam, "gas") == pytest.approx(2.38, rel=0.05)


def test_a_larger_vessel_spares_the_foam() -> None:
    small = only(combined("25 g of sodium bicarbonate", "1 L of 1 M hydrochloric acid", volume_L=1.5), "foam")
    large = select(combined("25 g of sodium bicarbonate", "1 L of 1 M hydrochloric acid", volume_L=100.0), "foam")
    assert small.signal == "danger"
    assert not large


def test_no_foam_in_a_closed_vessel_but_pressure() -> None:
    report = combined("25 g of sodium bicarbonate", "1 L of 1 M hydrochloric acid", volume_L=2.0, cover="sealed")
    assert not select(report, "foam")
    assert only(report, "pressure").signal == "danger"


# --- pressure --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("grams", "low", "high", "signal"),
    # 100 mL of 1 M acid in 1 L: 0.9 L of headspace. n RT / (V_g + H V_l RT) = n x 2479 / (0.9 + 0.027 x 0.1 x
    # 24.465) kPa = n x 2566: 0.1 g = 1.19 mmol 3.1 kPa; 0.5 g 15.3 kPa; 2.5 g 76 kPa
    [(0.1, 1.5, 4.0, "note"), (0.5, 12.0, 17.0, "warning"), (2.5, 68.0, 80.0, "danger")],
)
def test_signal_of_pressure(grams: float, low: float, high: float, signal: str) -> None:
    report = combined(
        f"{grams} g of sodium bicarbonate", "100 mL of 1 M hydrochloric acid", volume_L=1.0, cover="sealed"
    )
    assert report.steps[1].gauge_kPa is not None
    assert low < report.steps[1].gauge_kPa[0] < high
    found = select(report, "pressure")
    assert [one.signal for one in found] == [signal] or (signal == "note" and not found), outline(report)


def test_half_of_the_rating_is_danger() -> None:
    steps = [{"add": "0.5 g of sodium bicarbonate"}, {"add": "100 mL of 1 M hydrochloric acid"}]
    strong = vetted(steps, volume="1 L", cover="sealed", rating="200 kPa")
    weak = vetted(steps, volume="1 L", cover="sealed", rating="20 kPa")
    assert only(strong, "pressure").signal == "warning"
    assert only(weak, "pressure").signal == "danger"
    assert measure(only(weak, "pressure"), "rating") == 20


def test_open_and_vented_vessels_do_not_press() -> None:
    for cover in ("open", "loose", "vented"):
        report = combined("25 g of sodium bicarbonate", "1 L of 1 M hydrochloric acid", volume_L=2.0, cover=cover)
        assert not select(report, "pressure"), cover
        assert report.steps[1].gauge_kPa == pytest.approx((0.0, 0.0))


# --- metals put back -------------------------------------------------------------------------------------------


def test_acid_brings_a_hydroxide_sludge_back() -> None:
    # 10 mmol of Cd(OH)2 with 10 mmol of OH- over, dissolved by 30 mmol of acid in 30 mL: 1124 mg in 1.13 L against
    # 1 mg/L
    report = vetted(
        [
            {"add": "1 L of 0.01 M cadmium sulfate"},
            {"add": "100 mL of 0.3 M sodium hydroxide"},
            {"add": "100 mL of 1 M hydrochloric acid"},
        ]
    )
    back = select(report, "remobilised", step=3)
    assert len(back) == 1, outline(report)
    assert back[0].signal == "danger"
    assert measure(back[0], "dissolved Cd") == pytest.approx(0.01 * 112.41 * 1000 / 1.13, rel=0.03)
    assert measure(back[0], "limit for Cd") == 1.0
    assert not select(report, "remobilised", step=2)


@pytest.mark.parametrize(
    ("strength", "signal"),
    # all of it dissolves again in some 1.15 L: 7e-5 M 6.8 mg/L, 7e-6 M 0.68 mg/L, 4e-4 M 39 mg/L, against 1 mg/L
    [("0.0004 M", "danger"), ("0.00007 M", "warning"), ("0.000007 M", "note")],
)
def test_signal_of_a_metal_by_its_limit(strength: str, signal: str) -> None:
    report = vetted(
        [
            {"add": f"1 L of {strength} cadmium sulfate"},
            {"add": "100 mL of 0.1 M sodium hydroxide"},
            {"add": "100 mL of 0.2 M hydrochloric acid"},
        ]
    )
    assert [one.signal for one in select(report, "remobilised", step=3)] == [signal], outline(report)


def test_water_on_a_sludge_brings_nothing_back() -> None:
    report = vetted(
        [
            {"add": "1 L of 0.01 M cadmium sulfate"},
            {"add": "100 mL of 0.3 M sodium hydroxide"},
            {"add": "100 mL of water"},
        ]
    )
    assert not [one for one in select(report, "remobilised", step=3) if one.signal != "note"], outline(report)


def test_ammonia_brings_copper_or_silver_back() -> None:
    # AgCl + 2 NH3 = Ag(NH3)2+ + Cl-: log K -9.75 + 7.2 = -2.5. 5 mmol with 10 mmol of chloride in 1 L dissolve at
    # sqrt(0.005 x 0.01 / 10**-2.5) = 0.126 M, after 13 mL of the ammonia; 539 mg in 1.013 L against 5 mg/L
    report = vetted(
        [
            {"add": "500 mL of 0.01 M silver nitrate"},
            {"add": "500 mL of 0.02 M sodium chloride"},
            {"add": "500 mL of 10 M ammonia"},
        ]
    )
    back = select(report, "remobilised", step=3)
    assert len(back) == 1, outline(report)
    assert back[0].signal == "danger"
    assert measure(back[0], "dissolved Ag") == pytest.approx(0.005 * 107.87 * 1000 / 1.013, rel=0.03)


def test_a_metal_that_was_never_solid_is_not_put_back() -> None:
    report = vetted([{"add": "1 L of 0.01 M cadmium sulfate"}, {"add": "100 mL of 1 M hydrochloric acid"}])
    assert not select(report, "remobilised")


def test_hypochlorite_on_a_mercury_sludge() -> None:
    # 10 mmol of HgS in the tank; 0.1 mol of hypochlorite takes its sulfide (4 ClO- each): mercury back as chloro or
    # hydroxo complex
    report = vetted(
        [
            {"add": "1 L of (0.01 M mercury(II) nitrate + 0.5 M sodium bicarbonate)"},
            {"add": "100 mL of 0.11 M sodium sulfide"},
            {"add": "200 mL of 6 % sodium hypochlorite"},
        ]
    )
    back = select(report, "remobilised", step=3)
    assert back, outline(report)
    assert back[0].signal == "danger"
    assert any("mercury" in step.from_[0] for step in back[0].path if step.rule == "label")
