"""Changes that are offered clear the case by an independent call of the engine, and what cannot be mended is kept apart."""

from __future__ import annotations

from functools import cache
from pathlib import Path

import pytest

from carboy.model.plan import Add, Case, Cover, Filter
from carboy.planning.edits import pours_into
from carboy.planning.repair import MOST_TRIED, Mending
from carboy.text.case_writer import case_text
from carboy.text.cases import read_case
from carboy.vetting import Laboratory, laboratory

CASES = Path(__file__).parents[2] / "cases"


@cache
def mended(stem: str) -> list[Mending]:
    lab = laboratory()
    tried = []
    found = lab.mend(read_case(CASES / f"{stem}.yaml", lab.names), lambda number, total: tried.append((number, total)))
    assert len(tried) <= MOST_TRIED
    return found


def kinds(case: Case) -> list[str]:
    return [step.kind for step in case.steps]


def dangers(case: Case) -> list[tuple[str, list[str]]]:
    return [(one.kind, one.species) for one in laboratory().vet(case).findings if one.signal == "danger"]


REFUSED = (
    "mercury-sulfide-before-neutralising",
    "mercury-polish-on-the-sludge",
    "bicarbonate-and-acid-sealed",
    "water-onto-sulfuric-acid",
    "acid-neutralised-at-once",
    "azide-and-lead-rests",
    "fixer-and-acid",
)


@pytest.mark.long
@pytest.mark.parametrize("stem", REFUSED)
def test_each_offer_is_clear_when_vetted_by_itself(stem):
    other = Laboratory(laboratory().index, laboratory().rules)
    base = other.vet(read_case(CASES / f"{stem}.yaml", other.names))
    assert base.verdict == "refuse"
    offers = mended(stem)
    assert 1 <= len(offers) <= 6
    for offer in offers:
        assert offer.changes
        case = read_case(offer.text(), other.names)
        assert case_text(case) == case_text(offer.case)
        report = other.vet(case)
        assert report.verdict == offer.verdict
        assert report.verdict in ("conditional", "no objection")
        assert [one for one in report.findings if one.signal == "danger"] == []
        assert len(report.goals) == len(base.goals)
        for new, old in zip(report.goals, base.goals, strict=True):
            assert new.met or not old.met


@pytest.mark.long
def test_sulfide_waits_for_the_neutralising():
    first = mended("mercury-sulfide-before-neutralising")[0]
    poured = [step.portion.text if step.portion else step.source for step in first.case.steps]
    assert poured.index("190 g of sodium bicarbonate") < poured.index("252 mL of 0.5 M sodium sulfide")
    assert len(first.changes) == 1


@pytest.mark.long
def test_base_is_offered_before_the_sulfide_too():
    lab = laboratory()
    bases = {one.substance for one in lab.index.repair_reagents if one.serves == "base"}

    def adds_base(offer: Mending) -> bool:
        new = [step for step in offer.case.steps if isinstance(step, Add) and step.portion is not None]
        words = {item.reference for step in new for item in step.portion.ingredients if step.portion.text not in OLD}
        return any(f"substance:{one}" in words for one in bases)

    OLD = {"190 g of sodium bicarbonate", "252 mL of 0.5 M sodium sulfide"}
    assert any(adds_base(offer) for offer in mended("mercury-sulfide-before-neutralising"))


@pytest.mark.long
def test_polish_comes_after_the_filter_and_reaches_the_goal():
    first = mended("mercury-polish-on-the-sludge")[0]
    filtering = next(place for place, step in enumerate(first.case.steps) if isinstance(step, Filter))
    polish = next(
        place
        for place, step in enumerate(first.case.steps)
        if isinstance(step, Add) and step.portion is not None and "hypochlorite" in step.portion.text
    )
    assert polish > filtering
    assert first.case.steps[polish].to == "jug"
    assert all(goal.met for goal in first.report.goals)


def test_closed_bottle_is_vented_or_opened():
    for offer in mended("bicarbonate-and-acid-sealed"):
        assert offer.apart or offer.case.vessels[0].cover in ("open", "vented")


def test_acid_goes_into_the_water():
    first = mended("water-onto-sulfuric-acid")[0]
    assert [step.portion.text for step in first.case.steps] == ["1 L of water", "100 mL of 96 % sulfuric acid"]
    assert first.case.steps[1].over is not None
    assert not any(offer.apart for offer in mended("water-onto-sulfuric-acid"))  # water needs no waste stream


@pytest.mark.long
def test_fast_bicarbonate_goes_in_slowly_or_into_a_larger_vessel():
    offers = mended("acid-neutralised-at-once")
    assert any(offer.case.steps[1].over.low > 60.0 for offer in offers if not offer.apart)
    assert any(offer.case.vessels[0].volume.low > 20.0 for offer in offers)


@pytest.mark.long
def test_azide_and_lead_are_only_kept_apart():
    offers = mended("azide-and-lead-rests")
    assert [bool(offer.apart) for offer in offers] == [True]
    assert len(pours_into(offers[0].case, "bottle")) == 1
    assert "labelled bottle" in offers[0].apart


@pytest.mark.long
def test_bleach_and_ammonia_never_meet_as_they_are():
    """Thinned, cooled or slowed bleach makes the same chloramine: it is taken away first, or kept out."""
    for offer in mended("bleach-and-ammonia"):
        made = [one for one in offer.report.findings if one.species == ["NH2Cl"] and one.signal != "note"]
        assert made == []


def test_seal_becomes_a_vent():
    first = mended("peroxide-waste-capped-later")[0]
    covers = [step.kind for step in first.case.steps if isinstance(step, Cover)]
    assert covers in (["vent"], ["open"])
    assert dangers(first.case) == []


def test_nothing_is_mended_where_nothing_is_wrong():
    assert mended("harmless-dilution") == []
    assert mended("unrecognised-bottle") == []


@pytest.mark.long
def test_bottles_poured_together_are_mended_with_what_standing_does():
    lab = laboratory()
    offers = lab.mend_together(("500 mL of 1 M hydrochloric acid", "200 mL of 1 M sodium thiosulfate"))
    assert offers
    for offer in offers:
        report = lab.vet_left_standing(read_case(offer.text(), lab.names))
        assert [one for one in report.findings if one.signal == "danger"] == []


@pytest.mark.long
def test_smallest_change_comes_first():
    for stem in REFUSED:
        offers = [offer for offer in mended(stem) if not offer.apart]
        assert [len(offer.changes) for offer in offers] == sorted(len(offer.changes) for offer in offers)
