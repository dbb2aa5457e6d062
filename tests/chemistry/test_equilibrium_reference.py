"""The same problems by an independent code with the same constants and activity model (below I = 0.39, where both are
Davies).

Asked for: pH within 0.005, solids within 1e-6 mol or 3e-3 of themselves, dissolved within 0.01 decades down to 1e-12
mol, gas within 1e-5 mol.
What is left between the two comes from A (0.509 here, from the permittivity there).
"""

from __future__ import annotations

import numpy as np
import pytest

from tests.chemistry.aqueous_records import COMPONENTS, EQUILIBRIA, SLOW
from tests.chemistry.mixtures import dissolved, neutral, solved
from tests.chemistry.reference_database import Reference

PROBLEMS: dict[str, dict[str, float]] = {
    "acetate buffer": {"Acetate-": 0.1, "Na+": 0.05, "H+": 0.05},
    "phosphate buffer": {"PO4-3": 0.05, "Na+": 0.05, "K+": 0.025, "H+": 0.075},
    "ammonia": {"NH4+": 0.1, "H+": -0.1},
    "borax": {"H3BO3": 0.04, "H+": -0.02},
    "phthalate": {"Phthalate-2": 0.05, "H+": 0.05},
    "hydrochloric acid": {"H+": 0.2},
    "sodium hydroxide": {"H+": -0.2},
    "soda": {"CO3-2": 0.05},
    "bicarbonate and some acid": {"CO3-2": 0.1, "H+": 0.15},
    "bicarbonate and much acid": {"CO3-2": 0.2, "H+": 0.6},
    "cyanide": {"CN-": 0.05},
    "cyanide and acid": {"CN-": 0.05, "H+": 0.1},
    "sulfide and acid": {"HS-": 0.2, "H+": 0.3},
    "mercury with twice its sulfide": {"Hg+2": 0.001, "HS-": 0.002},
    "mercury in chloride": {"Hg+2": 0.01, "Cl-": 0.2},
    "mercury, sulfide and bicarbonate": {"Hg+2": 0.001, "HS-": 0.005, "CO3-2": 0.1, "H+": 0.1},
    "mercury and cyanide": {"Hg+2": 0.005, "CN-": 0.03},
    "copper and hydroxide": {"Cu+2": 0.01, "SO4-2": 0.01, "H+": -0.02},
    "copper and too little hydroxide": {"Cu+2": 0.02, "SO4-2": 0.02, "H+": -0.01},
    "copper and ammonia": {"Cu+2": 0.005, "SO4-2": 0.005, "NH4+": 0.1, "H+": -0.08},
    "copper and EDTA": {"Cu+2": 0.01, "Edta-4": 0.012, "H+": 0.01},
    "zinc in much hydroxide": {"Zn+2": 0.01, "H+": -0.2},
    "zinc at its least": {"Zn+2": 0.01, "H+": -0.0202},
    "aluminium and less than three": {"Al+3": 0.01, "H+": -0.025},
    "aluminium and four": {"Al+3": 0.01, "H+": -0.045},
    "iron alum in water": {"Fe+3": 0.01, "SO4-2": 0.02, "K+": 0.01},
    "iron and phosphate": {"Fe+3": 0.01, "PO4-3": 0.015, "H+": 0.02},
    "lead and sulfate": {"Pb+2": 0.01, "SO4-2": 0.03},
    "lead and carbonate": {"Pb+2": 0.01, "CO3-2": 0.03},
    "lead in hydroxide": {"Pb+2": 0.01, "H+": -0.1},
    "silver and chloride": {"Ag+": 0.01, "Cl-": 0.015, "NO3-": 0.01},
    "silver and ammonia": {"Ag+": 0.01, "NH4+": 0.1, "H+": -0.1, "NO3-": 0.01},
    "silver and cyanide": {"Ag+": 0.01, "CN-": 0.05},
    "calcium, sulfate, carbonate": {"Ca+2": 0.05, "SO4-2": 0.04, "CO3-2": 0.02},
    "slaked lime": {"Ca+2": 0.05, "H+": -0.1},
    "nickel and ammonia": {"Ni+2": 0.005, "NH4+": 0.05, "H+": -0.05},
    "cadmium and cyanide": {"Cd+2": 0.005, "CN-": 0.04},
    "seven metals and sulfide": {
        "Hg+2": 1e-3, "Cu+2": 2e-3, "Ag+": 1e-3, "Zn+2": 2e-3, "Pb+2": 1e-3, "Cd+2": 1e-3, "Ni+2": 1e-3, "HS-": 0.02,
    },
    "seven metals and too little sulfide": {
        "Hg+2": 1e-3, "Cu+2": 2e-3, "Ag+": 1e-3, "Zn+2": 2e-3, "Pb+2": 1e-3, "Cd+2": 1e-3, "Ni+2": 1e-3, "HS-": 0.004,
        "NO3-": 0.02,
    },
    "ten-component waste made alkaline": {
        "Zn+2": 5e-3, "Cu+2": 5e-3, "Fe+3": 5e-3, "Ni+2": 5e-3, "Ca+2": 5e-3, "Pb+2": 1e-3, "SO4-2": 0.02,
        "CO3-2": 2e-3, "H+": -0.05,
    },
}  # fmt: skip


@pytest.fixture(scope="module")
def reference() -> Reference:
    return Reference([row for row in EQUILIBRIA if row.product not in SLOW], COMPONENTS)


@pytest.mark.parametrize("name", PROBLEMS)
def test_problem(name: str, reference: Reference) -> None:
    mixture = neutral(PROBLEMS[name])
    answer = solved(mixture)
    assert answer.converged[0]
    assert answer.ionic_strength[0] < 0.39
    bubbles = f"-fixed_pressure\n-pressure {1.0 - 0.031271!r}\n-volume 1e-3\n-temperature 25"
    _compare(answer, mixture, reference.run(mixture, gas=bubbles if answer.network.gases else ""))


@pytest.mark.parametrize("name", ["bicarbonate and much acid", "sulfide and acid", "ammonia", "cyanide and acid"])
def test_sealed_problem(name: str, reference: Reference) -> None:
    mixture = neutral(PROBLEMS[name])
    answer = solved(mixture, headspace_L=1.5)
    _compare(answer, mixture, reference.run(mixture, gas="-fixed_volume\n-volume 1.5\n-temperature 25"))


def _compare(answer, mixture, expected) -> None:  # type: ignore[no-untyped-def]
    network = answer.network
    assert answer.pH[0] == pytest.approx(expected.pH, abs=0.005)
    assert answer.water_kg[0] == pytest.approx(expected.water_kg, rel=1e-5)
    for token in mixture:
        ours = dissolved(answer, token) if token != "H+" else 0.0
        if ours > 1e-12:
            assert np.log10(ours) == pytest.approx(np.log10(expected.dissolved[token]), abs=0.01), token
    for number, name in enumerate(network.solids):
        assert answer.solids[0, number] == pytest.approx(expected.solids[name], abs=1e-6, rel=3e-3), name
    for number, name in enumerate(network.gases):
        assert answer.gas[0, number] == pytest.approx(expected.gas.get(name, 0.0), abs=1e-5, rel=1e-3), name
