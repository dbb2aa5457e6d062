"""What is offered for wastes of each kind: order of the steps, amounts, published figures, and what is left to a contractor."""

from __future__ import annotations

import re

import pytest

from carboy.model.treatment import Route, Stream
from carboy.planning.search import PH, applies
from carboy.text.cases import read_case
from carboy.text.formulas import molar_mass, parse_formula
from carboy.vetting import Laboratory, laboratory
from tests.planning.treating import poured, route_of, treated

COPPER = "1 L of (0.05 M copper sulfate + 0.1 M sulfuric acid)"
SILVER_AMMINE = "1 L of (0.02 M silver nitrate + 1 M ammonia)"
CYANIDE = "1 L of (0.05 M potassium cyanide + 0.1 M sodium hydroxide)"
IODINE = "1 L of 0.05 M iodine"
BROMINE = "1 L of 0.1 M bromine"
CHROMATE = "1 L of (0.02 M potassium dichromate + 0.5 M sulfuric acid)"
PICKLE = "2 L of 0.1 M iron(III) chloride"
MERCURY_I = "1 L of 0.01 M mercury(I) nitrate"
FLUORIDE = "500 mL of 2 % sodium fluoride"
COPPER_EDTA = "1 L of (0.01 M copper(II) sulfate + 0.05 M disodium EDTA)"
COPPER_CITRATE = "1 L of (0.1 M copper sulfate + 0.2 M sodium citrate)"
COD = "500 mL of (0.01 M potassium dichromate + 0.02 M mercury(II) sulfate + 0.02 M silver sulfate + 9 M sulfuric acid)"
CYANIDE_LEAD = "1 L of (0.01 M lead nitrate + 0.05 M sodium cyanide + 0.1 M sodium hydroxide)"
COPPER_AMMINE = "1 L of (0.05 M copper(II) sulfate + 1 M ammonia)"
_WINDOW = re.compile(r", to pH ([\d.]+) to ([\d.]+),")


@pytest.fixture(scope="module")
def lab() -> Laboratory:
    return laboratory()


def additions(route: Route, token: str, lab: Laboratory, treatment: str) -> float:
    """mol of a component that the reagents of one treatment of a route bring."""
    case = read_case(route.case_file, lab.names, file="route")
    return sum(
        poured(lab, step.portion.text, token)
        for place, step in zip(route.steps, case.steps, strict=True)
        if getattr(step, "portion", None) is not None and place.treatment == treatment
    )


def mass(formula: str) -> float:
    return molar_mass(parse_formula(formula).atoms)


def sludge(route: Route) -> Stream:
    return next(stream for stream in route.streams if stream.kind == "sludge")


def clear(route: Route) -> Stream:
    return next(stream for stream in route.streams if stream.kind == "liquid")


# --- the bench: amounts that meet their window, nothing idle ----------------------------------------------------------


@pytest.mark.long
@pytest.mark.parametrize("waste", [COPPER, CHROMATE, IODINE, MERCURY_I, "1 L of 1 M sodium hydroxide", PICKLE])
def test_the_rounded_amount_brings_the_pH_into_its_window(waste: str):
    """The steep part of the curve: 0.05 mL of 1 M base in a litre is half a unit of pH and more."""
    seen = 0
    for route in treated(waste).routes:
        for step in route.steps:
            window = _WINDOW.search(step.action)
            if window is not None and step.pH is not None:
                seen += 1
                assert float(window[1]) - 0.05 <= step.pH[0] <= step.pH[1] <= float(window[2]) + 0.05, step
    assert seen


@pytest.mark.long
@pytest.mark.parametrize("waste", [MERCURY_I, COPPER_AMMINE, COPPER])
def test_nothing_is_stirred_before_something_new_is_in_it(waste: str):
    for route in treated(waste).routes:
        for before, step in zip(route.steps, route.steps[1:], strict=False):
            if step.action.startswith("stir"):
                assert before.action.startswith("add")
                assert before.treatment == step.treatment


def test_a_small_dose_is_told_in_drops():
    words = [step.action for route in treated(MERCURY_I).routes for step in route.steps if "drops" in step.action]
    assert words
    for action in words:
        millilitres, drops = re.search(r"([\d.]+) mL \((\d+) drops\)", action).groups()  # type: ignore[union-attr]
        assert float(millilitres) < 1
        assert int(drops) == pytest.approx(20 * float(millilitres), abs=1)  # 20 drops a millilitre, common practice


@pytest.mark.long
def test_acid_that_is_there_already_is_not_added():
    """0.5 M sulfuric acid holds more than the 2.5 acid per chromium(VI) of the reduction with bisulfite."""
    for route in treated(CHROMATE).routes:
        assert not any("sulfuric acid" in step.action for step in route.steps)
    with_less = treated("2 L of (0.005 M potassium dichromate + 0.02 M sulfuric acid)")
    assert any("sulfuric acid" in step.action for route in with_less.routes for step in route.steps)


def test_what_came_down_on_the_way_is_filtered_off():
    """A litre of 0.1 M iron(III) neutralised is no clear liquid for a drain: 10.7 g of iron(III) hydroxide stand in it."""
    for route in treated(PICKLE).routes:
        assert sum(high for _, high in sludge(route).solids_g.values()) == pytest.approx(
            0.2 * mass("Fe(OH)3"), rel=0.05
        )
        assert "contractor" in sludge(route).goes_to


@pytest.mark.long
@pytest.mark.parametrize("waste", [CYANIDE, COPPER, MERCURY_I])
def test_routes_do_not_differ_in_their_last_step_only(waste: str, lab: Laboratory):
    report = treated(waste)
    manners: dict[frozenset[str], int] = {}
    for route in report.routes:
        takers = frozenset(
            key
            for key in route.treatments
            if {
                lab.index.hazards[hazard].name for hazard in set(lab.index.treatments[key].takes) - set(PH)
            }.intersection(report.hazards)
        )
        manners[takers] = manners.get(takers, 0) + 1
    assert max(manners.values()) <= 2


# --- order --------------------------------------------------------------------------------------------------------------


@pytest.mark.long
def test_silver_in_ammonia_meets_salt_before_acid_and_never_stands_dissolved(lab: Laboratory):
    route = route_of(SILVER_AMMINE, "silver-as-chloride-in-acid")
    actions = [step.action for step in route.steps]
    salt = next(place for place, action in enumerate(actions) if "sodium chloride" in action)
    acid = next(place for place, action in enumerate(actions) if "sulfuric acid" in action)
    stand = next(place for place, action in enumerate(actions) if action.startswith("stand"))
    assert salt < acid < stand
    assert any("people trained" in danger for danger in route.dangers)
    # 1.329 g of AgCl to a gram of silver (gravimetric factor, CRC Handbook, from memory)
    assert sludge(route).solids_g["AgCl"][0] / (0.02 * mass("Ag")) == pytest.approx(1.329, abs=0.002)
    for other in treated(SILVER_AMMINE).routes:
        assert not [finding for finding in other.report.findings if finding.kind == "explosive"]


@pytest.mark.long
@pytest.mark.parametrize("waste", [IODINE, BROMINE])
def test_sulfite_meets_a_halogen_with_bicarbonate_beside_it(waste: str):
    """X2 + sulfite make two of acid; without base the pH falls to 1.5 and sulfur dioxide comes off."""
    for route in treated(waste).routes:
        after = [step for step in route.steps if "sodium sulfite" in step.action]
        assert after
        assert all(step.pH is not None and step.pH[0] > 5.5 for step in after)
        assert not [
            finding for finding in route.report.findings if finding.kind == "toxic-gas" and finding.signal != "note"
        ]


@pytest.mark.long
def test_mercury_i_is_oxidised_in_acid_so_that_no_metal_splits_off():
    for route in treated(MERCURY_I).routes:
        for step in route.steps:
            if "sodium hypochlorite" in step.action:
                assert step.pH is not None
                assert step.pH[1] < 4
        assert not [finding for finding in route.report.findings if finding.kind == "toxic-product"]


@pytest.mark.long
def test_the_second_step_of_chlorination_comes_after_the_first_and_without_acid(lab: Laboratory):
    route = route_of(CYANIDE, "cyanide-to-nitrogen")
    bleach = [step for step in route.steps if "hypochlorite" in step.action]
    assert len(bleach) == 2
    assert bleach[0].pH is not None
    assert bleach[0].pH[0] > 11
    assert bleach[1].pH is not None
    assert 8 < bleach[1].pH[0] < 9.5
    assert not any("acid" in step.action for step in route.steps)


# --- published figures --------------------------------------------------------------------------------------------------


@pytest.mark.long
def test_chlorine_demand_of_both_steps(lab: Laboratory):
    """6.82 g of chlorine to a gram of CN as far as nitrogen (US EPA, Managing Cyanide in Metal Finishing, 2000; Patterson; from memory)."""
    route = route_of(CYANIDE, "cyanide-to-nitrogen")
    cyanide = poured(lab, CYANIDE, "CN-") * mass("CN")
    dosed = additions(route, "ClO-", lab, "cyanide-to-nitrogen")
    quench = next(stage for stage in lab.index.treatments["hypochlorite-with-sulfite"].stages if stage.agent == "SO3-2")
    left = additions(route, "SO3-2", lab, "hypochlorite-with-sulfite") / quench.excess
    assert (dosed - left) * mass("Cl2") / cyanide == pytest.approx(6.82, abs=0.03)
    assert 6.82 < dosed * mass("Cl2") / cyanide < 1.1 * 6.82


def test_sulfite_per_peroxide(lab: Laboratory):
    """3.71 g of sodium sulfite to a gram of hydrogen peroxide (126.04 / 34.01, one to one; common practice of dechlorination and the like)."""
    waste = "1 L of 3 % hydrogen peroxide"
    route = route_of(waste, "peroxide-with-sulfite")
    dosed = additions(route, "SO3-2", lab, "peroxide-with-sulfite") / 1.02
    assert dosed * mass("Na2SO3") / (poured(lab, waste, "H2O2") * mass("H2O2")) == pytest.approx(3.71, abs=0.02)


def test_calcium_per_fluoride(lab: Laboratory):
    """2.05 g of CaF2 to a gram of fluoride (78.07 / 38.00); 10 to 20 mg/L are left by lime in practice (Patterson, from memory)."""
    route = route_of(FLUORIDE, "fluoride-with-calcium")
    fluoride = poured(lab, FLUORIDE, "F-")
    assert sludge(route).solids_g["CaF2"][0] / (fluoride * mass("F")) == pytest.approx(2.05, abs=0.02)
    assert clear(route).mg_L["F"][1] < 20
    assert additions(route, "Ca+2", lab, "fluoride-with-calcium") / fluoride == pytest.approx(0.75, rel=0.01)


@pytest.mark.long
@pytest.mark.parametrize(
    ("waste", "treatment", "metal", "published"),
    [
        (COPPER, "metals-as-hydroxide-near-9", "Cu(II)", 0.022),
        ("1 L of 0.05 M zinc chloride", "metals-as-hydroxide-near-9", "Zn", 1.1),
        ("1 L of 0.05 M nickel sulfate", "metals-as-hydroxide-near-10", "Ni", 0.0069),
        ("1 L of 0.05 M cobalt(II) chloride", "metals-as-hydroxide-near-10", "Co", 0.22),
    ],
)
def test_what_hydroxide_leaves(waste: str, treatment: str, metal: str, published: float):
    """Lowest solubilities of the hydroxides (US EPA 625/8-80-003, Sulfide Precipitation, 1980, from memory): the same decade or the next."""
    left = clear(route_of(waste, treatment)).mg_L[metal][1]
    assert published / 12 < left < published * 12


@pytest.mark.long
@pytest.mark.parametrize(
    ("waste", "metal"),
    [
        ("1 L of 0.05 M zinc chloride", "Zn"),
        ("1 L of 0.02 M cadmium nitrate", "Cd"),
        ("1 L of 0.02 M lead nitrate", "Pb"),
    ],
)
def test_sulfide_leaves_less_than_hydroxide_or_carbonate(waste: str, metal: str):
    """The first statement of the same EPA report: each of these sulfides is less soluble than its hydroxide."""
    routes = treated(waste).routes
    as_sulfide = [route for route in routes if any("sulfide" in key for key in route.treatments)]
    others = [route for route in routes if route not in as_sulfide]
    assert as_sulfide
    assert others
    for route in as_sulfide:
        assert clear(route).mg_L.get(metal, (0.0, 0.0))[1] < min(clear(other).mg_L[metal][0] for other in others)


# --- what binds the metal -----------------------------------------------------------------------------------------------


@pytest.mark.long
@pytest.mark.parametrize("waste", [COPPER_EDTA, COPPER_CITRATE])
def test_edta_and_citrate_hold_copper_against_hydroxide_but_not_against_sulfide(waste: str, lab: Laboratory):
    """Benedict's reagent is copper that citrate keeps dissolved in soda."""
    report = treated(waste)
    assert report.routes
    assert all(any("sulfide" in key for key in route.treatments) for route in report.routes)
    for key in ("metals-as-hydroxide-near-9", "metals-as-hydroxide-near-10", "metals-as-carbonate"):
        assert applies(lab.index.treatments[key], frozenset({"copper"}))
        assert not applies(lab.index.treatments[key], frozenset({"copper", "complexant"}))


@pytest.mark.long
def test_edta_holds_nickel_against_both():
    """Nickel(II) edetate, log K 18.6 (Martell and Smith, from memory), outbids the fresh sulfide; it leaves by a contractor."""
    report = treated("1 L of (0.01 M nickel sulfate + 0.05 M disodium EDTA)")
    assert report.outcome == "no sound treatment"
    assert not report.routes


@pytest.mark.long
def test_ammonia_holds_copper_against_hydroxide_but_not_against_sulfide(lab: Laboratory):
    report = treated(COPPER_AMMINE)
    assert report.routes
    assert all(any("sulfide" in key for key in route.treatments) for route in report.routes)
    state = frozenset({"copper", "ammonia", "base"})
    assert not applies(lab.index.treatments["metals-as-hydroxide-near-9"], state)


# --- what is left to a contractor ---------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("waste", "word"),
    [
        ("1 L of 0.5 % glutaraldehyde", "organic"),
        ("500 mL of 0.1 % ethidium bromide", "organic"),
        ("1 L of 0.05 % phenol", "organic"),
        ("500 mL of 1 % picric acid", "energetic"),
        ("1 L of 0.02 M sodium selenate", "selenate"),
        ("1 L of 0.5 M sodium chlorate", "chlorate"),
        ("1 L of 0.1 M potassium thiocyanate", "thiocyanate"),
        ("1 L of 0.1 M hydrazine sulfate", "hydrazine"),
        ("1 L of 1 M sodium nitrite", "nitrite"),
        ("1 L of 0.02 M antimony trichloride", "antimony"),
        ("1 L of 0.01 M methylmercury chloride", "carbon"),
    ],
)
def test_what_no_record_is_for_is_said_and_why(waste: str, word: str):
    report = treated(waste)
    assert report.outcome == "no sound treatment"
    assert not report.routes
    assert any(word in reason.lower() for reason in report.reasons)


@pytest.mark.parametrize(
    ("waste", "stays", "against"),
    [
        ("1 L of (0.02 M nickel sulfate + 0.1 M sodium cyanide + 0.1 M sodium hydroxide)", "Cyanide", "nickel"),
        ("1 L of (0.01 M sodium azide + 0.01 M copper sulfate)", "Azide", "copper"),
    ],
)
def test_where_one_thing_forbids_the_treatment_of_another_it_is_named(waste: str, stays: str, against: str):
    report = treated(waste)
    assert report.outcome == "no sound treatment"
    assert any(
        reason.startswith(stays) and against in reason.partition("not sound beside")[2] for reason in report.reasons
    )


def test_formaldehyde_has_its_own_treatment_and_does_not_count_as_other_organic_matter():
    report = treated("200 mL of 4 % formaldehyde")
    assert report.hazards == ["formaldehyde"]
    assert any("formaldehyde-with-hypochlorite" in route.treatments for route in report.routes)


def test_a_waste_too_large_for_a_hood_is_split_into_equal_portions(lab: Laboratory):
    report = treated("2 L of 4 % formaldehyde")
    assert report.waste == "2 L of 4 % formaldehyde"
    assert "equal portions" in report.reasons[0]
    parts = int(re.search(r"one of (\d+)", report.reasons[0])[1])  # type: ignore[index]
    for route in report.routes:
        case = read_case(route.case_file, lab.names, file="route")
        assert case.bottles["waste"].amount.high == pytest.approx(2.0 / parts)
        assert route.vessel_L <= 50


@pytest.mark.long
@pytest.mark.parametrize("waste", [COD, PICKLE, CYANIDE_LEAD])
def test_no_sludge_is_empty(waste: str):
    routes = treated(waste).routes
    assert routes
    for route in routes:
        for stream in route.streams:
            if stream.kind == "sludge":
                assert sum(high for _, high in stream.solids_g.values()) > 0.01


@pytest.mark.long
def test_sulfide_sludge_is_filtered_off_before_an_oxidiser_comes_in():
    """Peroxide and bleach open a metal sulfide again: 0.05 mol of PbS is 12 g and leaves first."""
    routes = treated("1 L of (0.1 M sodium sulfide + 0.05 M lead nitrate)").routes
    assert routes
    for route in routes:
        actions = [step.action for step in route.steps]
        first = next(place for place, action in enumerate(actions) if action.startswith("filter"))
        assert not any("peroxide" in action or "hypochlorite" in action for action in actions[:first])
        assert sludge(route).solids_g["PbS"][0] == pytest.approx(0.05 * mass("PbS"), rel=0.01)


@pytest.mark.long
def test_lead_beside_cyanide_comes_down_after_the_base_is_gone():
    """Plumbite stays dissolved at the pH of the chlorination, 11 and more; lead is at its least near pH 9 to 10 (Patterson, from memory)."""
    routes = treated(CYANIDE_LEAD).routes
    assert routes
    for route in routes:
        before_filter = next(place for place, step in enumerate(route.steps) if step.action.startswith("filter"))
        reached = route.steps[before_filter].pH
        assert reached is not None
        assert 6 < reached[0] < 10.6


def test_a_treatment_that_finds_nothing_adds_nothing():
    """Aqua regia loses its chlorine to the bicarbonate; what would take hypochlorite then stays out, its base too."""
    for route in treated("500 mL of aqua regia").routes:
        for step in route.steps:
            assert not step.treatment.startswith("hypochlorite") or "mL" in step.action or "stir" in step.action


def test_an_indicator_in_its_usual_strength_does_not_stand_in_the_way():
    report = treated("1 L of (0.1 M acetic acid + 0.001 % phenolphthalein)")
    assert report.outcome == "routes found"


def test_azide_says_who_may_do_it(lab: Laboratory):
    route = route_of("1 L of 0.01 M sodium azide", "azide-with-nitrous-acid")
    nitrite = next(place for place, step in enumerate(route.steps) if "nitrite" in step.action)
    acid = next(place for place, step in enumerate(route.steps) if "sulfuric acid" in step.action)
    assert nitrite < acid
    assert any("trained" in note and "contractor" in note for note in route.notes)
    # 1.5 mol of nitrite to 1 of azide (Prudent Practices in the Laboratory, from memory)
    assert additions(route, "NO2-", lab, "azide-with-nitrous-acid") / 0.01 == pytest.approx(1.5, rel=0.01)
