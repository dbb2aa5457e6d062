"""What a variable can stand for, and in which lanes a condition holds."""

from __future__ import annotations

import pytest

from carboy.chemistry.balance import balance
from carboy.errors import RuleError
from carboy.reasoning.binding import Surroundings, View
from carboy.reasoning.firing import BoundReaction, bind_reaction
from carboy.vetting import laboratory
from tests.bench.reports import bottle, walked
from tests.reasoning.small_book import rules


def bound(equation: str, needs: str = "?m is metal", **binding: str) -> BoundReaction:
    (rule,) = rules(f"a-test\n  needs   {needs}\n  does    {equation}")
    return bind_reaction(rule.does[0], {"?" + name: token for name, token in binding.items()}, laboratory().stock)


# --- balance ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("metal", "counts"),
    [
        ("zinc", {"zinc": 1, "H+": 2, "Zn+2": 1, "H2": 1}),
        ("magnesium", {"magnesium": 1, "H+": 2, "Mg+2": 1, "H2": 1}),
        ("aluminium", {"aluminium": 2, "H+": 6, "Al+3": 2, "H2": 3}),
    ],
)
def test_balance_follows_the_charge_of_what_is_bound(metal: str, counts: dict[str, float]) -> None:
    found = bound("?m + H+ -> ?m.ion + H2, balanced", m=metal)
    shown = dict(found.reactants) | dict(found.products)
    scale = counts[metal] / shown[metal]
    assert {token: count * scale for token, count in shown.items()} == pytest.approx(counts)


@pytest.mark.parametrize(
    ("equation", "counts"),
    [
        ("MnO4- + Fe+2 + H+ -> Mn+2 + Fe+3 + H2O, balanced", [1, 5, 8, 1, 5, 4]),
        ("CrO4-2 + SO3-2 + H+ -> Cr+3 + SO4-2 + H2O, balanced", [2, 3, 10, 2, 3, 5]),
        ("ClO- + HS- -> Cl- + SO4-2 + H+, balanced", [4, 1, 4, 1, 1]),
        ("S2O3-2 + ClO- + H2O -> SO4-2 + Cl- + H+, balanced", [1, 4, 1, 2, 4, 2]),
        ("NO2- + I- + H+ -> NO + I2 + H2O, balanced", [2, 2, 4, 2, 1, 2]),
    ],
)
def test_balance_of_redox(equation: str, counts: list[float]) -> None:
    found = bound(equation, needs="H+ present")
    numbers = [count for _, count in (*found.reactants, *found.products)]
    assert [number * counts[0] / numbers[0] for number in numbers] == pytest.approx(counts)


def test_change_is_told_in_components() -> None:
    # Cl2 in water is ClO- + Cl- + 2 H+ - H2O
    found = bound("Cl2 + HS- + H2O -> S2O3-2 + Cl- + H+, balanced", needs="H+ present")
    assert set(found.change) <= {"ClO-", "Cl-", "HS-", "S2O3-2", "H+", "H2O"}
    assert found.change["HS-"] / found.change["ClO-"] == pytest.approx(
        0.5
    )  # 4 Cl2 (8 e-) to 2 HS- (8 e- to thiosulfate)


def test_no_coefficients_where_none_exist() -> None:
    with pytest.raises(RuleError):
        bound("?m -> ?m.ion, balanced", m="zinc")
    with pytest.raises(RuleError):
        bound("Cl- -> ClO-, balanced", needs="H+ present")


def test_given_coefficients_must_balance() -> None:
    with pytest.raises(RuleError, match="balance"):
        bound("?m + H+ -> ?m.ion + H2", m="zinc")
    found = bound("?m + 2 H+ -> ?m.ion + H2", m="zinc")
    assert dict(found.reactants) == {"zinc": 1, "H+": 2}


def test_a_part_that_the_graph_lacks_is_an_error() -> None:
    with pytest.raises(RuleError, match="ion"):
        bound("?m + 2 H+ -> ?m.ion + H2", needs="?m is HS-", m="HS-")


def test_balance_keeps_what_is_fixed() -> None:
    # 2 H2 + O2 -> 2 H2O with the water at 1
    sides = [({"H": 2.0}, 0), ({"O": 2.0}, 0)], [({"H": 2.0, "O": 1.0}, 0)]
    assert [float(one) for one in balance(*sides, fixed={2: 1.0})] == pytest.approx([1.0, 0.5, 1.0])


# --- binding ---------------------------------------------------------------------------------------------------


def view(*portions: str) -> View:
    content = bottle(portions[0]) if len(portions) == 1 else walked(*portions).steps[-1].after
    return View(content, Surroundings())


def tokens(*portions: str, needs: str) -> set[tuple[str, ...]]:
    (rule,) = rules(f"a-test\n  needs   {needs}\n  flags   heat")
    return {tuple(carrier.token for carrier in one.values()) for one in view(*portions).bindings(rule)}


def test_a_class_binds_all_its_members() -> None:
    metals = tokens("1 L of (0.1 M zinc sulfate + 0.1 M nickel sulfate)", needs="?m is Zn+2 or Ni+2, dissolved")
    assert metals == {("Zn+2",), ("Ni+2",)}


def test_two_variables_are_never_one_thing() -> None:
    pairs = tokens(
        "1 L of (0.1 M zinc sulfate + 0.1 M nickel sulfate)", needs="?a is Zn+2 or Ni+2\n          ?b is Zn+2 or Ni+2"
    )
    assert pairs == {("Zn+2", "Ni+2"), ("Ni+2", "Zn+2")}


def test_exclusion() -> None:
    assert tokens("1 L of (0.1 M zinc sulfate + 0.1 M nickel sulfate)", needs="?m is Zn+2 or Ni+2 but not Zn+2") == {
        ("Ni+2",)
    }


def test_phase_asked_for() -> None:
    assert tokens("5 g of zinc powder", needs="?m is metal, solid") == {("zinc",)}
    assert not tokens("1 L of 0.1 M zinc sulfate", needs="?m is metal, solid")


def test_a_metal_is_not_dissolved() -> None:
    assert not tokens("5 g of zinc powder", needs="?m is metal, dissolved")


def test_a_sludge_made_on_the_way_is_there_to_be_bound() -> None:
    made = ("1 L of 0.01 M mercury(II) chloride", "1 L of 0.012 M sodium sulfide")
    assert ("metacinnabar",) in tokens(*made, needs="?s is metal-sulfide, solid")
    assert not tokens(made[0], needs="?s is metal-sulfide, solid")


# --- conditions ------------------------------------------------------------------------------------------------


def holds(condition: str, *portions: str) -> list[bool]:
    (rule,) = rules(f"a-test\n  needs   {condition}\n  flags   heat")
    return list(view(*portions).holds(rule.needs[0], {}))


def test_pH_condition() -> None:
    acid = "1 L of 0.1 M hydrochloric acid"  # pH 1.11
    assert holds("pH below 2", acid) == [True]
    assert holds("pH above 2", acid) == [False]
    assert holds("pH between 1 and 1.2", acid) == [True]
    assert holds("pH below 2", "50 mL of acetone") == [False]  # no pH, so no


def test_strength_is_of_the_whole_liquid_and_over_the_range() -> None:
    kept = holds("strength of Cl- above 2 M", "1 L of 1-4 M hydrochloric acid")
    strength = bottle("1 L of 1-4 M hydrochloric acid").total("Cl-")
    assert kept == list(strength > 2.0)
    assert {True, False} == set(map(bool, kept))


@pytest.mark.parametrize(
    ("condition", "label", "met"),
    [
        ("amount of Cl- at least 0.5 mol", "500 mL of 1 M sodium chloride", True),
        ("amount of Cl- above 0.51 mol", "500 mL of 1 M sodium chloride", False),
        ("mass of sodium-chloride above 5.8 g", "100 mL of 1 M sodium chloride", True),
        ("mass of sodium-chloride above 5.9 g", "100 mL of 1 M sodium chloride", False),
        ("mass fraction of acetone above 99 %", "50 mL of acetone", True),
        ("water fraction below 20 %", "1 L of 96 % sulfuric acid", True),
        ("water fraction below 20 %", "1 L of 10 % sulfuric acid", False),
        ("ratio of Cl- to Na+ at least 1.99", "1 L of (1 M sodium chloride + 1 M hydrochloric acid)", True),
        ("ratio of Cl- to Na+ above 2.01", "1 L of (1 M sodium chloride + 1 M hydrochloric acid)", False),
        ("HS- present", "1 L of 0.1 M sodium sulfide", True),
        ("HS- present", "1 L of 0.1 M sodium sulfate", False),
        ("no HS-", "1 L of 0.1 M sodium sulfate", True),
        ("no HS-", "1 L of 0.1 M sodium sulfide", False),
        ("no metal, solid", "1 L of 0.1 M zinc sulfate", True),
        ("no metal, solid", "5 g of zinc powder", False),
    ],
)
def test_figures_and_absence(condition: str, label: str, met: bool) -> None:
    assert holds(condition, label) == [met]


def test_cover_and_container() -> None:
    content = bottle("1 L of 1 M hydrochloric acid")
    steel = Surroundings(cover="sealed", container="stainless-steel", container_words=frozenset({"stainless-steel"}))
    (rule,) = rules("a-test\n  needs   cover is sealed\n          container is not glass\n  flags   heat")
    assert all(View(content, steel).holds(one, {}).all() for one in rule.needs)
    assert not any(View(content, Surroundings()).holds(one, {}).any() for one in rule.needs)


def test_oxidation_state_and_charge() -> None:
    (rule,) = rules("a-test\n  needs   ?m is Fe+2 or Fe+3\n          oxidation state of ?m is 3\n  flags   heat")
    there = view("1 L of (0.1 M iron(II) sulfate + 0.1 M iron(III) chloride)")
    met = {one["?m"].token for one in there.bindings(rule) if there.holds(rule.needs[1], one).all()}
    assert met == {"Fe+3"}
