"""Davies' equation held at its maximum, neutral species and water."""

from __future__ import annotations

import numpy as np
import pytest

from carboy.chemistry import activity
from carboy.chemistry.equilibrium import solve
from carboy.vetting import laboratory
from tests.chemistry.mixtures import MOL_PER_KG

LN10 = np.log(10.0)


def test_davies_by_hand() -> None:
    """I = 0.1, z = 1: 0.509 (0.31623/1.31623 - 0.03) = 0.1070."""
    value, _ = activity.ln_gamma_unit_charge(np.array([0.1]), 0.509)
    assert value[0] / LN10 == pytest.approx(-0.1070, abs=5e-5)


def test_held_beyond_its_maximum_and_bounded() -> None:
    value, slope = activity.ln_gamma_unit_charge(np.array([0.3949793, 0.3949794, 1.0, 50.0]), 0.509)
    assert np.ptp(value) < 1e-9
    assert np.all(np.abs(slope[2:]) < 1e-12)
    assert np.exp(value[-1]) == pytest.approx(0.731, abs=0.001)
    assert abs(slope[0]) < 1e-5  # continuous slope


def test_debye_hueckel_slope() -> None:
    """0.509 at 25 degC, 0.534 at 50, 0.492 at 0 (Robinson and Stokes, from memory)."""
    assert activity.debye_hueckel_slope(25.0) == pytest.approx(0.509)
    assert activity.debye_hueckel_slope(50.0) == pytest.approx(0.534, abs=0.005)
    assert activity.debye_hueckel_slope(0.0) == pytest.approx(0.492, abs=0.005)


def test_water() -> None:
    value, _ = activity.ln_water_activity(np.array([0.0, 1.0, 20.0, 60.0, 1000.0]))
    assert np.exp(value[:3]) == pytest.approx([1.0, 0.983, 0.66])
    assert value[3] == value[4]
    assert np.exp(value[4]) > 0.2


@pytest.mark.parametrize("at", [1e-4, 0.01, 0.2, 0.39, 0.6, 3.0, 25.0, 70.0])
def test_slopes_are_the_derivatives(at: float) -> None:
    step = 1e-5 * at
    for function in (
        lambda i: activity.ln_gamma_unit_charge(i, 0.509),
        activity.ln_gamma_neutral,
        activity.ln_water_activity,
    ):
        low, high = function(np.array([at - step]))[0], function(np.array([at + step]))[0]
        assert function(np.array([at]))[1][0] == pytest.approx((high - low)[0] / (2.0 * step), rel=1e-4, abs=1e-7)


# Mean stoichiometric activity coefficients at 25 degC, molal (R. A. Robinson and R. H. Stokes, Electrolyte Solutions,
# 2nd ed. 1959, appendix 8.10, as in the CRC Handbook; H2SO4 there in another table; all from memory).
MOLALITIES = (0.1, 0.5, 1.0, 2.0, 3.0, 4.0, 6.0)
TABLES: dict[str, tuple[dict[str, float], tuple[float, ...]]] = {
    "NaCl": ({"Na+": 1, "Cl-": 1}, (0.778, 0.681, 0.657, 0.668, 0.714, 0.783, 0.986)),
    "HCl": ({"H+": 1, "Cl-": 1}, (0.796, 0.757, 0.809, 1.009, 1.316, 1.762, 3.22)),
    "HNO3": ({"H+": 1, "NO3-": 1}, (0.791, 0.720, 0.724, 0.793, 0.909, 1.049, 1.345)),
    "HClO4": ({"H+": 1, "ClO4-": 1}, (0.803, 0.769, 0.823, 1.055, 1.448, 2.08, 4.76)),
    "NaOH": ({"Na+": 1, "H+": -1}, (0.764, 0.688, 0.677, 0.707, 0.782, 0.901, 1.296)),
    "CaCl2": ({"Ca+2": 1, "Cl-": 2}, (0.518, 0.448, 0.500, 0.792, 1.483, 2.934, 11.11)),
    "H2SO4": ({"H+": 2, "SO4-2": 1}, (0.266, 0.156, 0.132, 0.128, 0.142, 0.172, 0.264)),
}
# What the model is allowed to be off, log units of the mean coefficient, by molality: the figures of its docstring.
ERRORS: dict[str, tuple[float, ...]] = {
    "NaCl": (0.01, 0.04, 0.05, 0.05, 0.02, 0.04, 0.14),
    "HCl": (0.01, 0.01, 0.04, 0.06, 0.07, 0.06, 0.04),
    "HNO3": (0.02, 0.02, 0.06, 0.09, 0.10, 0.11, 0.14),
    "HClO4": (0.02, 0.02, 0.04, 0.08, 0.08, 0.06, 0.04),
    "NaOH": (0.02, 0.04, 0.04, 0.03, 0.04, 0.10, 0.26),
    "CaCl2": (0.02, 0.08, 0.04, 0.18, 0.45, 0.75, 1.33),
    "H2SO4": (0.05, 0.04, 0.02, 0.03, 0.03, 0.02, 0.03),
}


@pytest.mark.parametrize("electrolyte", TABLES)
def test_mean_coefficients_against_tables(electrolyte: str) -> None:
    for molality, published, allowed in zip(MOLALITIES, TABLES[electrolyte][1], ERRORS[electrolyte], strict=True):
        ions = TABLES[electrolyte][0]
        water = MOL_PER_KG - min(ions.get("H+", 0), 0) * molality  # hydroxide is a water less a proton
        network = laboratory().stock.networks.network(set(ions) - {"H+"})
        totals = np.array([[ions.get(token, 0.0) * molality for token in network.components]])
        answer = solve(network, totals, np.array([water]), retain_gas=True)
        total, count, ideal = 0.0, 0.0, 0.0
        for token, n in ions.items():
            log_a = answer.log_activity[0, answer.network.component_index[token]]
            if n < 0:  # a proton taken away is a hydroxide ion: a(OH) = Kw a(water) / a(H)
                sum_m = answer.amounts[0].sum() / answer.water_kg[0]
                log_a = -13.997 + np.log10(1.0 - 0.017 * sum_m) - log_a
            total += abs(n) * log_a
            ideal += abs(n) * np.log10(abs(n) * molality)
            count += abs(n)
        error = (total - ideal) / count - np.log10(published)
        assert abs(error) <= allowed, (molality, error)
        assert answer.outside_activity_range[0] == (answer.ionic_strength[0] > 0.5)
