"""What is dry or neat meets the whole of what it touches: no water is no reason to see nothing."""

from __future__ import annotations

import pytest

from tests.bench.reports import combined, only, select


def test_neat_acid_on_a_dry_cyanide_frees_all_of_it_along_the_pour() -> None:
    # 10 g of KCN, 65.12 g/mol, are 0.1536 mol; 50 mL of acetic acid, 1.049 g/mL and 60.05 g/mol, 0.87 mol: enough for all
    gas = only(combined("10 g of potassium cyanide", "50 mL of acetic acid"), "toxic-gas", species="HCN")
    assert gas.signal == "danger"
    assert gas.moment == "during"
    assert gas.amount_mol is not None
    assert gas.amount_mol[1] == pytest.approx(0.1536, rel=0.01)


@pytest.mark.parametrize(
    ("first", "second", "kind"),
    [
        ("20 g of potassium permanganate", "20 g of sulfur", "fire"),
        ("50 g of potassium chlorate", "20 g of sucrose", "explosive"),
        ("20 g of calcium hypochlorite", "20 g of ammonium chloride", "toxic-gas"),
    ],
)
def test_two_dry_solids_are_judged_as_they_lie(first: str, second: str, kind: str) -> None:
    report = combined(first, second)
    assert report.verdict == "refuse"
    assert any(one.signal == "danger" and one.moment != "contact" for one in select(report, kind))


def test_two_dry_salts_that_do_nothing_are_left_in_peace() -> None:
    assert combined("20 g of sodium chloride", "20 g of potassium sulfate").verdict == "no objection"


def test_a_salt_under_a_solvent_is_not_taken_for_dissolved() -> None:
    # nothing ionises in nitromethane: no pH, no heat of dissolving in a water that is not there
    report = combined("50 g of chromium trioxide", "50 mL of nitromethane")
    last = report.steps[-1]
    assert last.pH is None
    assert last.temperature_C == pytest.approx((25.0, 25.0))


def test_hydrogen_from_a_metal_in_a_dry_alcohol_all_leaves() -> None:
    # 10 g of sodium, 22.990 g/mol, are 0.4350 mol: half as much H2, 0.2175 mol; ethanol is in excess and no water holds the gas
    gas = only(combined("500 mL of ethanol", "10 g of sodium"), "flammable-gas", species="H2")
    assert gas.amount_mol is not None
    assert gas.amount_mol[1] == pytest.approx(0.2175, rel=0.01)


def test_a_liquid_acid_still_acts_on_a_dry_salt() -> None:
    assert (
        only(combined("20 g of sodium sulfite", "50 mL of 96 % sulfuric acid"), "toxic-gas", species="SO2").signal
        == "danger"
    )
