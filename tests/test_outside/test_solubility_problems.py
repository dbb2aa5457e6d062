"""Solubility problems of the textbooks, worked from the label up.

Solubility products as they stand in the CRC Handbook ("Solubility product constants", 25 degC), in Harris (Quantitative Chemical
Analysis, appendix F) or in Skoog (Fundamentals of Analytical Chemistry, appendix 2); the source is named beside each. The graph takes its
constants from other compilations (MINTEQ, NIST 46), so what is asked for is agreement within the spread of the handbooks.
"""

from __future__ import annotations

import pytest

from carboy.chemistry.mixture import Mixture
from tests.reasoning.small_book import walk


def stirred(*portions: str) -> Mixture:
    """A salt and water (or a solution) at equilibrium, without rules."""
    return walk((), *portions).steps[-1].after


def molality(mixture: Mixture, token: str) -> float:
    return float(mixture.dissolved(token)[0] / mixture.water_kg[0])


@pytest.mark.parametrize(
    ("portions", "token", "published", "spread"),
    [
        # AgCl, Ksp 1.77e-10 (CRC): sqrt = 1.33e-5, with 3e-7 as AgCl(aq)
        (("1 L of 0.001 M silver nitrate", "1 L of 0.001 M sodium chloride"), "Ag+", 1.35e-5, 0.05),
        # AgBr 5.35e-13 (CRC): 7.3e-7
        (("1 L of 0.001 M silver nitrate", "1 L of 0.001 M potassium bromide"), "Ag+", 7.4e-7, 0.15),
        # AgI 8.5e-17 (CRC): 9.2e-9
        (("1 L of 0.001 M silver nitrate", "1 L of 0.001 M potassium iodide"), "Ag+", 9.3e-9, 0.2),
        # BaSO4 1.08e-10 (CRC): 1.05e-5 mol/L in water, 1.2e-5 in 2 mM of sodium chloride
        (("1 L of 0.001 M barium chloride", "1 L of 0.001 M sodium sulfate"), "Ba+2", 1.3e-5, 0.15),
        # PbSO4 2.53e-8 (CRC), 1.6e-8 (Skoog): 1.3 to 1.6e-4, times 1.2 of activity at I = 4 mM, and PbSO4(aq)
        (("1 L of 0.002 M lead(II) nitrate", "1 L of 0.002 M sodium sulfate"), "Pb+2", 1.7e-4, 0.2),
        # SrSO4 3.44e-7 (CRC): 5.9e-4 x 1.4 of activity and SrSO4(aq)
        (("1 L of 0.02 M strontium chloride", "1 L of 0.02 M sodium sulfate"), "Sr+2", 8.4e-4, 0.25),
    ],
)
def test_sparingly_soluble_salts(portions: tuple[str, ...], token: str, published: float, spread: float) -> None:
    assert molality(stirred(*portions), token) == pytest.approx(published, rel=spread)


def test_gypsum() -> None:
    # CRC: 2.05 g of CaSO4 in a litre of saturated gypsum solution at 25 degC: 0.0151 mol/L
    assert molality(stirred("20 g of gypsum", "1 L of water"), "Ca+2") == pytest.approx(0.0151, rel=0.05)


def test_lead_chloride() -> None:
    # CRC: 1.08 g in 100 g of water at 25 degC: 0.0388 mol/kg
    mixture = stirred("500 mL of 0.2 M lead(II) nitrate", "500 mL of 0.4 M sodium chloride")
    # common ions none in excess, but 0.2 mol/kg of sodium nitrate raises it by activity to 0.05 and more
    assert 0.035 < molality(mixture, "Pb+2") < 0.075


def test_magnesium_hydroxide() -> None:
    # aged brucite, CRC 5.61e-12: cube root of Ksp/4 = 1.1e-4, pH 10.35; as it comes down ("active", MINTEQ 6e-10):
    # 5.4e-4, at I = 0.03 half as
    # much again, pH 11.1
    mixture = stirred("1 L of 0.02 M magnesium chloride", "1 L of 0.04 M sodium hydroxide")
    assert 10.3 < mixture.pH[0] < 11.2
    assert 1.1e-4 < molality(mixture, "Mg+2") < 1e-3
    assert sum(float(amount[0]) for amount in mixture.solids.values()) == pytest.approx(0.019, abs=0.001)


def test_lime_water() -> None:
    # CRC: 1.60 g of Ca(OH)2 a litre at 25 degC: 0.0216 mol/L, pH 12.45 (NIST standard buffer 12.454)
    mixture = stirred("10 g of calcium hydroxide", "1 L of water")
    assert molality(mixture, "Ca+2") == pytest.approx(0.0212, rel=0.06)
    assert mixture.pH[0] == pytest.approx(12.454, abs=0.04)


def test_baryta_water() -> None:
    # Ba(OH)2·8H2O 56 g/L at 20 degC (CRC, 4.7 g of the anhydrous in 100 g at 25 degC): 3.2 g of it in a litre
    # dissolve wholly
    mixture = stirred("3.155 g of barium hydroxide octahydrate", "1 L of water")
    assert not mixture.solids
    assert mixture.pH[0] == pytest.approx(12.2, abs=0.1)


def test_fluorite() -> None:
    # CRC 3.45e-11: cube root of Ksp/4 = 2.05e-4; at I of 2 mM 2.3e-4
    mixture = stirred("1 L of 0.002 M calcium chloride", "1 L of 0.004 M sodium fluoride")
    assert molality(mixture, "Ca+2") == pytest.approx(2.3e-4, rel=0.2)


def test_common_ion_lowers_silver() -> None:
    # Ksp/(0.01 gamma2) = 1.77e-10 / 0.01 / 0.81 = 2.2e-8,
    # AgCl(aq) 3.3e-7, AgCl2- 1.6e-7
    mixture = stirred("1 L of 0.001 M silver nitrate", "1 L of 0.021 M sodium chloride")
    free = float(mixture.aqueous["Ag+"][0] / mixture.water_kg[0])
    assert free == pytest.approx(2.2e-8, rel=0.08)
    assert 3e-7 < molality(mixture, "Ag+") < 9e-7


def test_chloride_has_an_optimum_for_silver() -> None:
    # dissolved silver falls with a little chloride and rises again with much (AgCl2-, AgCl3 2-): least near 3e-3 M
    # (Skoog)
    held = [
        molality(stirred("1 L of 0.001 M silver nitrate", f"1 L of {strength} M sodium chloride"), "Ag+")
        for strength in (0.001, 0.006, 1.0)
    ]
    assert held[1] < held[0]
    assert held[1] < held[2]


@pytest.mark.parametrize(
    ("metal", "token", "weight", "base", "most"),
    # what lime or lye reaches in water treatment near the pH of least solubility (EPA 600/2-81-148, Treatability
    # manual), mg/L, with room for fresh solids: Cr(III) pH 8.5, Zn pH 9.5, Cd pH 11, Cu pH 9; a borate buffer holds
    # the pH
    [
        ("chromium(III) chloride", "Cr+3", 52.00, "1 L of 0.05 M borax, pH 8.5", 0.3),
        ("zinc sulfate", "Zn+2", 65.38, "1 L of 0.05 M borax, pH 9.5", 2.0),
        ("cadmium sulfate", "Cd+2", 112.41, "1 L of 0.01 M sodium hydroxide", 1.0),
        ("copper sulfate", "Cu+2", 63.55, "1 L of 0.05 M borax, pH 9", 0.2),
    ],
)
def test_metal_hydroxides_reach_what_treatment_reaches(
    metal: str, token: str, weight: float, base: str, most: float
) -> None:
    mixture = stirred(f"1 L of 0.002 M {metal}", base)
    assert mixture.solids
    assert 0.0 < molality(mixture, token) * weight * 1000 < most


def test_copper_in_ammonia_is_the_deep_blue_complex() -> None:
    # cumulative log K of Cu(NH3)4 2+ 12.6 to 13.0 (NIST 46); Cu(OH)2 10**-19.3: [Cu(NH3)4][OH]^2/[NH3]^4 = 10**-6.3
    # to -6.7. In 1 M ammonia [OH] is 0.0042: up to 10 to 30 mmol/L stay dissolved, more than the 5 there are
    mixture = stirred("1 L of 0.01 M copper sulfate", "1 L of 2 M ammonia")
    assert not mixture.solids
    ammines = {token: float(amount[0]) for token, amount in mixture.aqueous.items() if "NH3" in token and "Cu" in token}
    assert max(ammines, key=ammines.__getitem__).startswith("Cu(NH3)4")
    assert sum(ammines.values()) == pytest.approx(0.01, rel=0.01)


def test_mercury_sulfide_dissolves_in_alkaline_sulfide_only() -> None:
    # HgS + S2- -> HgS2 2-: log K some 0.6 to 1 with S2- (Cotton, Sillen); with the pKa of HS- (13 to 17) uncertain,
    # what is sure is the order: nothing to speak of at pH 8 with a little excess, more than the 0.2 mg/L limit with
    # molar sulfide and lye
    little = stirred(
        "1 L of (0.01 M mercury(II) nitrate + 0.2 M sodium bicarbonate)", "100 mL of 0.11 M sodium sulfide"
    )
    much = stirred("1 L of 0.01 M mercury(II) chloride", "1 L of (1 M sodium sulfide + 1 M sodium hydroxide)")
    limit = 0.2e-3 / 200.59
    assert molality(little, "Hg+2") < 0.01 * limit
    assert molality(much, "Hg+2") > 10 * limit


@pytest.mark.parametrize(
    ("label", "pH"),
    [
        ("1 L of 0.1 M hydrochloric acid", 1.10),  # NIST: gamma 0.796 at 0.1 mol/kg
        ("1 L of 0.01 M sodium hydroxide", 11.95),
        ("1 L of 0.05 M borax", 9.2),  # NIST: 0.01 mol/kg 9.180
        ("1 L of 0.1 M acetic acid", 2.88),  # pKa 4.756
        ("1 L of 0.1 M ammonia", 11.12),  # pKb 4.75
        ("1 L of (0.025 M sodium carbonate + 0.025 M sodium bicarbonate)", 10.012),  # NIST
        ("1 L of 0.05 M potassium hydrogen phthalate", 4.005),  # NIST
        ("1 L of (0.025 M disodium phosphate + 0.025 M potassium dihydrogen phosphate)", 6.865),  # NIST
        ("1 L of 0.1 M potassium cyanide", 11.0),  # pKa 9.21: [OH] 1.27 mM, gamma 0.78
    ],
)
def test_pH_of_bottles(label: str, pH: float) -> None:
    mixture = walk((), label).steps[0].after
    assert mixture.pH[0] == pytest.approx(pH, abs=0.1)
