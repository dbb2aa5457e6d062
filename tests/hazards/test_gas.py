"""Toxic and flammable gas: what can leave, the air it spoils, what stood there before.

Henry constants at 25 degC, mol/(kg atm), Sander's compilation (Atmos. Chem. Phys. 15, 4399, 2015, and its 2023 version): H2S 0.10,
CO2 0.034, SO2 1.2 to 1.4, NH3 58 to 60, HCN 7.5 to 12, Cl2 0.06 to 0.09, H2 7.8e-4. Molar volume 24.465 L at 25 degC and 1 atm.
"""

from __future__ import annotations

import numpy as np
import pytest

from carboy.vetting import laboratory
from tests.bench.reports import bottle, combined, measure, nominal, only, outline, select, walked

LITRES_PER_MOL = 24.465
INDEX = laboratory().index
RANK = {"note": 1, "warning": 2, "danger": 3}


def henry(gas: str) -> float:
    """mol/(kg atm) of a gas that dissolves as a molecule, from the graph's own constants."""
    stock = laboratory().stock
    molecule = stock.dissolved_form[gas]
    over = stock.formation[gas].log10_beta
    dissolved = stock.formation[molecule].log10_beta if molecule in stock.formation else 0.0
    return float(10 ** (dissolved - over))


@pytest.mark.parametrize(
    ("gas", "low", "high"),
    [
        ("H2S(g)", 0.095, 0.105), ("CO2(g)", 0.033, 0.035), ("SO2(g)", 1.1, 1.5), ("NH3(g)", 55, 62), ("HCN(g)", 7, 13),
        ("Cl2(g)", 0.055, 0.095), ("H2(g)", 7e-4, 8.5e-4), ("O2(g)", 1.2e-3, 1.35e-3),
    ],
)  # fmt: skip
def test_henry_constants(gas: str, low: float, high: float) -> None:
    assert low < henry(gas) < high


# --- partition between liquid and headspace --------------------------------------------------------------------


def headspace(gas: str, *portions: str, volume_L: float) -> tuple[float, float]:
    """mol in the headspace and in the liquid (all forms of the molecule) of a sealed vessel."""
    content = walked(*portions, volume_L=volume_L, cover="sealed").steps[-1].after
    molecule = laboratory().stock.dissolved_form[gas]
    return nominal(content.gases[gas]), nominal(content.aqueous[molecule])


def test_hydrogen_sulfide_in_a_closed_bottle() -> None:
    # 0.01 mol of H2S in 0.4 L (0.2 L of 0.05 M sulfide and 0.2 L of 0.5 M acid), 1 L vessel: 0.6 L of headspace.
    # n_g = n / (1 + H V_l RT / V_g) = 0.01 / (1 + 0.10 x 0.4 x 24.465 / 0.6) = 0.01 / 2.63 = 3.80 mmol
    gas, liquid = headspace(
        "H2S(g)", "200 mL of 0.05 M sodium sulfide", "200 mL of 0.5 M hydrochloric acid", volume_L=1.0
    )
    assert gas == pytest.approx(3.80e-3, rel=0.05)
    assert gas + liquid == pytest.approx(0.01, rel=1e-3)


def test_carbon_dioxide_in_a_closed_bottle() -> None:
    # 0.01 mol in 0.4 L over 0.6 L: 0.01 / (1 + 0.034 x 0.4 x 24.465 / 0.6) = 0.01 / 1.555 = 6.43 mmol
    gas, liquid = headspace(
        "CO2(g)", "200 mL of 0.05 M sodium carbonate", "200 mL of 0.5 M hydrochloric acid", volume_L=1.0
    )
    assert gas == pytest.approx(6.43e-3, rel=0.03)
    assert gas + liquid == pytest.approx(0.01, rel=1e-3)


def test_sulfur_dioxide_in_a_closed_bottle() -> None:
    # 0.01 mol in 0.4 L at pH 0.7 (bisulfite: pKa 1.8, some 8 %), H 1.3: 0.01 / (1 + 1.3 x 1.08 x 0.4 x 24.465 /
    # 0.6) = 0.01 / 23.9
    gas, liquid = headspace(
        "SO2(g)", "200 mL of 0.05 M sodium sulfite", "200 mL of 1 M hydrochloric acid", volume_L=1.0
    )
    assert gas == pytest.approx(4.9e-4, rel=0.1)
    assert 0.85 < liquid / 0.01 < 1.0


def test_ammonia_in_a_closed_bottle() -> None:
    # 0.02 mol in 0.4 L made strongly alkaline, H 59: 0.02 / (1 + 59 x 0.4 x 24.465 / 0.6) = 0.02 / 963 = 2.08e-5 mol
    gas, liquid = headspace(
        "NH3(g)", "200 mL of 0.1 M ammonium chloride", "200 mL of 0.5 M sodium hydroxide", volume_L=1.0
    )
    assert gas == pytest.approx(2.08e-5, rel=0.1)
    assert liquid == pytest.approx(0.02, rel=0.01)


def test_pressure_over_an_open_liquid_is_that_of_henry() -> None:
    # 5 mmol in 1.01 L: 0.0495 atm, 49 500 ppm
    gas = only(combined("1 L of 0.1 M hydrochloric acid", "10 mL of 0.5 M sodium sulfide"), "toxic-gas", "H2S")
    assert measure(gas, "in the air over") == pytest.approx(5e-3 / 1.01 / 0.10 * 1e6, rel=0.05)


def test_pressure_is_told_where_most_can_leave() -> None:
    # 5 mmol of sulfide need 10 mmol of acid, 100 of 500 mL: then they are in 0.6 L, 83 000 ppm; diluted further
    # they stand lower
    gas = only(combined("500 mL of 0.01 M sodium sulfide", "500 mL of 0.1 M hydrochloric acid"), "toxic-gas", "H2S")
    assert measure(gas, "in the air over") == pytest.approx(5e-3 / 0.61 / 0.10 * 1e6, rel=0.06)


def test_more_than_an_atmosphere_bubbles_out() -> None:
    # 0.5 mol of CO2 in 1 kg would stand at 15 atm: all but 0.034 mol (less in salt water) bubble out
    content = walked("500 mL of 1 M sodium carbonate", "500 mL of 2.5 M hydrochloric acid").steps[-1].after
    assert nominal(content.pressures["CO2(g)"]) == pytest.approx(
        0.97, abs=0.04
    )  # the rest of the atmosphere is water vapour
    assert 0.022 < nominal(content.aqueous[laboratory().stock.dissolved_form["CO2(g)"]]) < 0.034
    assert nominal(content.gases["CO2(g)"]) == pytest.approx(0.472, abs=0.006)


# --- severity --------------------------------------------------------------------------------------------------


def air_at_idlh(mol: float, gas: str) -> float:
    """m3 of air."""
    idlh = INDEX.gases[gas].idlh
    assert idlh is not None
    return mol * LITRES_PER_MOL / 1000 / (idlh.magnitude * 1e-6)


@pytest.mark.parametrize(
    ("sulfide", "acid", "mol"),
    [
        ("1 L of 0.1 M sodium sulfide", "1 L of 0.5 M hydrochloric acid", 0.1),
        ("100 mL of 0.1 M sodium sulfide", "100 mL of 0.5 M hydrochloric acid", 0.01),
        ("10 mL of 0.1 M sodium sulfide", "10 mL of 0.5 M hydrochloric acid", 0.001),
    ],
)
def test_air_brought_to_idlh(sulfide: str, acid: str, mol: float) -> None:
    gas = only(combined(sulfide, acid), "toxic-gas", "H2S")
    air = air_at_idlh(mol, "H2S(g)")
    assert measure(gas, "air brought") == pytest.approx(air, rel=0.01)
    expected = "danger" if air >= 1.0 else "warning" if air >= 0.01 else "note"
    # half a litre of gas over the liquid stands far above IDLH, so the volume of air decides
    assert gas.signal == expected


def test_severity_of_a_gas_falls_with_its_amount() -> None:
    signals = []
    for size in ("1 L", "30 mL", "1 mL", "5 uL"):
        found = select(
            combined(f"{size} of 0.1 M sodium sulfide", f"{size} of 0.5 M hydrochloric acid"), "toxic-gas", "H2S"
        )
        signals.append(RANK[found[0].signal] if found else 0)
    assert signals == sorted(signals, reverse=True)
    assert signals[0] == 3
    assert signals[-1] < 2


def test_hydrogen_cyanide() -> None:
    # 0.01 mol of cyanide and acid: 0.01 mol HCN, 24.465 x 0.01 / 50e-6 L = 4.9 m3 of air at IDLH, if all leaves; at
    # IDLH over the liquid 9.5 x 50e-6 x 0.2 = 0.1 mmol stay. Over the liquid, in 0.11 L:
    # 0.09 / 7.5 to 0.09 / 12 atm
    gas = only(combined("100 mL of 0.1 M potassium cyanide", "100 mL of 1 M hydrochloric acid"), "toxic-gas", "HCN")
    # 0.12 mmol of HCN were there before, over cyanide at its own pH of 11.1
    assert gas.amount_mol == pytest.approx((0.00988, 0.00988), rel=2e-3)
    assert gas.signal == "danger"
    assert measure(gas, "air brought") == pytest.approx(air_at_idlh(0.0099, "HCN(g)"), rel=0.03)
    assert 7000 < measure(gas, "in the air over") < 13500


def test_lower_flammable_limit() -> None:
    # 1 g Mg = 0.0411 mol H2 = 1.007 L; at 4 vol % 25.2 L
    hydrogen = only(combined("1 g of magnesium", "100 mL of 2 M hydrochloric acid"), "flammable-gas", "H2")
    assert hydrogen.amount_mol == pytest.approx((0.0411, 0.0411), rel=5e-3)
    assert measure(hydrogen, "air brought") == pytest.approx(0.0252, rel=0.01)
    assert hydrogen.signal == "warning"


def test_flammable_gas_in_a_closed_vessel() -> None:
    # 7.6 mmol of hydrogen in 0.4 L of headspace: 47 %, far above a quarter of the lower limit (1 vol %)
    sealed = only(
        combined("0.5 g of zinc powder", "100 mL of 2 M hydrochloric acid", volume_L=0.5, cover="sealed"),
        "flammable-gas",
        "H2",
    )
    opened = select(combined("0.5 g of zinc powder", "100 mL of 2 M hydrochloric acid"), "flammable-gas", "H2")
    assert sealed.signal == "danger"
    assert all(one.signal != "danger" for one in opened)


# --- as it stands ----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "portions",
    [
        ("100 mL of concentrated ammonia", "100 mL of water"),
        ("100 mL of concentrated hydrochloric acid", "100 mL of water"),
        ("100 mL of 5 M ammonia", "100 mL of 1 M sodium chloride"),
        ("100 mL of 5 M ammonia", "100 mL of 5 M ammonia"),
        ("100 mL of acetone", "100 mL of acetone"),
        ("100 mL of glacial acetic acid", "100 mL of water"),
    ],
)
def test_what_a_bottle_had_before_is_a_note_at_most(portions: tuple[str, str]) -> None:
    report = combined(*portions)
    gases = [one for one in report.findings if one.kind in ("toxic-gas", "flammable-gas")]
    assert all(one.signal == "note" for one in gases), outline(report)


def test_standing_gas_says_so() -> None:
    found = select(combined("100 mL of 5 M ammonia", "100 mL of 1 M sodium chloride"), "toxic-gas", "NH3")
    assert all("as it did before" in one.summary for one in found)


def test_made_markedly_worse_is_more_than_a_note() -> None:
    # ammonium at pH 5 gives off nothing; base sets all of it free: 0.5 mol NH3, at pH 13
    found = only(combined("500 mL of 1 M ammonium chloride", "500 mL of 2 M sodium hydroxide"), "toxic-gas", "NH3")
    assert RANK[found.signal] >= 2
    assert found.amount_mol == pytest.approx((0.5, 0.5), rel=0.02)
    # half of the base is enough: 0.5 mol in 0.75 L over 59, salted out by 10**(0.1 x 0.67): 13 000 ppm, above the
    # IDLH of 300 ppm
    assert measure(found, "in the air over") == pytest.approx(0.5 / 0.75 / 59 * 1.17 * 1e6, rel=0.05)
    # that much in the air that passes over while one stands by: 0.013 x 100 L / 24.465 = 0.053 mol; x 24.465 /
    # 300e-6 L = 4.3 m3
    swept = INDEX.thresholds["swept-air"].value.magnitude
    assert measure(found, "air brought") == pytest.approx(0.0129 * swept / 300e-6 / 1000, rel=0.05)
    assert found.signal == "danger"


def test_neutralising_ammonia_takes_its_gas_away() -> None:
    report = combined("100 mL of 1 M ammonia", "100 mL of 2 M hydrochloric acid")
    assert not [
        one for one in select(report, "toxic-gas", "NH3", step=2) if one.signal != "note" and one.fractions[1] == 1.0
    ]


# --- along the dose --------------------------------------------------------------------------------------------


def test_acid_on_alkaline_sulfide_begins_late() -> None:
    # 1 mol of base and 0.1 mol of sulfide: no H2S before the base is gone, at half of the 2 mol of acid
    gas = only(
        combined("1 L of (0.1 M sodium sulfide + 1 M sodium hydroxide)", "1 L of 2 M hydrochloric acid"),
        "toxic-gas",
        "H2S",
    )
    assert gas.moment == "during"
    assert 0.45 < gas.fractions[0] < 0.60
    assert gas.fractions[1] == 1.0


def test_formed_on_the_way_and_gone_at_the_end() -> None:
    # bicarbonate with acid in small part: CO2 at the place of the stream only. Here: sulfide poured into less acid
    # than it can take, H2S in between, taken up again as HS- at the end
    gas = only(combined("500 mL of 0.1 M hydrochloric acid", "500 mL of 0.2 M sodium sulfide"), "toxic-gas", "H2S")
    assert gas.moment == "during"
    assert gas.fractions[1] < 1.0
    # most H2S when half of the acid's protons are taken up as HS-: 0.05 mol of acid make 0.025 mol of H2S from
    # 0.025 mol of sulfide
    assert gas.amount_mol is not None
    assert gas.amount_mol[1] == pytest.approx(0.025, rel=0.05)


def test_range_gives_a_range_of_amounts() -> None:
    gas = only(combined("1 L of 0.05-0.1 M sodium sulfide", "1 L of 0.5 M hydrochloric acid"), "toxic-gas", "H2S")
    assert gas.amount_mol == pytest.approx((0.05, 0.1), rel=2e-3)
    assert gas.holds == "throughout"


def test_a_hazard_of_part_of_the_range_says_so_and_asks() -> None:
    # 0.1 mol of base against 0 to 0.3 mol of acid: only beyond 0.1 mol does sulfide turn
    report = combined("1 L of (0.01 M sodium sulfide + 0.1 M sodium hydroxide)", "1 L of 0.01-0.3 M hydrochloric acid")
    gas = only(report, "toxic-gas", "H2S")
    assert gas.holds == "in part"
    assert gas.amount_mol is not None
    assert gas.amount_mol[0] < 1e-5
    assert gas.amount_mol[1] == pytest.approx(0.01, rel=0.02)
    assert any("hydrochloric acid" in line for line in report.questions)


def test_bottle_pressures_are_finite() -> None:
    for label in ("1 L of concentrated ammonia", "1 L of concentrated hydrochloric acid", "1 L of bleach"):
        assert all(np.isfinite(pressure).all() for pressure in bottle(label).pressures.values()), label
