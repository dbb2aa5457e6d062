"""What goes on in a vessel that is closed, or left: how much in a night, and whether it shows as what happens in storage.

Times and shares: hydrogen peroxide with copper or iron goes within hours (Greenwood and Earnshaw); strong hypochlorite loses about a hundredth
a day at 25 degC, most of it to chlorate and a little to oxygen (White's Handbook of Chlorination; from memory); nitric acid with organics
gives gas in hours to days (Bretherick); sulfide in air goes by half in one to two days near pH 8 (Chen and Morris 1972; from memory).
Pressures: n RT / V with RT 2.479 kJ/mol at 25 degC.
"""

from __future__ import annotations

from functools import lru_cache
from typing import Any

import pytest

from carboy.model.report import Finding, Report
from carboy.text.cases import case_from_mapping
from carboy.vetting import laboratory
from tests.bench.reports import outline, select

OVERNIGHT = ("seal", "wait 16 h")


@lru_cache(maxsize=64)
def left(*portions: str, then: tuple[str, ...] = OVERNIGHT, litres: str = "1 L", material: str = "HDPE") -> Report:
    """Portions poured into an open vessel, which is then sealed, opened or left for a time."""
    steps: list[dict[str, Any]] = [{"add": portion} for portion in portions]
    for one in then:
        verb, _, time = one.partition(" ")
        steps.append({verb: time or "tank"})
    lab = laboratory()
    plan = {"title": "A test", "vessels": {"tank": {"volume": litres, "material": material}}, "steps": steps}
    return lab.vet(case_from_mapping(plan, lab.names))


def stored(report: Report, kind: str) -> list[Finding]:
    """Findings of a kind that come up in storage and are more than a note."""
    return [one for one in select(report, kind) if one.moment == "storage" and one.signal != "note"]


def gauge(report: Report, step: int) -> tuple[float, float]:
    pair = report.steps[step - 1].gauge_kPa
    assert pair is not None
    return pair


# --- peroxide ----------------------------------------------------------------------------------------------------------

PEROXIDE = "200 mL of 3 % hydrogen peroxide"  # 1.01 kg/L: 0.178 mol, 0.089 mol of oxygen at the most


def test_peroxide_with_copper_capped_overnight() -> None:
    # when it is closed half to all of it is left, of which 0.3 or more goes: at least 0.3 x 0.5 x 0.089 = 13 mmol of oxygen, in
    # 0.79 L 42 kPa; at most all of it
    report = left(PEROXIDE, "10 mL of 0.1 M copper(II) sulfate")
    (pressure,) = stored(report, "pressure")
    assert pressure.signal == "danger"
    assert pressure.species == ["O2"]
    assert pressure.step == 3
    low, high = gauge(report, 3)
    assert 40 < low <= high < 0.089 * 2479 / 0.79


def test_the_same_left_open_does_not_press() -> None:
    report = left(PEROXIDE, "10 mL of 0.1 M copper(II) sulfate", then=("wait 16 h",))
    assert not select(report, "pressure"), outline(report)


def test_worked_off_open_then_closed_is_far_less() -> None:
    # what goes on for days has gone by then; at the least conversion something is left
    capped = gauge(left(PEROXIDE, "10 mL of 0.1 M copper(II) sulfate"), 3)
    worked_off = gauge(left(PEROXIDE, "10 mL of 0.1 M copper(II) sulfate", then=("wait 48 h", "seal")), 4)
    assert worked_off[1] < capped[1]


def test_peroxide_with_a_quiet_salt_keeps_longer() -> None:
    # zinc does not break peroxide down; in company up to a third may go in days all the same
    report = left(PEROXIDE, "10 mL of 0.1 M zinc sulfate")
    with_copper = gauge(left(PEROXIDE, "10 mL of 0.1 M copper(II) sulfate"), 3)
    assert gauge(report, 3)[1] < with_copper[1]


def test_alkaline_peroxide_capped_overnight() -> None:
    # 0.89 mol of peroxide: a tenth to all of 0.44 mol of oxygen in 0.7 L: 157 kPa and more
    report = left("100 mL of 30 % hydrogen peroxide", "200 mL of 1 M sodium hydroxide")
    (pressure,) = stored(report, "pressure")
    assert pressure.signal == "danger"
    assert gauge(report, 3)[1] > 150


# --- nitric acid and organics -------------------------------------------------------------------------------------------


@pytest.mark.parametrize("organic", ["50 mL of methanol", "1 mL of methanol", "5 mL of acetone"])
def test_nitric_acid_with_organics_capped_overnight(organic: str) -> None:
    report = left("500 mL of 3 M nitric acid", organic, material="glass")
    assert stored(report, "pressure"), outline(report)
    assert report.verdict in ("conditional", "refuse")
    assert any("vented cap" in words for one in stored(report, "pressure") for words in one.controls)


def test_strong_nitric_acid_with_a_trace_of_ethanol() -> None:
    # 1 mL of ethanol in half a litre, 17.1 mmol, gives up to four times as much nitrogen dioxide
    report = left("500 mL of concentrated nitric acid", "1 mL of ethanol", material="glass")
    gas = [one for one in select(report, "toxic-gas", "NO2") if one.signal == "danger"]
    assert gas, outline(report)
    assert gas[0].amount_mol is not None
    assert gas[0].amount_mol[1] == pytest.approx(4 * 0.0171, rel=0.05)
    assert stored(report, "pressure"), outline(report)


@pytest.mark.parametrize("beside", ["50 mL of water", "50 g of sodium nitrate"])
def test_nitric_acid_without_organics_may_be_closed(beside: str) -> None:
    report = left("500 mL of 3 M nitric acid", beside, material="glass")
    assert not stored(report, "pressure"), outline(report)
    assert not stored(report, "explosive"), outline(report)


# --- hypochlorite -------------------------------------------------------------------------------------------------------


def test_strong_hypochlorite_under_a_tight_cap() -> None:
    # 12 %, 1.85 mol in a litre: a thousandth to a fiftieth to oxygen, 0.93 to 18.5 mmol in a litre of headspace: 2.3 to 46 kPa
    report = left("1 L of 12 % sodium hypochlorite", litres="2 L", then=("seal",))
    low, high = gauge(report, 2)
    assert low == pytest.approx(2.3, rel=0.1)
    assert high == pytest.approx(46, rel=0.1)
    (pressure,) = stored(report, "pressure")
    assert (pressure.signal, pressure.species, pressure.holds) == ("warning", ["O2"], "in part")


def test_strong_hypochlorite_turns_to_chlorate() -> None:
    # 3 ClO- give a ClO3-: of 1.87 mol in days 0.005 to 0.07, 3.1 to 44 mmol of chlorate
    report = left("1 L of 12 % sodium hypochlorite", then=("wait 72 h",), litres="2 L")
    low, high = report.steps[1].dissolved_mol["Cl(V)"]
    assert low == pytest.approx(1.87 * 0.005 / 3, rel=0.1)
    assert high == pytest.approx(1.87 * 0.07 / 3, rel=0.1)
    overnight = left("1 L of 12 % sodium hypochlorite", then=("wait 4 h",), litres="2 L")
    assert overnight.steps[1].dissolved_mol.get("Cl(V)", (0.0, 0.0))[1] < 1e-6  # it takes days


def test_household_bleach_may_be_closed() -> None:
    report = left("1 L of household bleach", "50 mL of water", litres="2 L")
    assert not stored(report, "pressure"), outline(report)
    assert report.verdict == "no objection", outline(report)


def test_bleach_with_nickel_may_not() -> None:
    report = left("1 L of household bleach", "1 g of nickel(II) sulfate", litres="2 L")
    pressure = stored(report, "pressure")
    assert [one.species for one in pressure] == [["O2"]], outline(report)


# --- sulfide --------------------------------------------------------------------------------------------------------------

SULFIDE = ("500 mL of 0.05 M sodium sulfide", "50 g of sodium bicarbonate")


def test_sulfide_open_to_air_loses_itself() -> None:
    report = left(*SULFIDE, then=("wait 48 h",), litres="2 L", material="glass")
    lost = [one for one in select(report, "toxic-product") if one.rule == "sulfide-left-in-air"]
    assert [(one.signal, one.moment) for one in lost] == [("note", "storage")], outline(report)
    assert "one to two days" in lost[0].says


def test_sulfide_closed_keeps_and_gathers_gas() -> None:
    # 25 mmol at pH 8: some 3 % of H2S in water, and what passes into 1.5 L over it
    report = left(*SULFIDE, litres="2 L", material="glass")
    assert not [one for one in report.findings if one.rule == "sulfide-left-in-air"]
    assert report.steps[2].gas_mol["H2S"][1] > 1e-4
    assert any(one.moment == "storage" for one in select(report, "toxic-gas", "H2S")), outline(report)


def test_sulfide_in_strong_base_is_left_in_peace() -> None:
    report = left(
        "500 mL of 0.05 M sodium sulfide", "100 mL of 1 M sodium hydroxide", then=("wait 48 h",), litres="2 L"
    )
    assert not select(report, "toxic-product"), outline(report)


# --- quiet ----------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "portions",
    [
        ("500 mL of 1 M sodium chloride", "100 mL of 1 M potassium nitrate"),
        ("500 mL of 0.1 M copper(II) sulfate", "100 mL of 0.1 M zinc sulfate"),
        ("500 mL of 1 M hydrochloric acid", "100 mL of 1 M sodium chloride"),
        ("500 mL of 1 M sodium hydroxide", "100 mL of 1 M sodium acetate"),
        ("500 mL of methanol", "200 mL of water"),
        ("500 mL of 0.1 M disodium hydrogen phosphate", "100 mL of 0.05 M calcium chloride"),
    ],
)
def test_plain_solutions_may_be_capped_and_left(portions: tuple[str, str]) -> None:
    report = left(*portions)
    assert not [one for one in report.findings if one.moment == "storage"], outline(report)
    assert gauge(report, 3)[1] < 5
    assert gauge(report, 4)[1] < 5
    assert report.verdict == "no objection", outline(report)


def test_a_share_of_conversion_is_not_taken_twice() -> None:
    # a wait of hours after the cap is part of the days that the cap is judged for
    report = left("1 L of 12 % sodium hypochlorite", litres="2 L", then=("seal", "wait 72 h"))
    assert gauge(report, 3)[1] == pytest.approx(gauge(report, 2)[1], rel=0.05)
