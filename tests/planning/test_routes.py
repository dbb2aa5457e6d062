"""Routes offered by ``treat``: each is vetted again by a call of its own, from the text of its case file."""

from __future__ import annotations

import numpy as np
import pytest

import carboy
from carboy.model.treatment import Route
from carboy.planning.liquid import hazards_of
from carboy.planning.search import after, applies, must_go, sequences, state_graph
from carboy.text.cases import read_case
from carboy.text.formulas import molar_mass, parse_formula
from carboy.text.portions import parse_portion
from carboy.vetting import Laboratory, laboratory
from tests.planning.treating import poured, route_of, treated

MERCURY = "4 L of (0.02 M mercury(II) nitrate + 0.5 M nitric acid)"
CHROMATE = "2 L of (0.005 M potassium dichromate + 0.02 M sulfuric acid)"
CYANIDE = "5 L of (0.02 M sodium cyanide + 0.02 M sodium hydroxide)"
WASTES = {
    MERCURY: "metals-as-sulfide",
    CHROMATE: "chromate-with-bisulfite",
    CYANIDE: "cyanide-by-alkaline-chlorination",
    "1 L of 2 M hydrochloric acid": "acid-with-bicarbonate",
    "1 L of 1 M sodium hydroxide": "base-with-sulfuric-acid",
    "2 L of (0.05 M copper sulfate + 0.02 M sulfuric acid)": "metals-as-hydroxide-near-9",
    "1 L of 0.02 M cadmium nitrate": "metals-as-hydroxide-near-10",
    "1 L of (0.02 M nickel sulfate + 0.1 M hydrochloric acid)": "metals-as-hydroxide-near-10",
    "1 L of 0.05 M zinc sulfate": "metals-as-hydroxide-near-9",
    "1 L of 0.01 M lead nitrate": "metals-as-carbonate",
    "500 mL of 6 % sodium hypochlorite": "hypochlorite-with-sulfite",
    "1 L of 0.1 M sodium sulfide": "sulfide-with-peroxide",
    "1 L of 3 % hydrogen peroxide": "peroxide-with-sulfite",
    "1 L of 0.05 M silver nitrate": "silver-as-chloride",
    "1 L of 0.05 M barium chloride": "barium-as-sulfate",
}


@pytest.fixture(scope="module")
def lab() -> Laboratory:
    return laboratory()


def additions(route: Route, token: str, lab: Laboratory, treatment: str = "") -> float:
    """mol of a component that the reagents of a route bring."""
    case = read_case(route.case_file, lab.names, file="route")
    total = 0.0
    for place, step in zip(route.steps, case.steps, strict=True):
        portion = getattr(step, "portion", None)
        if portion is not None and treatment in ("", place.treatment):
            total += poured(lab, portion.text, token)
    return total


@pytest.mark.long
@pytest.mark.parametrize(("waste", "treatment"), WASTES.items())
def test_each_route_is_vetted_again_by_an_independent_call(waste: str, treatment: str):
    report = treated(waste)
    assert report.outcome == "routes found"
    assert any(treatment in route.treatments for route in report.routes), [route.treatments for route in report.routes]
    fresh = Laboratory()
    for route in report.routes:
        again = fresh.vet(read_case(route.case_file, fresh.names, file="route"))
        assert again.verdict in ("no objection", "conditional")
        assert not [finding for finding in again.findings if finding.signal == "danger"]
        assert again.goals
        assert all(goal.met is True for goal in again.goals), again.goals
        assert len(again.steps) == len(route.steps)


@pytest.mark.long
@pytest.mark.parametrize("waste", [MERCURY, CYANIDE])
def test_the_last_liquid_holds_no_hazard_that_must_go(waste: str, lab: Laboratory):
    for route in treated(waste).routes:
        walk = lab.walk(read_case(route.case_file, lab.names, file="route"))
        last = next(stream.vessel for stream in route.streams if stream.kind == "liquid")
        assert not hazards_of(walk.vessels[last].content, lab.stock) & must_go(lab.index)


@pytest.mark.long
def test_sulfide_comes_after_the_acid_is_gone(lab: Laboratory):
    for route in treated(MERCURY).routes:
        for before, step in zip(route.steps, route.steps[1:], strict=False):
            if "sodium sulfide" in step.action:
                assert before.pH is not None
                assert before.pH[0] > 9


def test_acid_goes_into_water_and_not_the_other_way(lab: Laboratory):
    for route in treated("1 L of 2 M hydrochloric acid").routes:
        assert "water" in route.steps[0].action
        assert route.steps[1].action.startswith("add the waste")


# --- published figures ------------------------------------------------------------------------------------------------


@pytest.mark.long
def test_sulfide_is_dosed_one_to_one_with_mercury(lab: Laboratory):
    """HgS: one sulfide a mercury(II), 1.160 g of HgS per g of Hg (IUPAC atomic weights)."""
    route = route_of(MERCURY, "metals-as-sulfide")
    mercury = poured(lab, MERCURY, "Hg+2")
    excess = next(stage.excess for stage in lab.index.treatments["metals-as-sulfide"].stages if stage.agent == "HS-")
    assert additions(route, "HS-", lab) == pytest.approx(excess * mercury, rel=1e-3)
    sludge = next(stream for stream in route.streams if stream.kind == "sludge")
    grams = mercury * molar_mass(parse_formula("Hg").atoms)
    assert sludge.solids_g["HgS"][0] / grams == pytest.approx(1.160, abs=0.001)


@pytest.mark.long
def test_bisulfite_is_dosed_three_to_two_with_chromium(lab: Laboratory):
    """2 Cr(VI) : 3 bisulfite (Patterson, Industrial Wastewater Treatment Technology, from memory)."""
    route = route_of(CHROMATE, "chromate-with-bisulfite")
    excess = 1.03
    chromium = poured(lab, CHROMATE, "CrO4-2")
    assert additions(route, "SO3-2", lab) == pytest.approx(1.5 * chromium * excess, rel=2e-3)
    # 1.5 mol of NaHSO3 a mol of Cr is 3.00 g per g (same source)
    assert 1.5 * molar_mass(parse_formula("NaHSO3").atoms) / molar_mass(parse_formula("Cr").atoms) == pytest.approx(
        3.00, abs=0.01
    )


@pytest.mark.long
def test_chlorine_demand_of_cyanide(lab: Laboratory):
    """2.73 g Cl2 per g CN to cyanate and 6.82 to nitrogen (US EPA, Managing Cyanide in Metal Finishing; Patterson; from memory).
    The first is what the route doses, the second follows from the rules that the engine goes by."""
    route = route_of(CYANIDE, "cyanide-by-alkaline-chlorination")
    stage = next(one for one in lab.index.treatments["cyanide-by-alkaline-chlorination"].stages if one.agent == "ClO-")
    dosed = additions(route, "ClO-", lab) / stage.excess
    cyanide = poured(lab, CYANIDE, "CN-")
    chlorine, cyanogen = (molar_mass(parse_formula(text).atoms) for text in ("Cl2", "CN"))
    assert dosed * chlorine / (cyanide * cyanogen) == pytest.approx(2.73, abs=0.01)
    rules = {rule.id: rule for rule in lab.rules}

    def ratio(rule: str, agent: str, target: str) -> float:
        reactants = {term.term: term.coefficient or 1.0 for term in rules[rule].does[0].reactants}
        return reactants[agent] / reactants[target]

    both = ratio("hypochlorite-on-cyanide", "ClO-", "CN-") + ratio("hypochlorite-on-cyanate", "ClO-", "OCN-")
    assert both * chlorine / cyanogen == pytest.approx(6.82, abs=0.02)


def test_bicarbonate_per_acid(lab: Laboratory):
    """One mole (84.0 g) of sodium bicarbonate a mole of acid (stoichiometry; common practice adds a little until it no longer foams)."""
    waste = "1 L of 2 M hydrochloric acid"
    route = route_of(waste, "acid-with-bicarbonate")
    acid = poured(lab, waste, "H+")
    assert acid == pytest.approx(2.0, rel=0.01)
    assert 1.0 <= additions(route, "CO3-2", lab) / acid < 1.1


@pytest.mark.long
def test_peroxide_per_sulfide(lab: Laboratory):
    """Four peroxide a sulfide in alkali: 4.0 g of H2O2 per g of H2S (136.06 / 34.08; common practice of sulfide control)."""
    waste = "1 L of 0.1 M sodium sulfide"
    route = route_of(waste, "sulfide-with-peroxide")
    assert additions(route, "H2O2", lab) / 0.1 == pytest.approx(4 * 1.1, rel=0.01)
    assert 4 * molar_mass(parse_formula("H2O2").atoms) / molar_mass(parse_formula("H2S").atoms) == pytest.approx(
        3.99, abs=0.02
    )


# --- what is not offered ----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("waste", "word"),
    [
        ("1 L of acetone", "organic"),
        ("100 mL of 10 % methanol", "organic"),
        ("500 mL of 0.05 M potassium ferrocyanide", "iron"),
        ("1 L of 0.1 M thallium(I) nitrate", "thallium"),
    ],
)
def test_what_no_bench_treatment_is_sound_for_is_told_with_the_reason(waste: str, word: str):
    report = treated(waste)
    assert report.outcome == "no sound treatment"
    assert not report.routes
    assert any(word in reason.lower() for reason in report.reasons)


def test_the_unknown_cannot_be_said():
    report = treated("1 L of unknown, pH 2")
    assert report.outcome == "cannot say"
    assert report.unrecognised
    assert not report.routes


def test_a_strength_left_open_asks_for_a_measurement():
    report = treated("1 L of household bleach")
    assert not report.routes
    assert report.outcome == "cannot say"
    assert "Measure it" in " ".join(report.reasons)


@pytest.mark.long
def test_uptake_on_iron_hydroxide_is_beyond_the_calculation():
    report = treated("1 L of 0.01 M sodium arsenate")
    assert report.outcome == "cannot say"
    assert not report.routes
    assert "iron(III) hydroxide" in " ".join(report.reasons)


def test_salt_water_needs_nothing():
    assert treated("1 L of 0.1 M sodium chloride").outcome == "nothing to treat"


@pytest.mark.long
def test_a_limit_of_the_user_takes_the_place_of_the_level_of_the_graph(lab: Laboratory):
    report = carboy.treat(MERCURY, "dissolved mercury below 0.05 mg/L")
    for route in report.routes:
        goals = [goal.goal for goal in route.report.goals]
        assert any("0.05 mg/L" in goal for goal in goals)
        assert not any("0.2 mg/L" in goal for goal in goals)


@pytest.mark.long
def test_an_aim_that_cannot_be_reached_gives_no_route():
    report = carboy.treat("1 L of (0.01 M lead nitrate + 0.1 M nitric acid)", "dissolved lead below 1e-12 mg/L")
    assert report.outcome == "no sound treatment"
    assert report.rejected


@pytest.mark.parametrize("text", ["", "4 L of", "dissolved", "1 L of 0.1 M"])
def test_bad_wastes_give_a_sentence(text: str):
    with pytest.raises(carboy.CarboyError):
        carboy.treat(text)


# --- the search -------------------------------------------------------------------------------------------------------


@pytest.mark.long
def test_acid_is_never_offered_while_cyanide_or_sulfide_stands(lab: Laboratory):
    lowering = [item for item in lab.index.treatments.values() if any(stage.action == "lower" for stage in item.stages)]
    assert lowering
    for treatment in lowering:
        for hazard in ("cyanide", "sulfide"):
            if (
                hazard in treatment.takes
            ):  # it has taken the hazard before the pH goes down, and brings no acid even then
                lowered = next(stage for stage in treatment.stages if stage.action == "lower")
                dosed = next(stage for stage in treatment.stages if stage.action == "dose")
                tested = [stage.test for stage in treatment.stages if dosed.order < stage.order < lowered.order]
                assert any(hazard in test for test in tested)
                assert "acid" not in lowered.reagent
            else:
                assert not applies(treatment, frozenset({hazard, *treatment.takes}))


@pytest.mark.long
def test_oxidisers_and_sulfide_are_not_brought_together(lab: Laboratory):
    for key in ("metals-as-sulfide", "metals-as-sulfide-in-hydroxide"):
        for oxidiser in ("hypochlorite", "permanganate", "peroxide", "chromium-vi"):
            assert not applies(lab.index.treatments[key], frozenset({"mercury-ii", oxidiser}))


def test_states_follow_the_records(lab: Laboratory):
    chromate = lab.index.treatments["chromate-with-bisulfite"]
    assert after(chromate, frozenset({"chromium-vi", "base"})) == {"chromium-iii", "acid"}
    graph = state_graph(frozenset({"chromium-vi", "acid"}), lab.index)
    assert frozenset() in graph
    first = next(sequences(frozenset({"chromium-vi", "acid"}), lab.index, 1))
    assert first[0].startswith("chromate-")


def test_every_reagent_of_the_records_is_known(lab: Laboratory):
    for treatment in lab.index.treatments.values():
        for stage in treatment.stages:
            if stage.reagent:
                amount = "1 L" if stage.reagent[0].isdigit() else "1 g"
                portion = parse_portion(f"{amount} of {stage.reagent}", lab.names)
                assert not portion.unrecognised, stage.reagent
                if stage.agent:
                    assert poured(lab, f"{amount} of {stage.reagent}", stage.agent) > 0
            assert all(np.isfinite(demand.mol_per_mol) and demand.mol_per_mol > 0 for demand in stage.demands)


def test_every_hazard_has_a_treatment_or_a_reason(lab: Laboratory):
    assert set(lab.index.hazards) - must_go(lab.index) == {"ammonia", "complexant"}
