"""From the words on a label to mol.

Strengths of bought reagents: the table of concentrated acids and ammonia found in every analytical text (Harris, Quantitative
Chemical Analysis, inside cover: HCl 37 % 12.0 M, HNO3 70 % 15.7 M, H2SO4 96 % 18.0 M, H3PO4 85 % 14.7 M, HClO4 70 % 11.6 M,
CH3COOH 99.7 % 17.4 M, NH3 28 % 14.8 M, NaOH 50 % 19.1 M). Densities of sodium chloride solutions: CRC Handbook, 20 degC.
"""

from __future__ import annotations

import numpy as np
import pytest

from carboy.bench.ranges import Ranges
from carboy.errors import InputError
from carboy.vetting import combine, laboratory
from tests.bench.reports import bottle, nominal, walked


def molarity(text: str, token: str) -> float:
    content = bottle(text)
    return nominal(content.total(token) / content.volume_L)


@pytest.mark.parametrize(
    ("label", "token", "published"),
    [
        ("1 L of 37 % hydrochloric acid", "Cl-", 12.0),
        ("1 L of 70 % nitric acid", "NO3-", 15.7),
        ("1 L of 68 % nitric acid", "NO3-", 15.2),
        ("1 L of 96 % sulfuric acid", "SO4-2", 18.0),
        ("1 L of 85 % phosphoric acid", "PO4-3", 14.7),
        ("1 L of 70 % perchloric acid", "ClO4-", 11.6),
        ("1 L of 99.7 % acetic acid", "Acetate-", 17.4),
        ("1 L of 28 % ammonia", "NH4+", 14.8),
        ("1 L of 50 % sodium hydroxide", "Na+", 19.1),
        ("1 L of 48 % hydrobromic acid", "Br-", 8.84),
        ("1 L of 30 % hydrogen peroxide", "H2O2", 9.79),
        ("1 L of 20 % sodium hydroxide", "Na+", 6.10),  # 1.219 g/mL
    ],
)
def test_molarity_from_per_cent_and_density(label: str, token: str, published: float) -> None:
    assert molarity(label, token) == pytest.approx(published, rel=0.03)


@pytest.mark.parametrize(
    ("label", "token", "published"),
    [
        ("100 mL of concentrated hydrochloric acid", "Cl-", 12.0),
        ("100 mL of concentrated nitric acid", "NO3-", 15.6),
        ("100 mL of concentrated sulfuric acid", "SO4-2", 18.0),
        ("100 mL of concentrated ammonia", "NH4+", 14.8),
    ],
)
def test_what_concentrated_means(label: str, token: str, published: float) -> None:
    assert molarity(label, token) == pytest.approx(published, rel=0.03)


def test_protons_come_with_the_acid_and_go_with_the_base() -> None:
    for label, protons in (
        ("1 L of 37 % hydrochloric acid", 1),
        ("1 L of 96 % sulfuric acid", 2),
        ("1 L of 85 % phosphoric acid", 3),
    ):
        content = bottle(label)
        (moles,) = content.labelled.values()
        assert nominal(content.total("H+")) == pytest.approx(protons * nominal(moles))
    base = bottle("1 L of 50 % sodium hydroxide")
    assert nominal(base.total("H+")) == pytest.approx(-nominal(base.total("Na+")))


@pytest.mark.parametrize(("per_cent", "density"), [(10, 1.0707), (20, 1.1478)])
def test_density_of_salt_water(per_cent: int, density: float) -> None:
    content = bottle(f"1 L of {per_cent} % sodium chloride")
    assert nominal(content.mass_g) / 1000 == pytest.approx(density, rel=0.02)
    # 10 %: 107.07 g / 58.44 = 1.83 mol/L; 20 %: 229.6 g / 58.44 = 3.93 mol/L
    assert nominal(content.total("Na+")) == pytest.approx(density * per_cent * 10 / 58.44, rel=0.02)


def test_saturated_salt_water() -> None:
    # 26.4 % w/w at 25 degC, 1.197 g/mL (CRC): 316 g/L, 5.41 mol/L
    assert molarity("1 L of saturated sodium chloride", "Cl-") == pytest.approx(5.41, rel=0.04)


# --- strengths -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("label", "token", "mol"),
    [
        ("1 L of 0.5 M sodium chloride", "Na+", 0.5),
        ("250 mL of 2 M NaOH", "Na+", 0.5),
        ("1 L of 1 N sulfuric acid", "SO4-2", 0.5),  # two protons
        ("1 L of 1 N hydrochloric acid", "Cl-", 1.0),
        ("1 L of 0.1 N sodium carbonate", "CO3-2", 0.05),  # two charges
        ("1 L of 3 N phosphoric acid", "PO4-3", 1.0),
        ("1 L of 0.1 N calcium chloride", "Ca+2", 0.05),
        ("1 L of 5.844 g/L sodium chloride", "Na+", 0.1),
        ("2 L of 58.44 mg/L sodium chloride", "Na+", 0.002),
        ("1 L of 5 % w/v sodium chloride", "Na+", 50 / 58.44),
        ("100 g of 37 % hydrochloric acid", "Cl-", 37 / 36.461),
        ("0.5 mol of sodium chloride", "Na+", 0.5),
        ("58.44 g of sodium chloride", "Cl-", 1.0),
        ("1 L of 100 ppm sodium chloride", "Na+", 0.100 * 0.997 / 58.44),  # mg per kg
    ],
)
def test_amount_of_a_strength(label: str, token: str, mol: float) -> None:
    assert nominal(bottle(label).total(token)) == pytest.approx(mol, rel=2e-3)


def test_per_cent_by_volume() -> None:
    # 70 mL of ethanol in 100 mL: 70 x 0.7893 / 46.07 = 1.199 mol; the rest of some 0.885 g/mL (CRC) is water
    content = bottle("100 mL of 70 % v/v ethanol")
    assert nominal(content.total("ethanol")) == pytest.approx(70 * 0.7893 / 46.07, rel=0.01)
    assert nominal(content.mass_g) == pytest.approx(88.5, rel=0.03)


def test_a_solution_of_two() -> None:
    content = bottle("2 L of (0.05 M mercury(II) nitrate + 0.5 M nitric acid)")
    assert nominal(content.total("Hg+2")) == pytest.approx(0.1)
    assert nominal(content.total("NO3-")) == pytest.approx(2 * (0.1 + 0.5))
    assert nominal(content.total("H+")) == pytest.approx(1.0)


# --- solids and neat liquids -----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("label", "token", "molar_mass"),
    [
        ("25 g of copper(II) sulfate pentahydrate", "Cu+2", 249.68),
        ("25 g of CuSO4·5H2O", "Cu+2", 249.68),
        ("25 g of CuSO4.5H2O", "Cu+2", 249.68),
        ("25 g of CuSO4*5H2O", "Cu+2", 249.68),
        ("25 g of anhydrous copper sulfate", "Cu+2", 159.60),
        ("20 g of sodium sulfide nonahydrate", "HS-", 240.18),
        ("20 g of sodium bicarbonate", "CO3-2", 84.007),
        ("20 g of CAS 7647-14-5", "Cl-", 58.44),
    ],
)
def test_weighed_salts(label: str, token: str, molar_mass: float) -> None:
    content = bottle(label)
    grams = float(label.split(maxsplit=1)[0])
    assert nominal(content.total(token)) == pytest.approx(grams / molar_mass, rel=1e-3)
    assert nominal(content.mass_g) == pytest.approx(grams)


def test_water_of_crystallisation_is_water() -> None:
    # CuSO4·5H2O: 5 mol of water; Na2S·9H2O -> 2 Na+ + HS- + OH-: nine, less one that is split
    copper = bottle("25 g of CuSO4·5H2O")
    assert nominal(copper.total("H2O") / copper.total("Cu+2")) == pytest.approx(5)
    sulfide = bottle("20 g of sodium sulfide nonahydrate")
    assert nominal(sulfide.total("H2O") / sulfide.total("HS-")) == pytest.approx(9)
    assert nominal(sulfide.total("H+") / sulfide.total("HS-")) == pytest.approx(-1)


def test_neat_liquid_by_volume() -> None:
    # 50 mL x 0.7845 g/mL (25 degC, CRC) / 58.08 = 0.675 mol
    content = bottle("50 mL of acetone")
    assert nominal(content.total("acetone")) == pytest.approx(0.675, rel=0.01)
    assert content.solved is None


def test_gas_by_volume() -> None:
    content = bottle("24.465 L of chlorine gas")
    assert nominal(sum(content.labelled.values())) == pytest.approx(1.0, rel=1e-3)


# --- companions ------------------------------------------------------------------------------------------------


def test_bleach_holds_as_much_chloride_as_hypochlorite() -> None:
    # Cl2 + 2 NaOH -> NaOCl + NaCl + H2O
    for label in ("1 L of 6 % sodium hypochlorite", "1 L of bleach"):
        content = bottle(label)
        assert content.total("Cl-") == pytest.approx(content.total("ClO-"))
    solid = bottle("10 g of calcium hypochlorite")
    assert nominal(solid.total("ClO-")) == pytest.approx(2 * 10 / 142.98, rel=0.01)


def test_companions_count_in_the_mass_and_charge() -> None:
    content = bottle("1 L of 6 % sodium hypochlorite")
    charge = content.total("Na+") + content.total("H+") - content.total("ClO-") - content.total("Cl-")
    assert nominal(charge) == pytest.approx(0.0, abs=1e-12)
    held = {"Na+": 22.99, "ClO-": 51.45, "Cl-": 35.45, "H2O": 18.015}
    grams = sum(mass * nominal(content.total(token)) for token, mass in held.items())
    assert grams == pytest.approx(nominal(content.mass_g), rel=1e-3)


# --- saturation ------------------------------------------------------------------------------------------------


def test_saturated_lime_water() -> None:
    # 1.6 g/L at 25 degC (CRC): 0.0216 mol, pH 12.4 to 12.5
    content = bottle("1 L of saturated calcium hydroxide")
    assert nominal(content.total("Ca+2")) == pytest.approx(0.0216, rel=0.1)
    assert nominal(content.pH) == pytest.approx(12.45, abs=0.1)


def test_more_than_a_litre_can_hold_is_not_weighed_twice() -> None:
    # 96 % acid cannot be stronger than itself: a litre of it weighs 1.84 kg whatever else the label says
    content = bottle("1 L of 96 % sulfuric acid")
    assert nominal(content.labelled["sulfuric-acid"]) * 98.078 < nominal(content.mass_g)
    assert nominal(content.total("H2O")) > 0


# --- ranges ----------------------------------------------------------------------------------------------------


def test_a_range_gives_the_nominal_case_and_both_ends() -> None:
    content = bottle("1 L of 1-3 M hydrochloric acid")
    strength = content.total("Cl-") / content.volume_L
    assert strength[0] == pytest.approx(2.0)
    assert (strength.min(), strength.max()) == pytest.approx((1.0, 3.0))


def test_two_ranges_give_the_nominal_case_and_all_corners() -> None:
    content = bottle("1-2 L of 1-3 M hydrochloric acid")
    assert nominal(content.total("Cl-")) == pytest.approx(3.0)
    corners = {
        (round(v, 6), round(n / v, 6)) for v, n in zip(content.volume_L[1:], content.total("Cl-")[1:], strict=True)
    }
    assert corners >= {(1.0, 1.0), (1.0, 3.0), (2.0, 1.0), (2.0, 3.0)}


@pytest.mark.parametrize(
    ("label", "low", "high"),
    [
        ("up to 5 g of sodium chloride", 0.0, 5 / 58.44),
        ("2-4 g of sodium chloride", 2 / 58.44, 4 / 58.44),
        ("1 L of up to 2 M sodium chloride", 0.0, 2.0),
        ("1 L of 10-50 g/L sodium chloride", 10 / 58.44, 50 / 58.44),
    ],
)
def test_ends_of_a_range(label: str, low: float, high: float) -> None:
    amounts = bottle(label).total("Na+")
    assert (amounts.min(), amounts.max()) == pytest.approx((low, high), rel=1e-4, abs=1e-12)
    assert low < amounts[0] < high


def test_about_brackets_its_figure() -> None:
    volume = bottle("about 2 L of 1 M sodium chloride").volume_L
    assert volume[0] == pytest.approx(2.0)
    assert volume.min() < 2.0 < volume.max()
    assert volume.min() / 2.0 == pytest.approx(2.0 - volume.max() / 2.0)


def test_unknown_strength_is_a_wide_range_and_a_question() -> None:
    walk = walked("1 L of hydrochloric acid")
    strength = walk.steps[0].after.total("Cl-")
    assert strength.max() > 10 * strength.min()
    assert strength.max() == pytest.approx(12.4, rel=0.05)  # no stronger than what is sold (38 %)
    assert any("hydrochloric acid" in line for line in walk.questions)


def test_many_ranges_are_sampled_with_each_end_of_each() -> None:
    ranges = Ranges()
    keys = [f"range {n}" for n in range(7)]
    for place, key in enumerate(keys):
        ranges.draw(key, place, place + 2)
    ranges.fix()
    drawn = np.array([ranges.draw(key, place, place + 2) for place, key in enumerate(keys)])
    assert drawn[:, 0] == pytest.approx([place + 1 for place in range(7)])
    assert drawn.shape[1] == ranges.lanes < 2**7
    for place in range(7):
        assert drawn[place].min() == place
        assert drawn[place].max() == place + 2
        others = np.delete(drawn, place, axis=0) - np.delete(np.arange(7), place)[:, None]
        alone = (others == 1).all(axis=0)
        assert {float(value) for value in drawn[place][alone]} >= {place, place + 1, place + 2}


def test_ranges_of_one_key_move_together() -> None:
    ranges = Ranges()
    ranges.draw("one", 1.0, 2.0)
    ranges.draw("one", 1.0, 2.0)
    ranges.fix()
    assert ranges.draw("one", 1.0, 2.0)[0] == pytest.approx(1.5)
    assert ranges.draw("one", 1.0, 2.0) == pytest.approx(ranges.draw("one", 1.0, 2.0))
    assert set(ranges.variables) == {"one"}
    assert ranges.draw("two", 3.0, 3.0) == pytest.approx(np.full(ranges.lanes, 3.0))


def test_open_end_is_followed_tenfold() -> None:
    assert bottle("at least 1 L of 1 M sodium chloride").volume_L.max() == pytest.approx(10.0)


# --- pH on the label -------------------------------------------------------------------------------------------


@pytest.mark.parametrize("pH", [2.0, 4.0, 12.0])
def test_unknown_with_a_pH_has_that_pH_in_every_lane(pH: float) -> None:
    content = bottle(f"1 L of unknown, pH {pH:g}")
    assert content.lanes >= 3  # the reserve is a range
    assert content.pH == pytest.approx(pH, abs=0.005)


@pytest.mark.parametrize(
    ("label", "pH"),
    [
        pytest.param("1 L of 0.1 M sodium phosphate, pH 7", 7.0),
        pytest.param("1 L of 0.1 M sodium acetate, pH 4.76", 4.76),
        pytest.param("500 mL of 0.2 M ammonium chloride, pH 9.2", 9.2),
        ("1 L of 0.05 M potassium cyanide, pH 11", 11.0),
    ],
)
def test_known_solution_with_a_pH(label: str, pH: float) -> None:
    content = bottle(label)
    assert content.pH == pytest.approx(pH, abs=0.005)
    assert_neutral(label)


def test_half_protonated_acetate() -> None:
    # 0.1 M acetate at its own pK' (4.757 - 2 x 0.1 of activity at I = 0.05 + ...): half of it acid; free pH fixes
    # the counter-ion only
    content = bottle("1 L of 0.1 M sodium acetate, pH 4.6")
    share = nominal(content.total("H+")) / 0.1
    # activity coefficient at I = 0.1: 0.78 (Davies): pK' = 4.757 - 0.107 = 4.65; share of acid at pH 4.6: 1/(1 +
    # 10**(4.6 - 4.65)) = 0.53
    assert share == pytest.approx(0.53, abs=0.03)


def test_free_acid_of_pH_2() -> None:
    # activity 0.01 over 0.903 (Davies at I = 0.011): 0.0111 mol/kg, 0.0110 mol in a litre of 0.997 kg
    content = bottle("1 L of unknown, pH 2")
    free = content.total("H+")[np.argmin(content.total("H+"))]
    assert free == pytest.approx(0.0110, rel=0.02)


def assert_neutral(label: str) -> None:
    content = bottle(label)
    species = laboratory().index.species
    charge = sum(species[token].charge * amount for token, amount in content.amounts.items() if token in species)
    assert charge == pytest.approx(0.0, abs=1e-9)


@pytest.mark.parametrize(
    "label",
    [
        pytest.param("1 L of unknown, pH 2"),
        "1 L of unknown, pH 12",
        "1 L of (0.01 M mercury(II) nitrate + 0.5 M sodium bicarbonate)",
        "1 L of bleach",
        "1 L of concentrated ammonia",
        "10 g of potassium dichromate",
        "1 L of 0.1 M potassium permanganate",
        "20 g of sodium sulfide nonahydrate",
        "1 L of 0.1 M potassium ferrocyanide",
        "1 L of 0.1 M EDTA",
    ],
)
def test_every_bottle_is_neutral(label: str) -> None:
    assert_neutral(label)


# --- what cannot be made up ------------------------------------------------------------------------------------


def test_unrecognised_ingredient_leaves_the_rest_in() -> None:
    walk = walked("1 L of (0.5 M hydrochloric acid + 0.1 M flurbium nitrate)")
    assert walk.unrecognised == ["flurbium nitrate"]
    assert nominal(walk.steps[0].after.total("Cl-")) == pytest.approx(0.5)


@pytest.mark.parametrize(
    "label", ["1 mol of 37 % hydrochloric acid", "-5 g of sodium chloride", "0 mL of water", "5 g", "of water"]
)
def test_what_is_no_portion_is_an_input_error(label: str) -> None:
    with pytest.raises(InputError):
        combine(label, "10 mL of water")
