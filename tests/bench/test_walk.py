"""A plan carried out step by step: nothing is lost, what bubbles out is gone, what is sealed presses.

Conservation is asked of random small procedures: for every component, what is in the vessels plus what has bubbled out of open ones
is what was poured in. Redox changes components, so these procedures use only what the equilibria rule.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from carboy.bench.walk import Walk, Walker
from carboy.chemistry.mixture import GAS_CONSTANT_KPA
from carboy.errors import InputError
from carboy.reasoning.firing import Reactor
from carboy.text.cases import case_from_mapping
from carboy.vetting import laboratory
from tests.bench.reports import combined, walked
from tests.reasoning.small_book import rules

LITRES_PER_MOL = 24.465


def follow(steps: list[Any], vessels: dict[str, Any] | None = None, **more: Any) -> Walk:
    lab = laboratory()
    plan = {"title": "A test", "vessels": vessels or {"tank": {"volume": "20 L"}}, "steps": steps, **more}
    return lab.walk(case_from_mapping(plan, lab.names))


def atoms_of(walk: Walk) -> dict[str, np.ndarray]:
    """mol of each component that the vessels hold at the end, added up."""
    total: dict[str, np.ndarray] = {}
    for state in walk.vessels.values():
        for token, amount in state.content.amounts.items():
            total[token] = total.get(token, 0.0) + amount
    return total


def poured(walk: Walk) -> dict[str, np.ndarray]:
    """mol of each component that the portions brought."""
    total: dict[str, np.ndarray] = {}
    for trace in walk.steps:
        if trace.added is not None and not trace.action.startswith("transfer"):
            for token, amount in trace.added.amounts.items():
                total[token] = total.get(token, 0.0) + amount
    return total


def bubbled(walk: Walk) -> dict[str, np.ndarray]:
    """mol of each component that left open vessels as gas."""
    stock = laboratory().stock
    total: dict[str, np.ndarray] = {}
    for trace in walk.steps:
        if trace.cover != "sealed":
            for token, amount in trace.after.gases.items():
                for part, count in stock.components_of(token).items():
                    total[part] = total.get(part, 0.0) + count * np.where(amount > 1e-9, amount, 0.0)
    return total


def assert_conserved(walk: Walk) -> None:
    put_in, there, gone = poured(walk), atoms_of(walk), bubbled(walk)
    for token in {*put_in, *there} - {"H2O"}:
        before = np.asarray(put_in.get(token, 0.0), dtype=float)
        after = np.asarray(there.get(token, 0.0), dtype=float) + np.asarray(gone.get(token, 0.0), dtype=float)
        scale = max(float(np.max(np.abs(before))), 1e-6)
        assert after == pytest.approx(before, rel=1e-9, abs=1e-9 * scale), token


# --- conservation ----------------------------------------------------------------------------------------------

PORTIONS = (
    "1 L of 0.1 M hydrochloric acid",
    "500 mL of 0.5 M sodium hydroxide",
    "200 mL of 0.2 M sodium carbonate",
    "300 mL of (0.02 M copper sulfate + 0.01 M sulfuric acid)",
    "100 mL of 0.05 M sodium sulfide",
    "100 mL of 0.1 M calcium chloride",
    "250 mL of 0.05 M sodium phosphate",
    "200 mL of 0.5 M ammonia",
    "10 g of sodium bicarbonate",
    "400 mL of 0.01-0.03 M zinc sulfate",
    "1 L of water",
)
ADD = st.builds(lambda text, to: {"add": text, "to": to}, st.sampled_from(PORTIONS), st.sampled_from(["one", "two"]))
OTHER = st.sampled_from(
    [
        {"transfer": "one", "to": "two"},
        {"transfer": "two", "to": "one", "part": "100 mL"},
        {"filter": "one", "cake": "cake", "filtrate": "two"},
        {"decant": "two", "filtrate": "one", "cake": "cake"},
        {"wait": "1 h", "in": "one"},
        {"seal": "one"},
        {"open": "one"},
    ]
)


def carried_out(steps: list[dict[str, str]]) -> Walk | None:
    try:
        return follow(steps, {"one": {"volume": "30 L"}, "two": {"volume": "30 L"}, "cake": {"volume": "30 L"}})
    except InputError:
        return None  # it takes from an empty vessel: the reader says so


@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.too_slow], derandomize=True)
@given(st.lists(ADD, min_size=1, max_size=3), st.lists(ADD | OTHER, max_size=4))
def test_nothing_is_lost(first: list[dict[str, str]], then: list[dict[str, str]]) -> None:
    walk = carried_out([*first, *then])
    if walk is not None:
        assert_conserved(walk)


PROCEDURES: dict[str, list[dict[str, str]]] = {
    "acid on bicarbonate, open": [
        {"add": "10 g of sodium bicarbonate", "to": "one"},
        {"add": "1 L of 0.5 M hydrochloric acid", "to": "one"},
    ],
    "sulfide acidified in the open": [
        {"add": "1 L of 0.5 M sodium sulfide", "to": "one"},
        {"add": "1 L of 2 M hydrochloric acid", "to": "one"},
        {"wait": "1 h", "in": "one"},
    ],
    "sulfide precipitated and filtered": [
        {"add": "1 L of (0.02 M copper sulfate + 0.01 M sulfuric acid)", "to": "one"},
        {"add": "400 mL of 0.1 M sodium sulfide", "to": "one"},
        {"filter": "one", "cake": "cake", "filtrate": "two"},
        {"add": "1 L of 0.1 M sodium hydroxide", "to": "two"},
    ],
    "transfer of a part and back": [
        {"add": "1 L of 0.1 M calcium chloride", "to": "one"},
        {"add": "1 L of 0.1 M sodium carbonate", "to": "one"},
        {"transfer": "one", "to": "two", "part": "700 mL"},
        {"transfer": "two", "to": "one"},
    ],
    "sealed with gas in the headspace, then opened": [
        {"add": "10 g of sodium bicarbonate", "to": "one"},
        {"add": "1 L of 0.05 M hydrochloric acid", "to": "one"},
        {"seal": "one"},
        {"open": "one"},
    ],
}


@pytest.mark.parametrize("name", PROCEDURES)
def test_procedure_conserves_every_component(name: str) -> None:
    walk = carried_out(PROCEDURES[name])
    assert walk is not None
    assert_conserved(walk)


def test_volume_and_mass_add_up() -> None:
    walk = follow(
        [{"add": "1 L of 1 M sodium chloride"}, {"add": "2 L of water"}, {"add": "58.44 g of sodium chloride"}]
    )
    content = walk.vessels["tank"].content
    brought = [trace.added or trace.after for trace in walk.steps]
    assert content.volume_L == pytest.approx(sum(one.volume_L for one in brought))
    assert content.mass_g == pytest.approx(sum(one.mass_g for one in brought))
    # 1 L of 1 M NaCl 1.038 kg (CRC), 2 L of water 1.994 kg, 58.4 g of salt
    assert content.total("Na+") == pytest.approx(2.0, rel=1e-4)


# --- filtering, decanting, transferring ------------------------------------------------------------------------


def filtered() -> Walk:
    # 10 mmol CaCl2 and 10 mmol Na2CO3 in 2 L: calcite comes down all but some 0.1 mmol
    return follow(
        [
            {"add": "1 L of 0.1 M calcium chloride", "to": "tank"},
            {"add": "1 L of 0.1 M sodium carbonate", "to": "tank"},
            {"filter": "tank", "cake": "cake", "filtrate": "jug"},
        ],
        {"tank": {"volume": "5 L"}, "jug": {"volume": "5 L"}},
    )


def test_a_filter_keeps_the_solid_and_lets_the_liquid_through() -> None:
    walk = filtered()
    before = walk.steps[1].after
    calcium = before.solids
    assert {laboratory().index.species[token].formula for token in calcium} == {"CaCO3"}
    (solid,) = calcium.values()
    assert solid == pytest.approx(0.1, rel=0.01)
    cake, jug = walk.vessels["cake"].content, walk.vessels["jug"].content
    assert cake.total("Ca+2") == pytest.approx(0.1, rel=0.01)
    # 10 g of calcite hold 2 mL of liquid a gram: 20 mL of 2 L, 1 %
    assert jug.volume_L == pytest.approx(2.0 - 0.02, rel=2e-3)
    assert jug.total("Cl-") == pytest.approx(0.2 * 0.99, rel=2e-3)
    assert cake.total("Cl-") == pytest.approx(0.2 * 0.01, rel=0.02)
    assert jug.total("Ca+2") == pytest.approx(before.dissolved("Ca+2") * 0.99, rel=1e-3)
    assert not walk.vessels["tank"].filled


def test_what_runs_through_the_filter() -> None:
    walk = follow(
        [
            {"add": "1 L of 0.1 M calcium chloride", "to": "tank"},
            {"add": "1 L of 0.1 M sodium carbonate", "to": "tank"},
            {"filter": "tank", "cake": "cake", "filtrate": "jug", "passes": "10 %"},
        ],
        {"tank": {"volume": "5 L"}, "jug": {"volume": "5 L"}},
    )
    before = walk.steps[1].after
    expected = 0.1 * sum(before.solids.values()) + 0.99 * before.dissolved("Ca+2")
    assert walk.vessels["jug"].content.total("Ca+2") == pytest.approx(expected, rel=0.01)
    assert_conserved(walk)


def test_transfer_leaves_the_heel() -> None:
    walk = follow(
        [{"add": "2 L of 0.1 M sodium chloride", "to": "tank"}, {"transfer": "tank", "to": "drum", "heel": "100 mL"}],
        {"tank": {"volume": "5 L"}, "drum": {"volume": "10 L"}},
    )
    assert walk.vessels["tank"].content.volume_L == pytest.approx(0.1)
    assert walk.vessels["drum"].content.total("Na+") == pytest.approx(0.19)


def test_part_of_a_bottle() -> None:
    walk = follow(
        [{"add": "250 mL from rinse", "to": "tank"}],
        bottles={"rinse": "1 L of 0.4 M sodium chloride"},
    )
    assert walk.vessels["tank"].content.total("Na+") == pytest.approx(0.1)


def test_a_vessel_that_holds_something_at_the_start() -> None:
    walk = follow(
        [{"add": "1 L of 0.1 M hydrochloric acid", "to": "tank"}],
        {"tank": {"volume": "5 L", "holds": ["1 L of 0.1 M sodium hydroxide"]}},
    )
    assert walk.steps[0].after.pH == pytest.approx(7.0, abs=0.05)
    assert walk.vessels["tank"].content.total("Na+") == pytest.approx(0.1)


# --- sealed vessels --------------------------------------------------------------------------------------------


def test_sealed_air_only() -> None:
    # closed at one atmosphere over water: nothing changes, gauge 0
    walk = follow([{"add": "1 L of water"}, {"seal": "tank"}], {"tank": {"volume": "2 L"}})
    assert walk.steps[-1].after.gauge_kPa() == pytest.approx(0.0, abs=0.05)


def test_sealed_bottle_of_ammonia_is_hardly_above_the_atmosphere() -> None:
    # 1 M ammonia: 1 / 59 atm (Henry 59 mol/(kg atm), Sander) = 1.7 kPa above the air shut in
    walk = follow([{"add": "1 L of 1 M ammonia"}, {"seal": "tank"}], {"tank": {"volume": "2 L"}})
    assert walk.steps[-1].after.gauge_kPa() == pytest.approx(1.7, rel=0.15)


def test_sealed_hydrogen() -> None:
    # 0.5 g Zn = 7.65 mmol H2, poured on by 100 mL of acid in 0.5 L: headspace 0.4 L; 7.65e-3 x 24.465 / 0.4 = 0.468
    # atm = 47.4 kPa, less the 0.8 mmol/(kg atm) that dissolves (0.4 %)
    report = combined("0.5 g of zinc powder", "100 mL of 2 M hydrochloric acid", volume_L=0.5, cover="sealed")
    assert report.steps[1].gauge_kPa is not None
    rise = 1 + (report.steps[1].temperature_C or (25.0, 25.0))[0] / 273.15
    warm = rise / (1 + 25 / 273.15)  # the gas is as warm as the liquid
    vapour = 1.5  # kPa of water at some 28 degC beyond that at 25 degC
    assert report.steps[1].gauge_kPa[0] == pytest.approx((47.4 + 98.2) * warm - 98.2 + vapour, abs=3.0)


def test_sealed_pressure_is_the_gas_law_of_what_the_headspace_holds() -> None:
    content = (
        walked("5 g of sodium bicarbonate", "500 mL of 0.5 M hydrochloric acid", volume_L=1.0, cover="sealed")
        .steps[1]
        .after
    )
    assert content.air_mol is not None
    assert content.headspace_L is not None
    moles = content.air_mol + sum(content.gases.values())
    kelvin = content.temperature_C + 273.15
    vapour = {20.0: 2.339, 25.0: 3.169}  # kPa, CRC Handbook
    expected = moles * GAS_CONSTANT_KPA * kelvin / content.headspace_L + 3.0 - 101.325
    assert vapour[20.0] < 3.0 < vapour[25.0]
    assert content.gauge_kPa() == pytest.approx(expected, abs=0.3)
    # CO2: 5 / 84.007 = 0.0595 mol; P x 0.4975 / 24.465 + P x 0.031 x 0.495 = 0.0595 -> P = 1.67 atm = 169 kPa
    assert content.gauge_kPa() == pytest.approx(169, rel=0.05)


def test_the_smaller_the_headspace_the_higher_the_pressure() -> None:
    pressures = []
    for volume in (0.7, 1.0, 2.0, 10.0):
        report = combined(
            "5 g of sodium bicarbonate", "500 mL of 0.5 M hydrochloric acid", volume_L=volume, cover="sealed"
        )
        assert report.steps[1].gauge_kPa is not None
        pressures.append(report.steps[1].gauge_kPa[0])
    assert pressures == sorted(pressures, reverse=True)


def test_a_gas_shut_in_is_not_lost_and_comes_out_when_opened() -> None:
    walk = follow(
        [
            {"add": "5 g of sodium bicarbonate"},
            {"seal": "tank"},
            {"add": "500 mL of 0.5 M hydrochloric acid"},
            {"open": "tank"},
        ],
        {"tank": {"volume": "1 L"}},
    )
    assert walk.steps[2].after.total("CO3-2") == pytest.approx(0.0595, rel=0.01)
    # at one atmosphere 0.5 kg keep 0.031 x 0.5 = 0.016 mol
    assert walk.vessels["tank"].content.total("CO3-2") == pytest.approx(0.016, abs=0.002)


def test_opened_vessel_has_no_gauge_pressure() -> None:
    walk = follow([{"add": "1 L of 1 M ammonia"}, {"seal": "tank"}, {"vent": "tank"}], {"tank": {"volume": "2 L"}})
    assert walk.steps[-1].after.gauge_kPa() == pytest.approx(0.0)


# --- overflow, waiting, temperature ----------------------------------------------------------------------------


def test_overflow_is_noted() -> None:
    walk = follow([{"add": "700 mL of water"}, {"add": "700 mL of water"}], {"tank": {"volume": "1 L"}})
    assert not walk.steps[0].notes
    assert any("overflows" in note and "1.4 L in 1 L" in note for note in walk.steps[1].notes)


def test_overflow_is_in_the_report() -> None:
    report = combined("700 mL of water", "700 mL of water", volume_L=1.0)
    assert any("overflows" in line for line in report.assumptions + [one.summary for one in report.findings])


def test_waiting_lets_slow_things_happen() -> None:
    # the step says for how long, and a wait over still water changes nothing
    walk = follow([{"add": "1 L of 0.1 M sodium chloride"}, {"wait": "24 h"}])
    assert "1 d" in walk.steps[1].action
    assert walk.steps[1].after.pH == pytest.approx(walk.steps[0].after.pH)
    assert_conserved(walk)


@pytest.mark.parametrize(("time", "reacts"), [("5 min", False), ("24 h", True)])
def test_what_takes_hours_happens_in_a_long_wait(time: str, reacts: bool) -> None:
    lab = laboratory()
    book = rules("""slow-chloramine
  needs   NH4+ present
          ClO- present
  does    NH4+ + ClO- -> NH2Cl + H2O
  speed   hours""")
    plan = {
        "title": "A test",
        "steps": [
            {"add": "100 mL of 0.2 M ammonia"},
            {"add": "100 mL of (0.1 M sodium hypochlorite + 0.1 M sodium hydroxide)"},
            {"wait": time},
        ],
    }
    walk = Walker(lab.stock, Reactor(book, lab.stock)).walk(case_from_mapping(plan, lab.names))
    assert walk.steps[1].after.total("NH2Cl") == pytest.approx(0.0)
    assert walk.steps[2].after.total("NH2Cl") == pytest.approx(0.01 if reacts else 0.0, rel=1e-3)


def test_a_range_of_what_is_transferred_is_followed_to_its_ends() -> None:
    walk = follow(
        [{"add": "2 L of 0.1 M sodium chloride", "to": "tank"}, {"transfer": "tank", "to": "drum", "part": "0.5-1 L"}],
        {"tank": {"volume": "5 L"}, "drum": {"volume": "10 L"}},
    )
    moved = walk.vessels["drum"].content.total("Na+")
    assert (moved.min(), moved.max()) == pytest.approx((0.05, 0.1))


def test_part_of_a_bottle_is_recorded_as_that_part() -> None:
    # 100 mL of a strong bottle (0.1 mol of Na) weigh less than 1 L of 0.5 M
    walk = follow(
        [{"add": "100 mL from strong", "to": "tank"}, {"add": "1 L of 0.5 M sodium chloride", "to": "tank"}],
        bottles={"strong": "1 L of 1 M sodium chloride"},
    )
    node = walk.record.fired("tank", "use", "Na+ -> Na+", {"Na+": 0.6}, {"Na+": 0.6}, 2)
    first = walk.record.paths(node)[0]
    assert "0.5 M" in first[0].from_[0]


def test_temperature_of_mixed_water() -> None:
    # 1 L at 80 degC into 1 L at 20 degC: 50 degC
    walk = follow(
        [
            {"add": "1 L of water", "to": "warm"},
            {"heat": "80 degC", "in": "warm"},
            {"add": "1 L of water", "to": "cold"},
            {"transfer": "warm", "to": "cold"},
        ],
        {"warm": {"volume": "3 L"}, "cold": {"volume": "3 L"}},
        setting={"temperature": "20 degC"},
    )
    assert walk.vessels["cold"].content.temperature_C == pytest.approx(50.0, abs=0.5)


def test_a_vessel_without_a_size_holds_twice_the_content_and_says_so() -> None:
    walk = walked("1 L of water", "500 mL of 0.1 M sodium chloride")
    assert walk.vessels["vessel"].capacity_L == pytest.approx(3.0)
    assert any("3 L" in line and "twice" in line for line in walk.assumptions)


# --- what cannot be carried out --------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "steps",
    [
        [{"filter": "tank", "filtrate": "jug", "cake": "cake"}],
        [{"add": "1 L of water", "to": "tank"}, {"transfer": "jug", "to": "tank"}],
        [{"add": "1 L of water", "to": "nowhere"}],
        [{"add": "2 L from rinse", "to": "tank"}],
    ],
)
def test_what_cannot_be_done_is_an_input_error(steps: list[Any]) -> None:
    with pytest.raises(InputError):
        follow(steps, {"tank": {"volume": "5 L"}, "jug": {"volume": "5 L"}}, bottles={"rinse": "1 L of water"})


def test_filtering_leaves_the_pH_of_the_liquid() -> None:
    # basic lead carbonate takes hydroxide with it; the liquid that runs off is the liquid that stood over it
    lab = laboratory()
    plan = {
        "title": "Lead by soda",
        "vessels": {"tank": {"volume": "3 L"}},
        "steps": [
            {"add": "1 L of 0.01 M lead nitrate"},
            {"add": "1.484 g of sodium carbonate"},
            {"filter": "tank", "cake": "cake", "filtrate": "jug"},
        ],
    }
    report = lab.vet(case_from_mapping(plan, lab.names))
    before, after = report.steps[1].pH, report.steps[2].pH
    assert before is not None
    assert after is not None
    assert after == pytest.approx(before, abs=0.02)
