"""Heats of dilution against textbook values."""

from __future__ import annotations

import pytest

from carboy.knowledge.index import load_index


def _heat(electrolyte: str, water: float) -> float:
    """Heat (kJ/mol) set free on dilution from ``water`` mol per mol to infinite dilution; a printed point only."""
    (table,) = (item for item in load_index().dilution if item.electrolyte == electrolyte)
    return dict(table.points)[water]


# Felder and Rousseau, table B.11: heat of solution of 1 mol of liquid sulfuric acid in so many mol of water, kJ.
@pytest.mark.parametrize(("water", "heat"), [(1, 28.07), (2, 41.92), (10, 67.03), (100, 73.97)])
def test_sulfuric_acid_in_water(water: float, heat: float) -> None:
    assert _heat("sulfuric-acid", 0) - _heat("sulfuric-acid", water) == pytest.approx(heat, abs=0.1)


# Parker, NSRDS-NBS 2 (1965): heat of solution to infinite dilution, kJ/mol.
@pytest.mark.parametrize(
    ("electrolyte", "heat"),
    [("nitric-acid", 33.28), ("perchloric-acid", 88.76), ("sodium-hydroxide", 44.51), ("sulfuric-acid", 95.3)],
)
def test_pure_to_infinite_dilution(electrolyte: str, heat: float) -> None:
    assert _heat(electrolyte, 0) == pytest.approx(heat, abs=0.1)


def test_hydrochloric_acid_of_one_mole_of_water_fits_the_heat_of_solution_of_the_gas() -> None:
    # gas to infinite dilution 74.84 kJ/mol; gas in 1 mol of water about 29.2 (both Parker)
    assert 74.84 - _heat("hydrochloric-acid", 1) == pytest.approx(29.2, abs=0.1)


def test_strong_solutions_warm_and_dilute_ones_hardly() -> None:
    for table in load_index().dilution:
        points = sorted(table.points)
        assert points[0][1] > 0, table.electrolyte
        tail = 25.0 if table.electrolyte == "sulfuric-acid" else 3.0  # ionisation of hydrogensulfate is still to come
        assert all(abs(heat) < tail for water, heat in points if water > 25), table.electrolyte
