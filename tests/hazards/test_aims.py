"""Aims by figure, by published limit, by the site's limit; the leaching test; and the reasons why an aim is missed."""

from __future__ import annotations

from typing import Any

import pytest

from carboy.bench.make_up import Bench
from carboy.bench.ranges import Ranges
from carboy.errors import InputError
from carboy.model.report import Finding, Report
from carboy.text.cases import case_from_mapping
from carboy.text.portions import parse_portion
from carboy.vetting import laboratory


def vetted(portions: list[str], goals: list[str], more: tuple[dict[str, str], ...] = (), **top: Any) -> Report:
    lab = laboratory()
    data = {
        "title": "aims",
        "vessels": {"tank": {"volume": "20 L"}},
        "steps": [*({"add": text, "to": "tank"} for text in portions), *more],
        "goals": goals,
        **top,
    }
    return lab.vet(case_from_mapping(data, lab.names))


def shortfall(portions: list[str], goal: str) -> Finding:
    report = vetted(portions, [goal])
    assert report.goals[0].met is False
    found = [finding for finding in report.findings if finding.kind == "incomplete" and finding.signal != "note"]
    last = [finding for finding in found if finding.step == len(portions)]
    assert len(last) == 1, [finding.summary for finding in found]
    return last[0]


# --- reasons: each is what an analyst would say of the vessel


@pytest.mark.parametrize(
    ("portions", "goal", "words"),
    [
        # 7.5 mmol of sulfide for 10 mmol of mercury(II), hydrogencarbonate holds pH 8
        (
            ["1 L of (0.01 M mercury(II) nitrate + 0.5 M sodium bicarbonate)", "30 mL of 0.25 M sodium sulfide"],
            "dissolved mercury in tank below 0.2 mg/L",
            "Too little reagent: with more hydrogensulfide ion",
        ),
        (
            ["500 mL of (0.05 M copper sulfate + 0.06 M disodium EDTA)", "200 mL of 1 M sodium hydroxide"],
            "dissolved copper in tank below 1 mg/L",
            "Complexing: ethylenediaminetetraacetate ion holds it",
        ),
        (
            ["500 mL of 0.05 M copper sulfate", "50 mL of 1 M sodium hydroxide", "100 mL of 4 M ammonia"],
            "dissolved copper in tank below 1 mg/L",
            "Complexing: ammonium ion holds it in solution (100 % of what is dissolved, mostly as Cu(NH3)4+2)",
        ),
        # beta4 of CdCl4-2 is about 10^2; in 3 M chloride the free cadmium is a few per cent of what is dissolved
        (
            ["500 mL of (0.01 M cadmium chloride + 3 M sodium chloride)", "30 mL of 1 M sodium hydroxide"],
            "dissolved cadmium in tank below 0.1 mg/L",
            "Complexing: chloride ion holds it",
        ),
        (
            ["500 mL of 0.05 M copper sulfate", "10 mL of 1 M sodium hydroxide"],
            "dissolved copper in tank below 1 mg/L",
            "The pH is outside the window: 5.4 is too low",
        ),
        (
            ["500 mL of 0.01 M potassium dichromate", "20 mL of 1 M sodium hydroxide"],
            "dissolved chromium in tank below 5 mg/L",
            "Wrong oxidation state: it is there as Cr(VI); as Cr(III) it would come down",
        ),
        (
            ["500 mL of 0.05 M zinc sulfate", "200 mL of 4 M sodium hydroxide"],
            "dissolved zinc in tank below 2.6 mg/L",
            "Overdose of base: at pH 14 it goes back into solution as Zn(OH)4-2",
        ),
        (
            ["1 L of 0.01 M mercury(II) chloride", "1 L of (0.5 M sodium sulfide + 0.5 M sodium hydroxide)"],
            "dissolved mercury in tank below 0.2 mg/L",
            "Overdose: the excess of hydrogensulfide ion takes it back",
        ),
        # 50 mmol of cyanide; 50 mL of 6 % (w/w) hypochlorite hold about 43 mmol
        (
            ["500 mL of (0.1 M sodium cyanide + 0.1 M sodium hydroxide)", "50 mL of 6 % sodium hypochlorite"],
            "no cyanide left in tank",
            "and the hypochlorite ion that takes it away is used up",
        ),
        (
            ["500 mL of 0.1 M sodium hypochlorite", "100 mL of 0.1 M sodium bisulfite"],
            "no oxidiser left in tank",
            "40 mmol of hypochlorite ion is left",
        ),
        (
            ["500 mL of (0.1 M sodium sulfide + 0.1 M sodium hydroxide)", "50 mL of water"],
            "sulfide destroyed in tank",
            "nothing that takes it away was added",
        ),
        (
            ["500 mL of 0.01 M lead nitrate", "20 mL of 1 M sodium carbonate"],
            "total lead in tank below 5 mg/L",
            "the rest is solid and still in the vessel",
        ),
        (
            ["500 mL of 0.1 M hydrochloric acid", "1 g of sodium bicarbonate"],
            "pH in tank between 6 and 9",
            "Too little base, or too much acid",
        ),
    ],
)
def test_the_reason_is_named(portions: list[str], goal: str, words: str):
    assert words in shortfall(portions, goal).says


def test_a_missed_aim_is_no_quiet_all_clear():
    portions = ["500 mL of 0.1 M hydrochloric acid", "1 g of sodium bicarbonate"]
    assert vetted(portions, ["pH in tank between 6 and 9"]).verdict == "conditional"
    assert vetted(portions, ["pH in tank between 0 and 9"]).verdict == "no objection"


def test_a_check_that_fails_is_found_and_one_that_holds_is_not():
    portions = ["500 mL of 0.1 M hydrochloric acid", "1 g of sodium bicarbonate"]
    for window, fails in (("between 6 and 9", True), ("between 1 and 2", False)):
        report = vetted(portions, [], ({"check": f"pH {window}", "in": "tank"},))
        found = [finding for finding in report.findings if finding.step == 3 and finding.kind == "incomplete"]
        assert bool(found) is fails
        if fails:
            assert found[0].signal == "warning"
            # 0.0500 mol of acid less 1 g / 84.007 = 0.0119 mol: 0.0381 mol in 0.5 L, 0.076 M with activity about 0.8: pH 1.2
            assert "it comes to 1.2" in found[0].summary


def test_a_check_that_may_fail_is_a_note():
    report = vetted(["500 mL of 0.1-1 M sodium hydroxide"], [], ({"check": "pH between 13.3 and 14", "in": "tank"},))
    found = [finding for finding in report.findings if finding.kind == "incomplete"]
    assert [(one.signal, one.holds) for one in found] == [("note", "in part")]


# --- limits by name

LEAD = ["2 L of 0.01 M lead nitrate", "100 mL of 1 M sodium carbonate"]


@pytest.mark.parametrize(
    ("goal", "limit"),
    [
        ("dissolved lead in tank below the toxicity characteristic", 5.0),
        ("dissolved lead in tank below 40 CFR 261.24", 5.0),
        ("dissolved lead in tank below 40 CFR 268.48", 0.69),
        ("dissolved lead below the universal treatment standard in tank", 0.69),
        ("dissolved lead in tank below the site limit", 0.1),
        ("dissolved lead in tank within the site limit", 0.1),
        ("lead in tank passes 40 CFR 268.48", 0.75),
        ("leached lead in tank below 40 CFR 268.48", 0.75),
        ("lead in tank passes the leaching test", 5.0),
    ],
)
def test_a_limit_goes_by_its_name(goal: str, limit: float):
    lab = laboratory()
    data = {
        "title": "named",
        "limits": {"lead": "0.1 mg/L"},
        "steps": [{"add": text, "to": "tank"} for text in LEAD],
        "goals": [goal],
    }
    read = case_from_mapping(data, lab.names)
    assert (read.goals[0].high, read.goals[0].unit, read.goals[0].subject) == (limit, "mg/L", "Pb")


@pytest.mark.parametrize(
    ("goal", "words"),
    [
        ("dissolved lead in tank below the moon", "neither a figure nor a limit"),
        ("dissolved zinc in tank below the toxicity characteristic", "says nothing of Zn"),
        ("tank passes the exam", "no limit on what leaches"),
        ("dissolved copper in tank below the site limit", "no site limit for this"),
        ("no phlogiston left in tank", "nothing that is counted"),
    ],
)
def test_a_limit_that_is_none_is_refused(goal: str, words: str):
    lab = laboratory()
    data = {
        "title": "none",
        "limits": {"lead": "0.1 mg/L"},
        "steps": [{"add": text, "to": "tank"} for text in LEAD],
        "goals": [goal],
    }
    with pytest.raises(InputError, match=words):
        case_from_mapping(data, lab.names)


def test_the_limits_of_the_site_make_one_aim_each():
    report = vetted(
        LEAD, ["tank meets the site limits"], limits={"lead": "5 mg/L", "pH": "6 to 9", "sulfide": "below 2 mg/L"}
    )
    assert [goal.goal for goal in report.goals] == [
        "Pb in tank within the site limit",
        "pH in tank within the site limit",
        "S(-II) in tank within the site limit",
    ]
    # 0.02 mol of lead in 2.1 L, solids counted: 1973 mg/L; the soda leaves it alkaline; there is no sulfide
    assert [goal.met for goal in report.goals] == [False, False, True]
    assert report.goals[0].value == pytest.approx((1973, 1973), rel=5e-3)


@pytest.mark.parametrize("limits", [{"lead": "soon"}, {"phlogiston": "1 mg/L"}, {"lead": "9 mg/L in jug"}])
def test_a_site_limit_that_cannot_be_read_is_refused(limits: dict[str, str]):
    with pytest.raises(InputError):
        vetted(LEAD, [], limits=limits)


# --- leaching


@pytest.mark.parametrize(("fluid", "pH"), [("extraction fluid 1", 4.93), ("extraction fluid 2", 2.88)])
def test_the_fluids_have_the_pH_that_the_method_asks_for(fluid: str, pH: float):
    """EPA method 1311: 4.93 and 2.88, each within 0.05."""
    lab = laboratory()
    portion = parse_portion(f"1 L of {fluid}", lab.names)
    made = Bench(lab.stock, Ranges()).make_up(portion, "fluid", 25.0)
    assert float(made.mixture.pH[0]) == pytest.approx(pH, abs=0.05)


def cake_of(precipitant: str, goal: str) -> Report:
    return vetted(
        ["2 L of 0.01 M lead nitrate", precipitant],
        [goal],
        ({"filter": "tank", "cake": "cake-1", "filtrate": "jug"},),
    )


def test_lead_carbonate_leaches_and_lead_sulfide_does_not():
    """Lead carbonate dissolves in acetic acid; lead sulfide, log Ksp about -28, does not at pH 3 to 5."""
    carbonate = cake_of("100 mL of 1 M sodium carbonate", "cake-1 passes the leaching test")
    assert carbonate.goals[0].met is False
    found = [finding for finding in carbonate.findings if finding.vessel == "cake-1"]
    assert [one.kind for one in found] == ["incomplete"]
    assert found[0].signal == "warning"
    assert any("method 1311" in line for line in carbonate.assumptions)
    sulfide = cake_of("44 mL of 0.5 M sodium sulfide", "cake-1 passes the leaching test")
    assert sulfide.goals[0].met is True
