"""Davies' equation held at its maximum, neutral species and water."""

from __future__ import annotations

import numpy as np
import pytest

from carboy.chemistry import activity

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
