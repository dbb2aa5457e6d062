"""Gas law and vapour pressure."""

from __future__ import annotations

import pytest

from carboy.chemistry import gases


def test_a_mole_at_25_degrees() -> None:
    assert gases.gas_volume(1.0) == pytest.approx(24.465, abs=0.005)
    assert gases.gas_amount(1.0, 24.465) == pytest.approx(1.0, rel=1e-4)
    assert gases.gas_pressure(1.0, 24.465) == pytest.approx(1.0, rel=1e-4)


# mmHg, CRC Handbook (from memory).
@pytest.mark.parametrize(("celsius", "mm_mercury"), [(0.0, 4.58), (25.0, 23.76), (50.0, 92.5), (100.0, 760.0)])
def test_vapour_pressure_of_water(celsius: float, mm_mercury: float) -> None:
    assert gases.water_vapour_pressure(celsius) * 760.0 == pytest.approx(mm_mercury, rel=0.003)


def test_the_value_that_other_tests_take() -> None:
    assert gases.water_vapour_pressure(25.0) == pytest.approx(0.031271, abs=1e-6)


def test_a_closed_bottle_warmed() -> None:
    """Nothing formed and nothing warmed: no gauge pressure.

    From 25 to 50 degC: the air gains 8.4 %, the vapour 0.09 atm.
    """
    assert gases.sealed_gauge_kPa(0.0) == pytest.approx(0.0, abs=1e-9)
    air = (1.0 - 0.03127) * 25.0 / 298.15
    vapour = 92.5 / 760.0 - 0.03127
    assert gases.sealed_gauge_kPa(0.0, 50.0) == pytest.approx((air + vapour) * 101.325, rel=0.01)
    assert gases.sealed_gauge_kPa(1.0) == pytest.approx(101.325)


def test_parts_per_million() -> None:
    assert gases.parts_per_million(1e-4) == pytest.approx(100.0)
    assert gases.parts_per_million(5.0) == 1e6
