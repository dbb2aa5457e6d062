"""Limits of gases in air against numbers typed in here from their publications."""

from __future__ import annotations

import pytest

from carboy.knowledge.index import load_index

# NIOSH, Documentation for IDLH concentrations, 1994; nitrogen dioxide from the value profile of 2017.
IDLH_PPM = {
    "H2S(g)": 100,
    "HCN(g)": 50,
    "Cl2(g)": 10,
    "NH3(g)": 300,
    "SO2(g)": 100,
    "NO2(g)": 13,
    "CO(g)": 1200,
    "HF(g)": 30,
    "PH3(g)": 50,
    "AsH3(g)": 3,
    "COCl2(g)": 2,
    "CH2O(g)": 20,
}

# NIOSH Pocket Guide: ceiling or short-term limit, the lowest.
CEILING_PPM = {"H2S(g)": 10, "Cl2(g)": 0.5, "NH3(g)": 35, "HCN(g)": 4.7, "SO2(g)": 5, "HN3(g)": 0.1, "ClCN(g)": 0.3}

# IEC 60079-20-1 and NFPA 497, the wider range, vol %.
FLAMMABLE_PERCENT = {"H2(g)": (4.0, 77.0), "H2S(g)": (4.0, 45.5), "CH4(g)": (4.4, 17.0), "NH3(g)": (15.0, 33.6)}


@pytest.mark.parametrize(("token", "ppm"), IDLH_PPM.items())
def test_idlh(token: str, ppm: float) -> None:
    value = load_index().gases[token].idlh
    assert value is not None
    assert (value.magnitude, value.unit) == (ppm, "ppm")


@pytest.mark.parametrize(("token", "ppm"), CEILING_PPM.items())
def test_ceiling(token: str, ppm: float) -> None:
    value = load_index().gases[token].ceiling
    assert value is not None
    assert value.magnitude == ppm


@pytest.mark.parametrize(("token", "limits"), FLAMMABLE_PERCENT.items())
def test_flammable_range(token: str, limits: tuple[float, float]) -> None:
    gas = load_index().gases[token]
    assert gas.lower_flammable is not None
    assert gas.upper_flammable is not None
    assert (gas.lower_flammable.magnitude, gas.upper_flammable.magnitude) == limits


@pytest.mark.parametrize("token", ["NH2Cl(g)", "NHCl2(g)", "NCl3(g)", "ClCN(g)", "HN3(g)", "HI(g)", "NOCl(g)"])
def test_unpublished_idlh_stays_unknown_and_says_so(token: str) -> None:
    gas = load_index().gases[token]
    assert gas.idlh is None
    assert gas.note


def test_limits_are_in_order() -> None:
    """A ceiling above IDLH, an AEGL-2 above AEGL-3 or an empty flammable range would be a slip of the pen."""
    for token, gas in load_index().gases.items():
        for low, high in (
            (gas.ceiling, gas.idlh),
            (gas.aegl2, gas.aegl3),
            (gas.lower_flammable, gas.upper_flammable),
        ):
            if low is not None and high is not None:
                assert low.magnitude < high.magnitude, token


def test_every_toxic_or_flammable_class_rests_on_a_limit_or_a_note() -> None:
    index = load_index()
    for token, gas in index.gases.items():
        classes = {above for stated in index.species[token].classes for above in index.ancestors[stated]}
        if "toxic-gas" in classes:
            assert gas.idlh or gas.ceiling or gas.aegl2 or gas.aegl3 or gas.note, token
        if "flammable-gas" in classes:
            assert gas.lower_flammable or gas.note, token


def test_density_against_air_follows_from_the_formula() -> None:
    weights = {"H": 1.008, "C": 12.011, "N": 14.007, "O": 15.999, "S": 32.06, "Cl": 35.45, "P": 30.974, "F": 18.998}
    index = load_index()
    compared = 0
    for token, gas in index.gases.items():
        atoms = index.species[token].atoms
        if gas.density_air is None or not set(atoms) <= set(weights):
            continue
        expected = sum(weights[symbol] * count for symbol, count in atoms.items()) / 28.96
        assert gas.density_air.magnitude == pytest.approx(expected, abs=0.02), token
        compared += 1
    assert compared > 60
