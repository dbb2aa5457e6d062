"""The gas law and the vapour pressure of water."""

from __future__ import annotations

from math import exp

from carboy.chemistry.network import ZERO_CELSIUS

GAS_CONSTANT = 0.082057  # L atm/mol/K, CODATA 2018 rounded
KPA_PER_ATM = 101.325


def water_vapour_pressure(temperature_C: float) -> float:
    """Vapour pressure of pure water, atm, for 0 to 100 degC (A. L. Buck 1981, coefficients of 1996; from memory)."""
    t = temperature_C
    return 0.61121 * exp((18.678 - t / 234.5) * (t / (257.14 + t))) / KPA_PER_ATM


def gas_amount(pressure_atm: float, volume_L: float, temperature_C: float = 25.0) -> float:
    """Moles of an ideal gas at a partial pressure (atm) in a volume (L)."""
    return pressure_atm * volume_L / (GAS_CONSTANT * (temperature_C + ZERO_CELSIUS))


def gas_volume(amount_mol: float, temperature_C: float = 25.0, pressure_atm: float = 1.0) -> float:
    """Volume (L) of an ideal gas."""
    return amount_mol * GAS_CONSTANT * (temperature_C + ZERO_CELSIUS) / pressure_atm


def gas_pressure(amount_mol: float, volume_L: float, temperature_C: float = 25.0) -> float:
    """Pressure (atm) of an ideal gas in a closed volume (L)."""
    return amount_mol * GAS_CONSTANT * (temperature_C + ZERO_CELSIUS) / volume_L


def sealed_gauge_kPa(
    partial_atm: float, temperature_C: float = 25.0, *, closed_at_C: float = 25.0, closed_at_atm: float = 1.0
) -> float:
    """Gauge pressure (kPa against ``closed_at_atm``) in a bottle that was closed over moist air.

    ``partial_atm`` is the sum of the partial pressures of the gases formed; the air shut in and the water vapour are
    added here.
    """
    air = max(closed_at_atm - water_vapour_pressure(closed_at_C), 0.0)
    air *= (temperature_C + ZERO_CELSIUS) / (closed_at_C + ZERO_CELSIUS)
    return (partial_atm + air + water_vapour_pressure(temperature_C) - closed_at_atm) * KPA_PER_ATM


def parts_per_million(partial_atm: float, ambient_atm: float = 1.0) -> float:
    """Parts per million by volume of a gas of a partial pressure (atm) over a liquid, not above all of the air."""
    return 1e6 * min(partial_atm / ambient_atm, 1.0)
