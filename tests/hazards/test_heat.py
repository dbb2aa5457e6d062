"""Heat of neutralising, dissolving, diluting and reacting, against published enthalpies.

Enthalpies of formation in kJ/mol: CRC Handbook and NBS tables (J. Phys. Chem. Ref. Data 11, suppl. 2, 1982). Heats of solution: CRC,
"Enthalpy of Solution of Electrolytes" (after Parker, NSRDS-NBS 2, 1965): NaOH -44.51, NH4NO3 +25.69, NH4Cl +14.78, KNO3 +34.89,
NaCl +3.88, CaCl2 -81.3, KOH -57.61; NaHCO3 +18.7 by the enthalpies of formation (Parker: +16.7). Neutralisation: H+ + OH- -> H2O -55.8.
"""

from __future__ import annotations

import numpy as np
import pytest

from carboy.chemistry.heat import HeatBook
from carboy.vetting import laboratory
from tests.bench.reports import combined, measure, only, select, walked


def heat_kJ(*portions: str) -> float:
    """Heat set free when the last pour is complete."""
    path = walked(*portions).steps[-1].path
    assert path is not None
    return float(path.heat_kJ[path.last()][0])


def warming_K(*portions: str) -> float:
    path = walked(*portions).steps[-1].path
    assert path is not None
    last = path.last()
    return float((path.reached_C - path.unreacted.temperature_C)[last][0])


# --- neutralisation --------------------------------------------------------------------------------------------


def test_strong_acid_and_base_of_one_molar() -> None:
    # 0.5 mol/L of water formed: 55.8 kJ/mol and about 1 kJ/mol from dilution: 28.4 kJ/L; 1.02 kg/L, 4.02 kJ/(kg K):
    # 6.6 to 7 K
    rise = warming_K("500 mL of 1 M sodium hydroxide", "500 mL of 1 M hydrochloric acid")
    assert 6.5 < rise < 7.1
    assert heat_kJ("500 mL of 1 M sodium hydroxide", "500 mL of 1 M hydrochloric acid") == pytest.approx(28.3, rel=0.04)


def test_order_does_not_matter_for_the_end() -> None:
    one = heat_kJ("500 mL of 1 M sodium hydroxide", "500 mL of 1 M hydrochloric acid")
    other = heat_kJ("500 mL of 1 M hydrochloric acid", "500 mL of 1 M sodium hydroxide")
    assert one == pytest.approx(other, rel=1e-6)


def test_weak_acid_frees_about_as_much() -> None:
    # CH3COOH + OH-: -55.8 - 0.4 (ionisation) = -56.2 (CRC: ionisation -0.4)
    assert heat_kJ("500 mL of 0.2 M sodium hydroxide", "500 mL of 0.2 M acetic acid") == pytest.approx(
        0.1 * 56.1, rel=0.04
    )


def test_ammonia_and_acid() -> None:
    # NH3 + H+ -> NH4+: -52.2 kJ/mol
    assert heat_kJ("500 mL of 0.2 M ammonia", "500 mL of 0.2 M hydrochloric acid") == pytest.approx(
        0.1 * 52.2, rel=0.04
    )


def test_warming_of_strong_solutions_is_proportionally_larger() -> None:
    # 5 M: about 33 to 37 K: a warning
    rise = warming_K("500 mL of 5 M sodium hydroxide", "500 mL of 5 M hydrochloric acid")
    assert 31 < rise < 38
    heat = only(
        combined("500 mL of 5 M sodium hydroxide", "500 mL of 5 M hydrochloric acid"), "heat", order="either order"
    )
    assert heat.signal == "warning"


def test_salt_water_and_water_are_athermal() -> None:
    assert abs(warming_K("500 mL of 0.5 M sodium chloride", "500 mL of water")) < 0.2
    assert not select(combined("500 mL of 0.5 M sodium chloride", "500 mL of water"), "heat")


# --- dissolving ------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("solid", "molar_mass", "solution"),
    [
        ("sodium hydroxide", 39.997, -44.51),
        ("potassium hydroxide", 56.106, -57.61),
        ("ammonium nitrate", 80.043, 25.69),
        ("ammonium chloride", 53.49, 14.78),
        ("potassium nitrate", 101.10, 34.89),
        ("sodium chloride", 58.44, 3.88),
        ("calcium chloride", 110.98, -81.3),
        ("sodium bicarbonate", 84.007, 18.7),
    ],
)
def test_heat_of_solution(solid: str, molar_mass: float, solution: float) -> None:
    # 0.1 mol in 1 L of water
    heat = heat_kJ("1 L of water", f"{0.1 * molar_mass} g of {solid}")
    assert heat == pytest.approx(-0.1 * solution, abs=0.1 * max(1.2, 0.05 * abs(solution)))


def test_enthalpies_of_dissolving() -> None:
    book = HeatBook(laboratory().stock)
    # to the components, of which the proton is one: NaOH + H+ -> Na+ + H2O, -44.5 - 55.8
    assert book.of_dissolving("sodium-hydroxide", neat=True) == pytest.approx(-44.5 - 55.8, abs=0.6)
    assert book.of_dissolving("sodium-chloride", neat=True) == pytest.approx(3.9, abs=0.4)
    assert book.of_dissolving("sodium-hydroxide", neat=False) == 0.0


def test_caustic_pellets_in_water() -> None:
    # 40 g in 100 mL: 1 mol x about 42 kJ (at 5.5 H2O: -38 to -40) in 140 g x 3.4 = 0.47 kJ/K: 80 to 95 K, hot
    # enough to boil
    heat = only(combined("100 mL of water", "40 g of sodium hydroxide"), "heat")
    assert measure(heat, "heat set free") == pytest.approx(40.5, rel=0.1)
    assert heat.signal == "danger"


def test_ammonium_nitrate_cools() -> None:
    # 80 g in 200 mL of water: -25.7 kJ at infinite dilution, about -22 in 11 H2O; 280 g x 3.3 = 0.92 kJ/K: -22 to
    # -28 K
    rise = warming_K("200 mL of water", "80 g of ammonium nitrate")
    assert -30 < rise < -20
    assert not select(combined("200 mL of water", "80 g of ammonium nitrate"), "heat")


# --- diluting sulfuric acid ------------------------------------------------------------------------------------


def test_one_mol_of_sulfuric_acid_in_ten_of_water() -> None:
    # Pure acid and 10 H2O: 67.0 kJ/mol (NBS: -880.5 of H2SO4 in 10 H2O against -813.99 of the liquid). 98 % acid
    # holds 0.111 H2O each, which have freed about 4 kJ/mol already
    acid = 98.078 / 0.98
    heat = heat_kJ(f"{10 * 18.015 - 2.0} g of water", f"{acid} g of 98 % sulfuric acid")
    assert heat == pytest.approx(67.0 - 4.0, rel=0.04)


@pytest.mark.parametrize(
    ("water", "kJ_per_mol"),
    # NBS: heat freed by 1 mol H2SO4(l) in n H2O, from the enthalpies of formation of the solutions
    [(1, 28.1), (2, 41.9), (5, 58.0), (10, 67.0), (50, 73.3), (100, 74.0), (1000, 78.6)],
)
def test_dilution_table_of_sulfuric_acid(water: int, kJ_per_mol: float) -> None:
    table = next(one for one in laboratory().index.dilution if one.electrolyte == "sulfuric-acid")
    points = sorted(table.points)
    grid, freed = [one[0] for one in points], [one[1] for one in points]
    pure = np.interp(0.0, grid, freed)
    assert pure - np.interp(water, grid, freed) == pytest.approx(kJ_per_mol, rel=0.05)


def test_water_onto_acid_boils_and_acid_into_water_does_not() -> None:
    wrong = only(combined("50 mL of 96 % sulfuric acid", "500 mL of water"), "heat", order="as written")
    assert wrong.signal == "danger"
    assert measure(wrong, "temperature reached") > 100
    right = select(combined("500 mL of water", "50 mL of 96 % sulfuric acid"), "heat", order="as written")
    assert all(one.signal != "danger" for one in right)


def test_little_acid_in_much_water_is_nothing() -> None:
    # 1 mL in 1 L: 0.018 mol x 70 kJ = 1.3 kJ: 0.3 K
    assert warming_K("1 L of water", "1 mL of 96 % sulfuric acid") == pytest.approx(0.3, abs=0.06)


# --- reactions -------------------------------------------------------------------------------------------------


def test_zinc_and_magnesium_in_acid() -> None:
    # Zn -> Zn2+ -153.9, Mg -> Mg2+ -466.9 kJ/mol; in excess of dilute acid. Zinc: chloro complexes take some of it
    # back
    assert heat_kJ("0.6538 g of zinc powder", "1 L of 0.2 M hydrochloric acid") == pytest.approx(1.539, rel=0.06)
    assert heat_kJ("0.243 g of magnesium", "1 L of 0.2 M hydrochloric acid") == pytest.approx(4.669, rel=0.03)


def test_heat_of_reaction_by_hess() -> None:
    book = HeatBook(laboratory().stock)
    # Zn + 2 H+ -> Zn2+ + H2(aq): -153.9 - 4.2 (dissolved hydrogen, NBS)
    assert book.of_reaction({"zinc": -1.0, "H+": -2.0, "Zn+2": 1.0, "H2": 1.0}) == pytest.approx(-153.9 - 4.2, abs=1.5)


def test_bicarbonate_and_acid_cool() -> None:
    # NaHCO3(s) + H+ -> Na+ + H2O + CO2(g): -240.1 - 285.8 - 393.5 + 950.8 = +31.4 kJ/mol; some CO2 stays (-20 kJ/mol)
    heat = heat_kJ("50 g of sodium bicarbonate", "1 L of 1 M hydrochloric acid")
    assert heat == pytest.approx(-0.595 * 31.4 + 0.026 * 20, rel=0.08)


def test_onset_of_decomposition_is_a_danger_and_named() -> None:
    # persulfate decomposes from about 100 degC; 0.36 mol of sulfuric acid into 20 mL of water: some 16 kJ over 0.12
    # kJ/K
    heat = only(
        combined("10 g of potassium persulfate", "20 mL of water", "20 mL of 96 % sulfuric acid"), "heat", step=3
    )
    assert heat.signal == "danger"
    assert "ersulfate begins to decompose at 100" in heat.summary


# --- signals ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("strength", "signal"),
    # equal volumes of acid and base: c / 2 x 56 kJ/L over some 4.1 kJ/(K L): 6.7 K per mol/L
    [(0.5, ""), (1.5, "note"), (2.5, "note"), (4.0, "warning"), (6.0, "warning")],
)
def test_signal_of_warming(strength: float, signal: str) -> None:
    found = select(
        combined(f"500 mL of {strength} M sodium hydroxide", f"500 mL of {strength} M hydrochloric acid"),
        "heat", order="either order" if signal else "",
    )  # fmt: skip
    assert [one.signal for one in found] == ([signal] if signal else [])
