"""Stated ranges: worst points that lie strictly inside them, which unknown to measure first, and intervals that behave.

Each case has a response that rises and falls over the stated range, by stoichiometry worked out beside it. What single figures give is asked of
the same engine with exact labels, so that only the following of ranges is tested here.
"""

from __future__ import annotations

from functools import lru_cache
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from carboy.bench.ranges import Ranges
from carboy.model.report import Report
from carboy.text.cases import case_from_mapping
from carboy.vetting import laboratory
from tests.bench.reports import only, outline, select


@lru_cache(maxsize=128)
def poured(first: str, second: str, *, goal: str = "") -> Report:
    """Two portions poured one after the other in a large open vessel, in this order only."""
    lab = laboratory()
    plan: dict[str, Any] = {
        "title": "A test",
        "vessels": {"tank": {"volume": "20 L"}},
        "steps": [{"add": first}, {"add": second}],
    }
    if goal:
        plan["goals"] = [goal]
    return lab.vet(case_from_mapping(plan, lab.names))


def most(report: Report, kind: str, species: str) -> float:
    """Upper end of the amount of the one finding, mol; zero where there is none."""
    found = select(report, kind, species, step=2)
    if not found:
        return 0.0
    assert len(found) == 1, outline(report)
    assert found[0].amount_mol is not None
    return found[0].amount_mol[1]


# --- the worst lies inside ----------------------------------------------------------------------------------------------

AMMONIA = "500 mL of (0.4 M ammonium chloride + 1 M sodium bicarbonate)"  # 0.2 mol


def bleach(percent: str) -> str:
    return f"1 L of {percent} % sodium hypochlorite"


def test_most_chloramine_at_one_ratio() -> None:
    # At pH 8: NH3 + HOCl gives NH2Cl up to one to one, 0.2 mol at 0.2 mol/L of hypochlorite (74.44 g/mol, 1.5 %); beyond
    # it half and more is destroyed, 2 NH2Cl + ClO- giving N2. 0.1 % makes 13 mmol; of 10 % at most half of 0.2 is left
    low, inside, high = (most(poured(bleach(one), AMMONIA), "toxic-gas", "NH2Cl") for one in ("0.1", "1.5", "10"))
    assert low == pytest.approx(0.0134, rel=0.02)
    assert inside == pytest.approx(0.2, rel=0.01)
    assert high <= 0.101
    found = only(poured(bleach("0.1-10"), AMMONIA), "toxic-gas", "NH2Cl", step=2)
    assert found.amount_mol is not None
    assert max(low, high) * 1.2 < found.amount_mol[1] <= inside * (1 + 1e-6)
    assert found.amount_mol[0] <= low


CYANIDE = "(0.1 M sodium cyanide + 0.02 M sodium hydroxide)"
ACID = "100 mL of 0.5 M hydrochloric acid"  # 0.05 mol


def test_most_hydrogen_cyanide_at_one_volume() -> None:
    # V litres hold 0.1 V of cyanide, and 0.02 V of base that takes its part of the acid first: HCN is the lesser of 0.1 V and
    # 0.05 - 0.02 V, most 0.0417 mol at 0.417 L; 0.05 L give 0.005, and 5 L hardly any more than stood over them before
    low, inside, high = (
        most(poured(f"{one} L of {CYANIDE}", ACID), "toxic-gas", "HCN") for one in ("0.05", "0.417", "5")
    )
    assert low == pytest.approx(0.005, rel=0.02)
    assert inside == pytest.approx(0.0417, rel=0.02)
    assert high < 0.005
    report = poured(f"0.05-5 L of {CYANIDE}", ACID)
    found = only(report, "toxic-gas", "HCN", step=2)
    assert found.amount_mol is not None
    assert 5 * max(low, high) < found.amount_mol[1] <= inside * 1.001
    assert found.signal == "danger"


def test_the_lane_of_most_hydrogen_cyanide_is_no_end_of_the_range() -> None:
    lab = laboratory()
    plan = {"title": "A test", "steps": [{"add": f"0.05-5 L of {CYANIDE}"}, {"add": ACID}]}
    walk = lab.walk(case_from_mapping(plan, lab.names))
    (key,) = walk.ranges.variables
    course = walk.steps[1].path
    assert course is not None
    # what stands over the liquid tells what leaves: most of it where the least base is left
    over = course.table(course.mixture.aqueous[lab.stock.dissolved_form["HCN(g)"]]).max(axis=1)
    worst = float(walk.ranges.value(key)[int(np.argmax(over))])
    assert 0.05 < worst < 5
    assert 0.2 < worst < 1.2


def test_least_dissolved_zinc_between_too_little_and_too_much_base() -> None:
    # 10 mmol of zinc want 20 mmol of base: 0.02 mol/L in the second litre. 0.005 mol/L leave three quarters, 7.5 mmol or
    # more in 2 L, 245 mg/L and more; 2 mol/L take all back as zincate, 327 mg/L; between them it is below 5 mg/L,
    # and below a tenth of what the ends leave up to some 0.06 mol/L
    def dissolved(base: str) -> tuple[float, float]:
        report = poured(
            "1 L of 0.01 M zinc sulfate", f"1 L of {base} M sodium hydroxide", goal="dissolved zinc below 5 mg/L"
        )
        value = report.goals[0].value
        assert value is not None
        return value

    low, inside, high = (dissolved(one)[0] for one in ("0.005", "0.0205", "2"))
    assert low > 200
    assert high == pytest.approx(327, rel=0.02)
    assert inside < 5
    least, greatest = dissolved("0.005-2")
    assert least < 0.1 * min(low, high)
    assert greatest >= max(low, high) * (1 - 1e-6)


def test_a_goal_that_only_a_part_of_the_range_reaches_is_not_met() -> None:
    report = poured(
        "1 L of 0.01 M zinc sulfate", "1 L of 0.005-2 M sodium hydroxide", goal="dissolved zinc below 5 mg/L"
    )
    assert report.goals[0].met is False
    assert any("sodium hydroxide" in line for line in report.questions) or not report.findings


def test_a_range_of_decades_has_a_point_in_every_decade() -> None:
    ranges = Ranges()
    ranges.draw("strength", 0.01, 10.0)
    ranges.fix()
    values = np.sort(ranges.draw("strength", 0.01, 10.0))
    assert values[0] == 0.01
    assert values[-1] == 10.0
    assert np.all(values[1:] / values[:-1] < 3.5)
    narrow = Ranges()
    narrow.draw("volume", 1.0, 2.0)
    narrow.fix()
    assert np.sort(narrow.draw("volume", 1.0, 2.0)) == pytest.approx(np.linspace(1.0, 2.0, 21))


# --- in part, and what to measure -----------------------------------------------------------------------------------------


def test_marked_in_part_or_throughout() -> None:
    # 0.05 mol of carbonate and 0.01 of sulfide take 0.12 mol of acid before all of the sulfide is H2S; 0.005 mol change
    # nothing, and 0.3 set it free. A range from 0.15 mol up does so everywhere
    waste = "1 L of (0.01 M sodium sulfide + 0.05 M sodium carbonate)"
    part = only(poured(waste, "1 L of 0.005-0.3 M hydrochloric acid"), "toxic-gas", "H2S", step=2)
    whole = only(poured(waste, "1 L of 0.15-0.3 M hydrochloric acid"), "toxic-gas", "H2S", step=2)
    assert (part.holds, whole.holds) == ("in part", "throughout")
    assert part.amount_mol is not None
    assert part.amount_mol[0] < 1e-4
    assert part.amount_mol[1] > 0.0099
    for finding in poured(waste, "1 L of 0.2 M hydrochloric acid").findings:
        assert finding.holds == "throughout" or finding.kind == "foam"


def test_the_unknown_that_moves_the_verdict_is_asked_for_first() -> None:
    # sulfide between 9 and 11 mM moves nothing; acid between 5 and 300 mM everything
    report = poured(
        "1 L of (0.009-0.011 M sodium sulfide + 0.05 M sodium carbonate)", "1 L of 0.005-0.3 M hydrochloric acid"
    )
    asked = [line for line in report.questions if line.startswith("Measure")]
    assert asked
    assert asked[0].startswith("Measure first: strength of hydrochloric acid")
    assert not any("strength of sodium sulfide" in line for line in asked[:1])


def test_questions_are_ranked() -> None:
    lab = laboratory()
    plan = {
        "title": "A test",
        "vessels": {"tank": {"volume": "20 L"}},
        "steps": [
            {"add": "0.2-1 L of (0.02-0.2 M sodium sulfide + 0.1 M sodium hydroxide)"},
            {"add": "1 L of 0.005-0.5 M hydrochloric acid"},
        ],
    }
    outcome = lab.judge.judge(lab.walk(case_from_mapping(plan, lab.names)))
    asked = [line for line in lab.vet(case_from_mapping(plan, lab.names)).questions if line.startswith("Measure")]
    ranked = sorted(outcome.leverage, key=lambda key: -outcome.leverage[key])
    assert len(asked) >= 2
    for line, key in zip(asked, ranked, strict=False):
        assert key in line
    assert asked[0].startswith("Measure first")
    assert all(line.startswith("Measure next") for line in asked[1:])


def test_nothing_uncertain_nothing_asked() -> None:
    report = poured("1 L of 0.1 M sodium sulfide", "1 L of 0.5 M hydrochloric acid")
    assert not [line for line in report.questions if line.startswith("Measure")]
    # and a range that moves no finding is not asked for
    report = poured("1 L of 0.1-0.2 M sodium chloride", "1 L of 0.1 M potassium nitrate")
    assert not report.questions


# --- intervals --------------------------------------------------------------------------------------------------------------


def pairs(report: Report) -> dict[str, tuple[float, float]]:
    """Every reported pair by a name."""
    found: dict[str, tuple[float, float]] = {}
    for number, step in enumerate(report.steps, start=1):
        for name in ("pH", "temperature_C", "gauge_kPa"):
            pair = getattr(step, name)
            if pair is not None:
                found[f"{number} {name}"] = pair
        for table in ("dissolved_mol", "solids_mol", "gas_mol"):
            found |= {f"{number} {table} {key}": pair for key, pair in getattr(step, table).items()}
    for finding in report.findings:
        if finding.amount_mol is not None:
            found[f"{finding.step} amount of {finding.kind} {finding.species}"] = finding.amount_mol
    return found


_SYSTEMS = [
    # first portion with a strength to vary, second one; unit of strength, low and high within which to draw
    ("1 L of {} M zinc sulfate", "500 mL of 0.1 M sodium hydroxide", 0.002, 0.1),
    ("500 mL of {} M sodium sulfide", "500 mL of 0.1 M hydrochloric acid", 0.005, 0.3),
    ("500 mL of {} M sodium carbonate", "1 L of 0.2 M acetic acid", 0.01, 1.0),
    ("1 L of {} M hydrochloric acid", "500 mL of 0.5 M ammonia", 0.01, 1.0),
]


@settings(max_examples=12, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(st.sampled_from(_SYSTEMS), st.floats(0.05, 0.45), st.floats(0.55, 0.95), st.floats(0.1, 1.0))
def test_intervals_are_in_order_hold_the_nominal_and_grow_with_the_range(
    system: tuple[str, str, float, float], below: float, above: float, more: float
) -> None:
    first, second, bottom, top = system

    def strength(share: float) -> float:
        return float(f"{bottom * (top / bottom) ** share:.4g}")

    low, high = strength(below), strength(above)
    wide_low, wide_high = strength(below * (1 - more)), strength(above + (1 - above) * more)
    narrow = pairs(poured(first.format(f"{low:g}-{high:g}"), second))
    wide = pairs(poured(first.format(f"{wide_low:g}-{wide_high:g}"), second))
    nominal = pairs(poured(first.format(f"{0.5 * (low + high):.8g}"), second))
    for key, (least, greatest) in narrow.items():
        assert least <= greatest, key
        grain = 1e-3 * max(abs(least), abs(greatest)) + 1e-6
        if "amount" in key:
            grain = 0.04 * max(abs(least), abs(greatest)) + 1e-5  # the path is followed at other points with more lanes
        if key in nominal:
            assert least - grain <= nominal[key][0], key
            assert nominal[key][1] <= greatest + grain, key
        # the wider range has its points in ratios of up to 2. A pointed peak that rises as x and falls as 2 - x is then seen at
        # 2 / (1 + 2) of its height or more
        height = 0.35 * (greatest - least)
        if key in wide:
            assert wide[key][0] <= least + grain + height, key
            assert wide[key][1] >= greatest - grain - height, key
        else:
            assert "amount" in key or greatest <= 1e-6, key
    ends = [pairs(poured(first.format(f"{one:g}"), second)) for one in (low, high)]
    for end in ends:
        for key, (least, greatest) in end.items():
            if key in narrow and "amount" not in key:
                grain = 1e-3 * max(abs(least), abs(greatest)) + 1e-6
                assert narrow[key][0] - grain <= least, key
                assert greatest <= narrow[key][1] + grain, key


@settings(max_examples=50, deadline=None)
@given(st.lists(st.tuples(st.floats(0.0, 5.0), st.floats(0.0, 5.0)), min_size=1, max_size=7))
def test_lanes_hold_both_ends_and_the_nominal_first(ends: list[tuple[float, float]]) -> None:
    ranges = Ranges()
    limits = {f"number {place}": (min(pair), max(pair)) for place, pair in enumerate(ends)}
    for key, (low, high) in limits.items():
        ranges.draw(key, low, high)
    ranges.fix()
    for key, (low, high) in limits.items():
        values = ranges.draw(key, low, high)
        assert len(values) == ranges.lanes
        assert values[0] == pytest.approx(0.5 * (low + high))
        assert values.min() == low
        assert values.max() == high
