"""Heat of dilution through real labels against published tables; what a step has to lose so that it stays under its ceiling; onsets.

Integral heats of solution of sulfuric acid and sodium hydroxide, kJ/mol in n mol of water: Felder and Rousseau, Elementary Principles of
Chemical Processes, table B.11 (from memory). Enthalpies of formation of hydrochloric and nitric acid in n mol of water: Wagman et al., The
NBS tables, J. Phys. Chem. Ref. Data 11, suppl. 2 (1982) (from memory). Dilution of perchloric acid: Parker, NSRDS-NBS 2 (1965), as printed in
the CRC Handbook. Neutralisation: H+ + OH- = H2O, -55.84 kJ/mol at infinite dilution (CRC Handbook). What dilutes is given as a label of such a
strength that it holds a printed amount of water.
"""

from __future__ import annotations

import numpy as np
import pytest

from carboy.bench.trace import Course
from carboy.vetting import laboratory
from tests.bench.reports import combined, measure, only, outline, select, walked

WATER = 18.015  # g/mol


def path_of(*portions: str) -> Course:
    path = walked(*portions).steps[-1].path
    assert path is not None
    return path


def heat_kJ(*portions: str) -> float:
    path = path_of(*portions)
    return float(path.heat_kJ[path.last()][0])


def diluted(name: str, molar_mass: float, before: float, after: float) -> float:
    """kJ set free when 1 mol in ``before`` mol of water is poured into water, ``after`` mol in all."""
    grams = molar_mass + before * WATER
    percent = 100 * molar_mass / grams
    return heat_kJ(f"{(after - before) * WATER:.4f} g of water", f"{grams:.4f} g of {percent:.5f} % {name}")


@pytest.mark.parametrize(
    ("after", "kJ"),
    # 84.5 % holds 1 H2O: 28.07 freed already; in 2: 41.92, 5: 58.03, 10: 67.03, 50: 73.34, 100: 73.97, 1000: 78.58
    [(2, 13.85), (5, 29.96), (10, 38.96), (50, 45.27), (100, 45.90), (1000, 50.51)],
)
def test_sulfuric_acid(after: float, kJ: float) -> None:
    assert diluted("sulfuric acid", 98.079, 1, after) == pytest.approx(kJ, rel=0.01)


@pytest.mark.parametrize(
    ("after", "kJ"),
    # 63.6 % holds 2 H2O, -194.56; in 3: -198.57, 5: -202.59, 10: -205.82, 50: -206.85
    [(3, 4.01), (5, 8.03), (10, 11.26), (50, 12.29)],
)
def test_nitric_acid(after: float, kJ: float) -> None:
    assert diluted("nitric acid", 63.013, 2, after) == pytest.approx(kJ, rel=0.03)


@pytest.mark.parametrize(
    ("after", "kJ"),
    # 33.6 % holds 4 H2O, -152.92; in 5: -155.77, 10: -161.32, 20: -163.85, 50: -165.36, 100: -165.92, 200: -166.27
    [(5, 2.85), (10, 8.40), (20, 10.93), (50, 12.44), (100, 13.00), (200, 13.35)],
)
def test_hydrochloric_acid(after: float, kJ: float) -> None:
    assert diluted("hydrochloric acid", 36.461, 4, after) == pytest.approx(kJ, rel=0.05)


@pytest.mark.parametrize(
    ("after", "kJ"),
    # 66.8 % is 20 mol/kg, 13.81 to go; 10 mol/kg 2.013; 5.551 (10 H2O) -0.49; 1 mol/kg -0.201: it cools again
    [(5.551, 11.80), (10, 14.30), (55.51, 14.01)],
)
def test_perchloric_acid(after: float, kJ: float) -> None:
    assert diluted("perchloric acid", 100.458, 2.775, after) == pytest.approx(kJ, rel=0.02)


@pytest.mark.parametrize(
    ("after", "kJ"),
    # 42.5 % holds 3 H2O: 28.87 freed already; in 4: 34.43, 5: 37.74, 10: 42.51, 20: 42.84, 50: 42.53, 100: 42.34
    [(4, 5.56), (5, 8.87), (10, 13.64), (20, 13.97), (50, 13.66), (100, 13.47)],
)
def test_sodium_hydroxide(after: float, kJ: float) -> None:
    assert diluted("sodium hydroxide", 39.997, 3, after) == pytest.approx(kJ, rel=0.03)


@pytest.mark.parametrize(
    ("water", "kJ"),
    # of the solid, 44.51 at infinite dilution (CRC) less what is still to go: in 10: 0.38, 20: 0.05, 50: 0.36, 200: 0.63
    [(10, 44.13), (20, 44.46), (50, 44.15), (200, 43.88)],
)
def test_pellets_in_enough_water(water: float, kJ: float) -> None:
    assert heat_kJ(f"{water * WATER:.3f} g of water", "39.997 g of sodium hydroxide") == pytest.approx(kJ, rel=0.01)


def test_pellets_in_little_water() -> None:
    # in 3 H2O 44.51 - 14.02 = 30.5
    assert heat_kJ(f"{3 * WATER:.3f} g of water", "39.997 g of sodium hydroxide") == pytest.approx(30.5, rel=0.03)


def test_warming_of_diluted_sulfuric_acid() -> None:
    # 1 mol of 98 % in 10 mol of water in all: 63 kJ (67.0 less some 4 freed already) in 278 g of 35 % acid, heat capacity
    # 2.9 kJ/(kg K) (NBS; from memory): 78 K
    acid = 98.079 / 0.98
    path = path_of(f"{10 * WATER - 2.0:.3f} g of water", f"{acid:.4f} g of 98 % sulfuric acid")
    rise = float((path.reached_C - path.unreacted.temperature_C)[path.last()][0])
    assert rise == pytest.approx(78, abs=8)


@pytest.mark.parametrize("base", ["sodium hydroxide", "potassium hydroxide"])
@pytest.mark.parametrize("acid", ["hydrochloric acid", "nitric acid", "perchloric acid"])
def test_neutralisation_of_dilute_acid_and_base(base: str, acid: str) -> None:
    # 10 mmol of water formed in 1 L; what dilution adds at 0.02 mol/L is below 1 kJ/mol
    heat = heat_kJ(f"500 mL of 0.02 M {base}", f"500 mL of 0.02 M {acid}")
    assert heat == pytest.approx(0.01 * 55.84, rel=0.02)


# --- what must be carried off -----------------------------------------------------------------------------------------

STRONG = ("500 mL of 6 M sodium hydroxide", "500 mL of 6 M hydrochloric acid")


def test_heat_beyond_the_ceiling_and_the_ice_that_takes_it() -> None:
    # 3 mol of water: 3 x 55.84 = 167.5, with what 6 M acid (about 8 H2O each, 7 to 8 kJ/mol)
    # and 6 M base (about 8 H2O, 1 to 2 kJ/mol) still have to give 175 to 197 kJ.
    # 500 mL of 1.21 and 500 of 1.10 kg/L (CRC): 1.155 kg, of it 0.175 of salt: 0.98 x 4.18 + 0.175 = 4.27 kJ/K. 20 K are
    # 85 kJ, so some 100 are to be carried off, 0.3 kg of ice
    heat = only(combined(*STRONG), "heat", order="either order")
    freed = measure(heat, "heat set free")
    assert 175 < freed < 197
    capacity = freed / measure(heat, "warming without loss")
    assert capacity == pytest.approx(4.27, rel=0.02)
    surplus = measure(heat, "to be carried off")
    assert surplus == pytest.approx(freed - 20 * capacity, rel=0.02)
    (ice,) = (one.basis for one in heat.measures if one.quantity.startswith("to be carried off"))
    assert f"{surplus / 334:.2f}" in ice


def test_time_of_addition_in_a_bath() -> None:
    # some 100 kJ / 0.1 kW = 1000 s, 17 min, as the heat comes evenly here
    heat = only(combined(*STRONG), "heat", order="either order")
    surplus = measure(heat, "to be carried off")
    time = measure(heat, "shortest time of addition")
    assert surplus / 0.1 / 60 <= time <= 1.1 * surplus / 0.1 / 60
    assert 15 < time < 20


def test_time_of_addition_counts_where_the_heat_comes_first() -> None:
    # excess acid: all the heat with the first third of it; the bath has a third of the time for it
    heat = only(combined("500 mL of 6 M sodium hydroxide", "1.5 L of 6 M hydrochloric acid"), "heat", step=2)
    path = path_of("500 mL of 6 M sodium hydroxide", "1.5 L of 6 M hydrochloric acid")
    third = int(np.argmin(np.abs(path.fractions - 1 / 3)))
    needed = (float(path.heat_kJ[third]) - 20 * float(path.capacity_kJ_K[third])) / (1 / 3) / 0.1 / 60
    assert measure(heat, "shortest time of addition") == pytest.approx(needed, rel=0.06)
    assert needed > 2.5 * measure(heat, "to be carried off") / 0.1 / 60


def test_no_surplus_no_bath() -> None:
    heat = only(
        combined("500 mL of 2 M sodium hydroxide", "500 mL of 2 M hydrochloric acid"), "heat", order="either order"
    )
    names = [one.quantity for one in heat.measures]
    assert not [name for name in names if name.startswith(("to be carried", "shortest time"))]


def test_of_a_range_the_worst_is_carried_off() -> None:
    # at the top 10 M on 10 M: 5 x 58 kJ over 4.2 kJ/K, 69 K, a danger, which
    # the middle of the range is not
    ranged = only(combined("500 mL of 1-10 M sodium hydroxide", "500 mL of 10 M hydrochloric acid"), "heat", step=2)
    top = only(combined("500 mL of 10 M sodium hydroxide", "500 mL of 10 M hydrochloric acid"), "heat", step=2)
    assert (ranged.signal, ranged.holds, top.signal) == ("danger", "in part", "danger")
    for quantity in ("to be carried off", "shortest time of addition"):
        assert measure(ranged, quantity) == pytest.approx(measure(top, quantity), rel=0.02)


# --- onset of decomposition -------------------------------------------------------------------------------------------

ONSETS = {  # degC, from memory: CRC Handbook, Bretherick's Handbook, safety data
    "potassium-permanganate": 240, "ammonium-dichromate": 170, "potassium-persulfate": 100, "ammonium-persulfate": 120,
    "benzoyl-peroxide": 103, "sodium-azide": 275, "sodium-dithionite": 90, "ammonium-nitrate": 210,
}  # fmt: skip


@pytest.mark.parametrize(("substance", "celsius"), ONSETS.items())
def test_onsets_in_the_graph(substance: str, celsius: float) -> None:
    onset = laboratory().index.substances[substance].onset
    assert onset is not None
    assert onset.magnitude == pytest.approx(celsius, abs=15)
    assert onset.source


def test_a_substance_is_heated_past_its_onset_by_an_acid() -> None:
    # 20 mL of 96 % sulfuric acid, 0.36 mol, in 20 mL of water: 0.36 x 50 = 18 kJ over some 0.14 kJ/K: beyond 100 degC
    report = combined("5 g of sodium dithionite", "20 mL of water", "20 mL of 96 % sulfuric acid")
    heat = only(report, "heat", step=3)
    assert heat.signal == "danger"
    assert "dithionite begins to decompose at 90" in heat.summary
    assert measure(heat, "temperature reached") > 90


def test_below_its_onset_it_is_not_named() -> None:
    # the same acid in 50 times the water: 18 kJ over 4.2 kJ/K: 4 K
    report = combined("5 g of sodium dithionite", "1 L of water", "20 mL of 96 % sulfuric acid")
    assert not [one for one in select(report, "heat") if "decompose" in one.summary], outline(report)
    # and permanganate stands what boiling water does to it
    report = combined("5 g of potassium permanganate", "50 mL of water", "40 g of sodium hydroxide")
    assert not [one for one in select(report, "heat") if "decompose" in one.summary], outline(report)


def test_what_has_reacted_away_is_still_what_was_put_in() -> None:
    # azide melts only at 275 degC: warm water is nothing to it
    report = combined("5 g of sodium azide", "50 mL of water", "40 g of sodium hydroxide")
    heat = only(report, "heat", step=3)
    assert "azide" not in heat.summary
    assert heat.signal == "danger"  # but it boils


def test_strong_peroxide_made_boiling_hot_gives_its_oxygen_at_once() -> None:
    # 60 g of caustic, 1.5 mol at some 40 kJ, in 100 mL: to boiling; beyond 60 degC peroxide falls apart in minutes
    report = combined("100 mL of 30 % hydrogen peroxide", "60 g of sodium hydroxide")
    assert only(report, "heat", step=2, order="either order").signal == "danger"
    oxygen = [one for one in select(report, "oxygen", "O2") if one.order != "other order"]
    assert [one.moment for one in oxygen] == ["during"], outline(report)
