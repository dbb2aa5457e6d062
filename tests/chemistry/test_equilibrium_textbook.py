"""Known solutions. Each value with its source; tolerances are those of the data, not of the solver."""

from __future__ import annotations

import numpy as np
import pytest

from carboy.chemistry.equilibrium import solve
from carboy.chemistry.network import NetworkFactory
from tests.chemistry.aqueous_records import EQUILIBRIA, SPECIES
from tests.chemistry.mixtures import MOL_PER_KG, dissolved, gas, of, pressure, solid, solved, totals_of

# NBS/NIST primary pH standards at 25 degC (Bates, Determination of pH, 1973; values from memory), molal.
STANDARDS = [
    ({"K+": 0.025, "Na+": 0.05, "PO4-3": 0.05, "H+": 0.075}, 6.865),  # 0.025 KH2PO4 + 0.025 Na2HPO4
    ({"K+": 0.008695, "Na+": 0.06086, "PO4-3": 0.039125, "H+": 0.04782}, 7.413),
    ({"K+": 0.05, "Phthalate-2": 0.05, "H+": 0.05}, 4.008),  # potassium hydrogen phthalate
    ({"Na+": 0.075, "CO3-2": 0.05, "H+": 0.025}, 10.012),  # 0.025 NaHCO3 + 0.025 Na2CO3
    ({"Na+": 0.02, "H3BO3": 0.04, "H+": -0.02}, 9.180),  # 0.01 borax
]


# The standards are compared without ion pairs of Na+ and K+: MINTEQ's pairs were fitted with another activity model and
# lower these pH by up to 0.15, which is a matter of data and not of the solver.
WITHOUT_PAIRS = NetworkFactory(
    [row for row in EQUILIBRIA if row.kind != "aqueous" or not {"Na+", "K+"} & set(row.coefficients)], SPECIES
)


@pytest.mark.parametrize(("mixture", "expected"), STANDARDS)
def test_primary_ph_standards(mixture: dict[str, float], expected: float) -> None:
    network = WITHOUT_PAIRS.network(mixture)
    answer = solve(network, totals_of(network, mixture), np.array([MOL_PER_KG]), retain_gas=True)
    assert answer.converged.all()
    assert answer.pH[0] == pytest.approx(expected, abs=0.05)


# Textbook exercises (any general chemistry text, e.g. Harris, Quantitative Chemical Analysis; from memory). They are
# worked with concentrations; -log10 of the activity differs by up to -log10 g = 0.11 at I = 0.1.
EXERCISES = [
    ({"Acetate-": 0.1, "H+": 0.1}, 2.88),
    ({"Acetate-": 0.1, "Na+": 0.1}, 8.87),
    ({"NH4+": 0.1, "H+": -0.1}, 11.12),
    ({"NH4+": 0.1, "Cl-": 0.1}, 5.13),
    ({"Cl-": 0.1, "H+": 0.1}, 1.10),  # NBS value of 0.1 m HCl
    ({"CN-": 0.1, "Na+": 0.1}, 11.1),
    ({"HS-": 0.1, "H+": 0.1}, 4.0),
]


@pytest.mark.parametrize(("mixture", "expected"), EXERCISES)
def test_textbook_ph(mixture: dict[str, float], expected: float) -> None:
    answer = solved(mixture, retain_gas=True)
    assert answer.pH[0] == pytest.approx(expected, abs=0.12)


def test_sodium_carbonate() -> None:
    """0.1 M: 11.6 by the textbook with concentrations only; activities and the pair NaCO3- bring it to 11.3."""
    assert 11.2 < solved({"Na+": 0.2, "CO3-2": 0.1}).pH[0] < 11.65


def test_pure_water() -> None:
    answer = solved({})
    assert answer.pH[0] == pytest.approx(7.0, abs=0.005)
    assert answer.water_kg[0] == pytest.approx(1.0)


def test_water_under_one_atmosphere_of_carbon_dioxide() -> None:
    """pH 3.9 (any text on carbonate equilibria); 0.033 mol/L dissolve."""
    answer = solved({"CO3-2": 0.2, "H+": 0.4})
    assert answer.bubbling[0]
    assert answer.pH[0] == pytest.approx(3.92, abs=0.03)
    assert dissolved(answer, "CO3-2") == pytest.approx(0.033, abs=0.002)


# Solubilities in water at 25 degC (CRC Handbook, from memory): 1.9 mg/L AgCl, 2.4 g/L gypsum as the dihydrate 2.6.
def test_solubility_of_silver_chloride() -> None:
    answer = solved({"Ag+": 0.01, "Cl-": 0.01})
    assert dissolved(answer, "Ag+") * 143.3 * 1000.0 == pytest.approx(1.9, abs=0.2)
    assert solid(answer, "Cerargyrite") == pytest.approx(0.01, rel=0.01)


def test_solubility_of_gypsum() -> None:
    answer = solved({"Ca+2": 0.1, "SO4-2": 0.1})
    assert dissolved(answer, "Ca+2") == pytest.approx(0.0153, abs=0.001)


def test_saturated_lime_water() -> None:
    """NBS standard of pH 12.454 at 25 degC, 0.0203 mol/kg (Bates 1973, from memory)."""
    answer = solved({"Ca+2": 0.1, "H+": -0.2})
    assert answer.pH[0] == pytest.approx(12.454, abs=0.05)
    assert dissolved(answer, "Ca+2") == pytest.approx(0.0203, abs=0.002)


def test_bicarbonate_and_hydrochloric_acid_in_an_open_vessel() -> None:
    """1 mol of each: all but what 0.97 atm keeps dissolved (Henry 0.034 mol/kg/atm, salted out a little) bubbles
    off.
    """
    answer = solved({"Na+": 1.0, "CO3-2": 1.0, "H+": 2.0, "Cl-": 1.0})
    assert answer.bubbling[0]
    vapour = 0.03126  # atm, water at 25 degC (23.76 mmHg, CRC Handbook)
    kept = 0.034 * (1.0 - vapour) / 10 ** (0.1 * answer.ionic_strength[0]) * answer.water_kg[0]
    assert gas(answer, "CO2(g)") == pytest.approx(1.0 - kept, abs=0.003)
    assert pressure(answer, "CO2(g)") == pytest.approx(1.0 - vapour, abs=1e-4)


def test_sealed_bottle_by_hand() -> None:
    """p V = n R T and Henry's law solved by hand: p = n / (V/RT + 0.034 w / gamma); 0.5 mol over 1 kg and 2 L of
    headspace.
    """
    answer = solved({"Na+": 0.5, "CO3-2": 0.5, "H+": 1.0, "Cl-": 0.5}, headspace_L=2.0)
    solubility = 10**-1.466 / 10 ** (0.1 * answer.ionic_strength[0])  # 18.147 - 16.681 of MINTEQ
    solubility *= 1.0 - 0.017 * answer.amounts[0].sum() / answer.water_kg[0]  # CO2 + H2O = H2CO3: activity of water
    by_hand = 0.5 / (2.0 / (0.082057 * 298.15) + solubility * answer.water_kg[0])
    assert pressure(answer, "CO2(g)") == pytest.approx(by_hand, rel=2e-3)
    assert gas(answer, "CO2(g)") == pytest.approx(pressure(answer, "CO2(g)") * 2.0 / (0.082057 * 298.15), rel=1e-6)


def test_hydrogen_cyanide_over_acidified_cyanide() -> None:
    """1 mM at low pH over 1 kg, no headspace: 1e-3/7.5 = 1.3e-4 atm."""
    answer = solved({"Na+": 0.001, "CN-": 0.001, "H+": 0.011, "Cl-": 0.011})
    assert pressure(answer, "HCN(g)") == pytest.approx(1.3e-4, rel=0.03)
    assert not answer.bubbling[0]


def test_hydrogen_sulfide_bubbles_from_strong_sulfide() -> None:
    answer = solved({"Na+": 1.0, "HS-": 1.0, "H+": 1.0, "Cl-": 1.0})
    assert gas(answer, "H2S(g)") == pytest.approx(1.0 - 0.1, abs=0.03)


def test_equivalence_of_mercury_and_sulfide() -> None:
    """Hg:S = 1 to the last digit: nothing else left over, a neutral salt solution, and Hg below any limit."""
    answer = solved({"Hg+2": 0.001, "HS-": 0.001, "H+": -0.001, "NO3-": 0.002, "Na+": 0.002})
    assert answer.converged[0]
    assert answer.pH[0] == pytest.approx(7.0, abs=0.02)
    assert solid(answer, "Metacinnabar") == pytest.approx(0.001, rel=1e-9)
    assert dissolved(answer, "Hg+2") == pytest.approx(dissolved(answer, "HS-"), rel=1e-6)
    assert dissolved(answer, "Hg+2") < 1e-12


def test_equivalence_of_aluminium_and_hydroxide() -> None:
    answer = solved({"Al+3": 0.01, "NO3-": 0.03, "Na+": 0.03, "H+": -0.03})
    assert answer.converged[0]
    assert 6.0 < answer.pH[0] < 8.0
    assert solid(answer, "Al(OH)3(am)") == pytest.approx(0.01, rel=1e-3)


def test_excess_sulfide_redissolves_mercury() -> None:
    """1 mM Hg with 10 mM Na2S, unbuffered: of the order of 0.4 mg/L stays (MINTEQ constants; 2e-6 mol/L)."""
    answer = solved({"Hg+2": 0.001, "NO3-": 0.002, "Na+": 0.02, "HS-": 0.01, "H+": -0.01})
    assert answer.pH[0] == pytest.approx(11.9, abs=0.1)
    assert 0.1 < dissolved(answer, "Hg+2") * 200.6 * 1000.0 < 2.0


def test_ammonia_keeps_copper_dissolved_and_hydroxide_does_not() -> None:
    bare = solved({"Cu+2": 0.01, "NO3-": 0.02, "Na+": 0.02, "H+": -0.02})
    assert dissolved(bare, "Cu+2") < 1e-5
    assert solid(bare, "Cu(OH)2") == pytest.approx(0.01, rel=1e-2)
    masked = solved({"Cu+2": 0.01, "NO3-": 0.02, "Edta-4": 0.012, "Na+": 0.068, "H+": -0.02})
    assert dissolved(masked, "Cu+2") == pytest.approx(0.01, rel=1e-6)


def test_neutralisation_makes_water() -> None:
    """1 mol of HCl and 1 mol of NaOH in 1 kg make 1 mol of water more than the water poured in."""
    start = {"Na+": 1.0, "Cl-": 1.0, "H+": 0.0}
    answer = solved(start, water_mol=MOL_PER_KG + 1.0)
    assert answer.water_kg[0] == pytest.approx(1.0 + 0.01801528, rel=1e-6)


def test_temperature_moves_the_ion_product() -> None:
    """pKw 13.26 at 50 degC (Harned and Owen, from memory); van 't Hoff with 55.8 kJ/mol gives 13.24."""
    answer = solved({}, temperature_C=50.0)
    assert answer.pH[0] == pytest.approx(13.26 / 2.0, abs=0.03)
    assert of(answer, "OH-") == pytest.approx(10**-6.63, rel=0.08)


def test_lanes_are_independent() -> None:
    mixtures = [
        {"Acetate-": 0.1, "H+": 0.1},
        {"Hg+2": 0.001, "HS-": 0.002, "Na+": 0.004, "H+": -0.002, "NO3-": 0.002},
        {"Na+": 1.0, "CO3-2": 1.0, "H+": 2.0, "Cl-": 1.0},
        {},
    ]
    together = solved(*mixtures)
    for lane, mixture in enumerate(mixtures):
        alone = solved(mixture)
        assert together.pH[lane] == pytest.approx(alone.pH[0], abs=1e-7)
        assert together.solids[lane].sum() == pytest.approx(alone.solids[0].sum(), rel=1e-7, abs=1e-15)
        assert together.gas[lane].sum() == pytest.approx(alone.gas[0].sum(), rel=1e-7, abs=1e-15)
    assert np.all(together.converged)
