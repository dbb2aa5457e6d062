"""How far a rule goes: until a reactant, its share, or its own condition ends."""

from __future__ import annotations

import pytest

from tests.reasoning.small_book import extent, firings, rules, walk

METAL = """dissolve-metal
  needs   ?m is active-metal, solid
          pH below 3
  does    ?m + H+ -> ?m.ion + H2, balanced
  speed   minutes"""


def test_metal_limits() -> None:
    # 1 g / 65.38 = 0.0153 mol; acid 0.2 mol
    done = walk(rules(METAL), "1 g of zinc powder", "100 mL of 2 M hydrochloric acid")
    assert extent(done) == pytest.approx(1 / 65.38, rel=1e-3)
    assert done.steps[1].after.total("zinc") == pytest.approx(0.0, abs=1e-9)
    assert done.steps[1].after.total("H2") == pytest.approx(1 / 65.38, rel=1e-3)


def test_strong_acid_limits() -> None:
    # 10 g / 65.38 = 0.153 mol; acid 0.02 mol, of which 10**-3 / 0.89 x 0.2 L stays: (0.02 - 0.0002) / 2
    done = walk(rules(METAL), "10 g of zinc powder", "200 mL of 0.1 M hydrochloric acid")
    assert extent(done) == pytest.approx((0.02 - 0.00023) / 2, rel=0.01)
    assert done.steps[1].after.pH == pytest.approx(3.0, abs=0.02)


def test_weak_acid_gives_its_protons_until_the_condition_fails() -> None:
    # 1 L of 0.1 M acetic acid (pKa 4.757) until pH 4. At I near 0.03: log gamma -0.073, K' = 10**(-4.757 + 0.146) =
    # 2.45e-5, h = 1.18e-4; free acetate 2.45e-5 / (2.45e-5 + 1.18e-4) = 17 % = 0.017 mol; each Mg2+ takes two
    # protons: 2 x = 0.017 + the acetate bound to magnesium (log K 1.27: 0.0015) less free acid 0.0001: x = 0.009.
    # By free protons alone (pH 2.9: 0.0013 mol) x would be 0.0007.
    book = rules(METAL.replace("pH below 3", "pH below 4"))
    done = walk(book, "5 g of magnesium", "1 L of 0.1 M acetic acid")
    assert done.steps[1].after.pH == pytest.approx(4.0, abs=0.02)
    assert extent(done) == pytest.approx(0.009, rel=0.1)


def test_base_limits() -> None:
    # Al + OH- + 3 H2O -> Al(OH)4- + 1.5 H2: until pH 13
    book = rules("""dissolve-aluminium
  needs   aluminium present, solid
          pH above 13
  does    aluminium + H2O -> Al+3 + H2 + OH-, balanced
  speed   minutes""")
    done = walk(book, "50 g of aluminium powder", "1 L of 1 M sodium hydroxide")
    # OH- left at pH 13: 0.1 / 0.75 = 0.13 mol; 0.87 mol of OH- gone into Al(OH)4-
    assert done.steps[1].after.pH == pytest.approx(13.0, abs=0.03)
    assert extent(done) == pytest.approx(0.87 / per_aluminium(done), rel=0.05)


def per_aluminium(done) -> float:  # type: ignore[no-untyped-def]
    """mol of aluminium in one unit of the reaction."""
    return next(count for token, count in firings(done, 2)[0].reaction.reactants if token == "aluminium")


CHLORAMINE = """make-chloramine
  needs   NH4+ present
          ClO- present
          pH above 7
  does    NH4+ + ClO- -> NH2Cl + H2O{share}"""
AMMONIA, BLEACH = "100 mL of 0.2 M ammonia", "100 mL of (0.1 M sodium hypochlorite + 0.1 M sodium hydroxide)"


def test_reactants_one_to_one() -> None:
    done = walk(rules(CHLORAMINE.format(share="")), AMMONIA, BLEACH)
    assert extent(done) == pytest.approx(0.01, rel=1e-4)
    assert done.steps[1].after.total("NH2Cl") == pytest.approx(0.01, rel=1e-4)
    assert done.steps[1].after.total("NH4+") == pytest.approx(0.01, rel=1e-3)


def test_share_of_conversion() -> None:
    # a quarter to a half of the scarcer reactant: the state follows the most, the record keeps both
    done = walk(rules(CHLORAMINE.format(share=", share 0.25 to 0.5")), AMMONIA, BLEACH)
    assert extent(done) == pytest.approx(0.005, rel=1e-4)
    assert done.steps[1].after.total("ClO-") == pytest.approx(0.005, rel=1e-3)
    assert {one.share for one in firings(done, 2)} == {(0.25, 0.5)}


def test_no_reaction_beyond_its_condition() -> None:
    done = walk(
        rules(CHLORAMINE.format(share="")), "100 mL of 0.2 M ammonium chloride", "100 mL of 0.05 M hydrochloric acid"
    )
    assert not firings(done, 2)


def test_extent_grows_along_the_dose_with_what_is_poured() -> None:
    done = walk(rules(CHLORAMINE.format(share="")), AMMONIA, BLEACH)
    path = done.steps[1].path
    assert path is not None
    made = path.mixture.total("NH2Cl")
    assert made == pytest.approx(0.01 * path.fractions, rel=1e-3)


def test_branches_by_ratio() -> None:
    book = rules("""branched
  needs   NH4+ present
          ClO- present
  does    NH4+ + ClO- -> NH2Cl + H2O when ratio of ClO- to NH4+ at most 1
          2 NH4+ + 3 ClO- -> N2 + 3 Cl- + 3 H2O + 2 H+ when ratio of ClO- to NH4+ above 1.5""")
    little = walk(book, "100 mL of 0.2 M ammonia", "100 mL of 0.1 M sodium hypochlorite")
    assert little.steps[1].after.total("N2") == pytest.approx(0.0, abs=1e-9)
    turned = walk(book, "100 mL of 0.4 M sodium hypochlorite", "100 mL of 0.01 M ammonia")
    # the first drops of ammonia meet a great excess: nitrogen, 1 from 2 ammonia
    assert turned.steps[1].after.total("N2") == pytest.approx(0.0005, rel=1e-3)
    assert turned.steps[1].after.total("NH2Cl") == pytest.approx(0.0, abs=1e-9)


def test_chain_of_three_runs_through() -> None:
    # iodide to iodine by hypochlorite, iodine taken by thiosulfate is left out: I- -> IO- -> IO3- stand-in by known
    # oxidations
    book = rules(
        """first
  needs   HS- present
          ClO- present
  does    HS- + ClO- -> sulfur + Cl- + OH-""",
        """second
  needs   sulfur present
          ClO- present
  does    sulfur + 2 ClO- + H2O -> SO3-2 + 2 Cl- + 2 H+""",
        """third
  needs   SO3-2 present
          ClO- present
  does    SO3-2 + ClO- -> SO4-2 + Cl-""",
    )
    done = walk(book, "100 mL of 0.1 M sodium sulfide", "1 L of 0.05 M sodium hypochlorite")
    # 10 mmol of sulfide need 40 mmol of hypochlorite of 50
    assert done.steps[1].after.total("SO4-2") == pytest.approx(0.01, rel=1e-3)
    assert done.steps[1].after.total("ClO-") == pytest.approx(0.01, rel=1e-3)
    assert {one.rule.id for one in firings(done, 2)} == {"first", "second", "third"}


def test_absence_blocks() -> None:
    book = rules(CHLORAMINE.format(share="").replace("ClO- present", "ClO- present\n          no S2O3-2"))
    free = walk(book, AMMONIA, BLEACH)
    held = walk(book, "100 mL of (0.2 M ammonia + 0.1 M sodium thiosulfate)", BLEACH)
    assert firings(free, 2)
    assert not firings(held, 2)


def test_meets_is_of_two_pours() -> None:
    book = rules("""watched
  needs   ?a is NH4+
          ?b is ClO-
          ?a meets ?b
  does    NH4+ + ClO- -> NH2Cl + H2O""")
    poured = walk(book, AMMONIA, BLEACH)
    assert firings(poured, 2)
    later = walk(book, AMMONIA, "100 mL of water", BLEACH)
    assert not firings(later, 2)
    assert firings(later, 3)
    # both on one label: they met in the bottle, long ago
    one_label = walk(book, "100 mL of (0.2 M ammonia + 0.1 M sodium hypochlorite)", "100 mL of water")
    assert not firings(one_label, 2)


def test_a_slow_rule_waits() -> None:
    book = rules(CHLORAMINE.format(share="") + "\n  speed   hours")
    done = walk(book, AMMONIA, BLEACH)
    assert not firings(done, 2)


def test_rules_that_are_off_do_nothing() -> None:
    book = rules(CHLORAMINE.format(share="") + "\n  off     it is a test")
    assert not firings(walk(book, AMMONIA, BLEACH), 2)


def test_over_a_range_each_lane_goes_its_own_way() -> None:
    done = walk(rules(CHLORAMINE.format(share="")), "100 mL of 0.05-0.2 M ammonia", BLEACH)
    made = done.steps[1].after.total("NH2Cl")
    there = done.steps[0].after.total("NH4+")
    assert made == pytest.approx([min(amount, 0.01) for amount in there], rel=1e-3)
    assert made.min() == pytest.approx(0.005, rel=1e-3)
    assert made.max() == pytest.approx(0.01, rel=1e-3)
