"""Mixtures made up from labels, poured together, against an outside code (PHREEQC) with the constants of our own graph.

Asked for: pH within 0.02, dissolved totals above 1e-12 mol within 1 %, solids within 1 %, bubbles of open vessels within 1 %. The
pours are walked with an empty rule book, so that only the fast equilibria speak. Both codes use the Davies equation; ours is held at
its maximum from I = 0.395 mol/kg on, where the equation by itself would turn back, so mixtures stronger than that are compared
more coarsely and each says so.
"""

from __future__ import annotations

from functools import cache

import pytest

from carboy.chemistry.mixture import Mixture
from carboy.vetting import laboratory
from tests.chemistry.reference_database import Outcome, Reference
from tests.reasoning.small_book import walk

AVAILABLE_ATM = 1.0 - 0.031271  # an atmosphere less the vapour of water at 25 degC
LEAST_MOL = 1e-12
PH, SHARE = 0.02, 0.01

MIXTURES: dict[str, tuple[str, ...]] = {
    # acids, bases, buffers
    "hydrochloric acid and lye": ("500 mL of 0.1 M hydrochloric acid", "490 mL of 0.1 M sodium hydroxide"),
    "acetate buffer": ("500 mL of 0.1 M acetic acid", "250 mL of 0.1 M sodium hydroxide"),
    "citric acid and soda": ("500 mL of 0.05 M citric acid", "200 mL of 0.2 M sodium carbonate"),
    "phosphoric acid and lye": ("500 mL of 0.1 M phosphoric acid", "500 mL of 0.15 M sodium hydroxide"),
    "borax and acid": ("500 mL of 0.02 M borax", "100 mL of 0.1 M hydrochloric acid"),
    "sulfuric acid and ammonia": ("500 mL of 0.05 M sulfuric acid", "500 mL of 0.08 M ammonia"),
    "phthalate and lye": ("500 mL of 0.05 M potassium hydrogen phthalate", "200 mL of 0.05 M sodium hydroxide"),
    "boric acid and ammonia": ("500 mL of 0.1 M boric acid", "500 mL of 0.05 M ammonia"),
    # gases of open vessels
    "bicarbonate and acid": ("500 mL of 0.2 M sodium bicarbonate", "500 mL of 0.15 M hydrochloric acid"),
    "carbonate and acid that bubble": ("500 mL of 0.3 M sodium carbonate", "500 mL of 0.5 M hydrochloric acid"),
    "sulfide and acid": ("1 L of 0.05 M sodium sulfide", "1 L of 0.15 M hydrochloric acid"),
    "sulfide and acid that bubble": ("500 mL of 0.3 M sodium sulfide", "500 mL of 0.7 M hydrochloric acid"),
    "cyanide and little acid": ("1 L of 0.05 M potassium cyanide", "1 L of 0.01 M nitric acid"),
    "sulfite and acid": ("500 mL of 0.1 M sodium sulfite", "500 mL of 0.25 M hydrochloric acid"),
    "ammonium and lye": ("500 mL of 0.2 M ammonium chloride", "500 mL of 0.3 M sodium hydroxide"),
    "azide and acid": ("500 mL of 0.05 M sodium azide", "500 mL of 0.06 M hydrochloric acid"),
    # metal sulfides
    "copper and sulfide": ("1 L of 0.01 M copper sulfate", "1 L of 0.011 M sodium sulfide"),
    "copper and too little sulfide": ("1 L of 0.01 M copper sulfate", "1 L of 0.004 M sodium sulfide"),
    "lead and sulfide": ("1 L of 0.005 M lead(II) nitrate", "1 L of 0.006 M sodium sulfide"),
    "cadmium and sulfide": ("1 L of 0.005 M cadmium chloride", "1 L of 0.01 M sodium sulfide"),
    "zinc and sulfide": ("1 L of 0.01 M zinc sulfate", "1 L of 0.01 M sodium sulfide"),
    "nickel and sulfide": ("1 L of 0.01 M nickel sulfate", "1 L of 0.012 M sodium sulfide"),
    "silver and sulfide": ("1 L of 0.01 M silver nitrate", "1 L of 0.006 M sodium sulfide"),
    # hydroxides, to and beyond the end point
    "copper and lye": ("1 L of 0.01 M copper sulfate", "1 L of 0.02 M sodium hydroxide"),
    "zinc and much lye": ("1 L of 0.01 M zinc sulfate", "1 L of 0.3 M sodium hydroxide"),
    "aluminium and lye": ("1 L of 0.01 M aluminium sulfate", "1 L of 0.06 M sodium hydroxide"),
    "aluminium and much lye": ("1 L of 0.01 M aluminium sulfate", "1 L of 0.2 M sodium hydroxide"),
    "chromium(III) and lye": ("1 L of 0.01 M chromium(III) chloride", "1 L of 0.03 M sodium hydroxide"),
    "iron(III) and lye": ("1 L of 0.01 M iron(III) chloride", "1 L of 0.025 M sodium hydroxide"),
    "magnesium and lye": ("1 L of 0.02 M magnesium sulfate", "1 L of 0.05 M sodium hydroxide"),
    "lead and lye": ("1 L of 0.01 M lead(II) nitrate", "1 L of 0.03 M sodium hydroxide"),
    # carbonates
    "calcium and soda": ("1 L of 0.02 M calcium chloride", "1 L of 0.02 M sodium carbonate"),
    "lead and soda": ("1 L of 0.01 M lead(II) nitrate", "1 L of 0.012 M sodium carbonate"),
    "barium, sulfate and carbonate": (
        "1 L of 0.02 M barium chloride",
        "500 mL of 0.01 M sodium sulfate",
        "500 mL of 0.03 M sodium carbonate",
    ),
    "cadmium and bicarbonate": ("1 L of 0.005 M cadmium sulfate", "1 L of 0.05 M sodium bicarbonate"),
    # chloride complexes
    "mercury and chloride": ("1 L of 0.01 M mercury(II) nitrate", "1 L of 0.2 M sodium chloride"),
    "silver and much chloride": ("100 mL of 0.01 M silver nitrate", "1 L of 0.3 M sodium chloride"),
    "lead and chloride": ("500 mL of 0.05 M lead(II) nitrate", "500 mL of 0.2 M sodium chloride"),
    "cadmium and hydrochloric acid": ("1 L of 0.01 M cadmium chloride", "1 L of 0.3 M hydrochloric acid"),
    # cyanide
    "copper(I) and cyanide": ("1 L of 0.005 M copper(I) cyanide", "1 L of 0.02 M potassium cyanide"),
    "silver and cyanide": ("1 L of 0.01 M silver nitrate", "1 L of 0.025 M potassium cyanide"),
    "zinc and cyanide": ("1 L of 0.01 M zinc sulfate", "1 L of 0.05 M potassium cyanide"),
    "nickel and cyanide": ("1 L of 0.005 M nickel sulfate", "1 L of 0.03 M potassium cyanide"),
    "mercury and cyanide": ("1 L of 0.005 M mercury(II) nitrate", "1 L of 0.015 M potassium cyanide"),
    # ammonia
    "copper and ammonia": ("1 L of 0.01 M copper sulfate", "1 L of 0.2 M ammonia"),
    "silver chloride and ammonia": (
        "1 L of 0.01 M silver nitrate",
        "1 L of 0.012 M sodium chloride",
        "1 L of 0.6 M ammonia",
    ),
    "zinc and ammonia": ("1 L of 0.01 M zinc chloride", "1 L of 0.2 M ammonia"),
    "nickel and ammonia": ("1 L of 0.01 M nickel sulfate", "1 L of 0.3 M ammonia"),
    # EDTA
    "copper and EDTA": ("1 L of 0.01 M copper sulfate", "1 L of 0.012 M disodium EDTA"),
    "calcium, EDTA and soda": (
        "1 L of 0.01 M calcium chloride",
        "1 L of 0.008 M disodium EDTA",
        "1 L of 0.05 M sodium carbonate",
    ),
    "lead, EDTA and sulfide": (
        "1 L of 0.005 M lead(II) nitrate",
        "1 L of 0.006 M disodium EDTA",
        "1 L of 0.01 M sodium sulfide",
    ),
    # phosphate
    "calcium and phosphate": ("1 L of 0.01 M calcium chloride", "1 L of 0.01 M disodium phosphate"),
    "zinc and phosphate": ("1 L of 0.01 M zinc sulfate", "1 L of 0.02 M trisodium phosphate"),
    "magnesium, ammonium and phosphate": (
        "1 L of 0.01 M magnesium sulfate",
        "1 L of 0.02 M ammonium chloride",
        "1 L of 0.01 M disodium phosphate",
    ),
    # mercury, bicarbonate and sulfide
    "mercury in bicarbonate": ("1 L of (0.01 M mercury(II) nitrate + 0.2 M sodium bicarbonate)", "100 mL of water"),
    "mercury, bicarbonate, sulfide": (
        "1 L of (0.01 M mercury(II) nitrate + 0.2 M sodium bicarbonate)",
        "100 mL of 0.11 M sodium sulfide",
    ),
    "mercury, bicarbonate, much sulfide": (
        "1 L of (0.01 M mercury(II) nitrate + 0.1 M sodium bicarbonate)",
        "500 mL of 0.2 M sodium sulfide",
    ),
    "mercury, chloride, a trace of sulfide": (
        "1 L of (0.001 M mercury(II) chloride + 0.1 M sodium chloride)",
        "100 mL of 0.005 M sodium sulfide",
    ),
    "mercury, iodide in excess": ("1 L of 0.005 M mercury(II) nitrate", "1 L of 0.05 M potassium iodide"),
}

# Two mixtures: I = 0.52 and 1.9 mol/kg, past the maximum of Davies, where ours
# is held and the other code's turns back: for a doubly charged ion 0.008 and 0.5 decades apart.
STRONG: dict[str, tuple[tuple[str, ...], float, float]] = {
    "mercury, bicarbonate, sulfide": (
        ("1 L of (0.01 M mercury(II) nitrate + 0.5 M sodium bicarbonate)", "100 mL of 0.11 M sodium sulfide"),
        0.02,
        0.04,
    ),
    "mercury, bicarbonate, great excess of sulfide": (
        ("1 L of (0.01 M mercury(II) nitrate + 0.5 M sodium bicarbonate)", "100 mL of 5 M sodium sulfide"),
        0.4,
        0.7,
    ),
}


@cache
def reference() -> Reference:
    """PHREEQC with every equilibrium of the graph; solids that do not come down while one waits are left out in both."""
    index = laboratory().index
    rows = [
        row
        for row in index.equilibria
        if not (row.kind == "solid" and index.species[row.product].forms == "slow")
        and not (row.kind == "gas" and set(row.coefficients) <= {"H2O"})
    ]
    tokens = {token for row in rows for token in row.coefficients}
    every = [*MIXTURES.values(), *(portions for portions, _, _ in STRONG.values())]
    tokens |= {token for portions in every for token in mixed(portions).amounts}  # ions that form nothing carry charge
    return Reference(rows, {token: index.species[token].charge for token in sorted(tokens - {"H+", "H2O"})})


@cache
def mixed(portions: tuple[str, ...]) -> Mixture:
    done = walk((), *portions)
    # what bubbles leaves between two pours; the mixtures here have gas at their last pour only
    return done.steps[-1].after


@cache
def outside(portions: tuple[str, ...]) -> Outcome:
    mixture = mixed(portions)
    totals = {token: float(amount[0]) for token, amount in mixture.amounts.items() if token != "H2O"}
    gas = f"-fixed_pressure\n-pressure {AVAILABLE_ATM!r}\n-volume 1e-3\n-temperature 25" if mixture.gases else ""
    return reference().run(totals, gas=gas, water_mol=float(mixture.total("H2O")[0]))


def pairs(portions: tuple[str, ...]) -> dict[str, tuple[float, float]]:
    """Component -> mol dissolved, ours and theirs."""
    mixture, theirs = mixed(portions), outside(portions)
    return {
        token: (float(mixture.dissolved(token)[0]), amount)
        for token, amount in theirs.dissolved.items()
        if max(float(mixture.dissolved(token)[0]), amount) > LEAST_MOL
    }


@pytest.mark.parametrize("name", MIXTURES)
def test_pH_is_that_of_the_outside_code(name: str) -> None:
    mixture = mixed(MIXTURES[name])
    assert mixture.converged.all()
    assert mixture.solved is not None
    assert mixture.solved.ionic_strength[0] < 0.395, "too strong to compare closely"
    assert mixture.pH[0] == pytest.approx(outside(MIXTURES[name]).pH, abs=PH)


@pytest.mark.parametrize("name", MIXTURES)
def test_dissolved_totals_are_those_of_the_outside_code(name: str) -> None:
    for token, (ours, theirs) in pairs(MIXTURES[name]).items():
        assert ours == pytest.approx(theirs, rel=SHARE), token


@pytest.mark.parametrize("name", MIXTURES)
def test_solids_and_bubbles_are_those_of_the_outside_code(name: str) -> None:
    mixture, theirs = mixed(MIXTURES[name]), outside(MIXTURES[name])
    for token in {*mixture.solids, *(token for token, amount in theirs.solids.items() if amount > 1e-8)}:
        ours = float(mixture.solids[token][0]) if token in mixture.solids else 0.0
        assert ours == pytest.approx(theirs.solids.get(token, 0.0), rel=SHARE, abs=1e-7), token
    for token, amount in mixture.gases.items():
        assert float(amount[0]) == pytest.approx(theirs.gas.get(token, 0.0), rel=SHARE, abs=2e-5), token


@pytest.mark.parametrize("name", STRONG)
def test_strong_mixtures_agree_as_far_as_the_activity_models_do(name: str) -> None:
    portions, pH, share = STRONG[name]
    assert mixed(portions).pH[0] == pytest.approx(outside(portions).pH, abs=pH)
    for token, (ours, theirs) in pairs(portions).items():
        assert ours == pytest.approx(theirs, rel=share), token


def test_there_are_enough_mixtures() -> None:
    assert len(MIXTURES) >= 40
    assert len(set(MIXTURES.values())) == len(MIXTURES)
