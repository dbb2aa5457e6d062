"""Reaction paths drawn from left to right."""

from __future__ import annotations

from carboy.reports.style import Style, columns_of
from carboy.reports.tree import drawn
from tests.reports.made_report import ACID, MEETING, SULFIDE, step


def test_two_labels_meet():
    assert drawn([SULFIDE, ACID, MEETING], ["H2S"], Style(80)) == [
        "20 g of sodium sulfide ── HS⁻ ─┬─(a)─ H₂S",
        "1 L of 0.5 M HCl ── H⁺ ────────┘",
        "(a) HS⁻ + H⁺ → H₂S   by acid-frees-sulfide, step 2",
    ]


def test_plain_has_tokens_and_no_boxes():
    lines = drawn([SULFIDE, ACID, MEETING], ["H2S"], Style(80, plain=True))
    assert Style(plain=True).finished("\n".join(lines)).splitlines() == [
        "20 g of sodium sulfide -- HS- -+-(a)- H2S",
        "1 L of 0.5 M HCl -- H+ --------+",
        "(a) HS- + H+ -> H2S   by acid-frees-sulfide, step 2",
    ]


def test_three_labels_and_a_chain():
    water = step("label", "", ["1 L of chlorine water"], ["Cl2"], 3)
    oxidised = step("equilibrium", "H2S + Cl2 -> sulfur + 2 H+ + 2 Cl-", ["H2S", "Cl2"], ["sulfur", "H+", "Cl-"], 3)
    assert drawn([SULFIDE, ACID, MEETING, water, oxidised], ["sulfur"], Style(80)) == [
        "20 g of sodium sulfide ── HS⁻ ─┬─(a)─ H₂S ─┐",
        "1 L of 0.5 M HCl ── H⁺ ────────┘           ├─(b)─ sulfur",
        "1 L of chlorine water ── Cl₂ ──────────────┘",
        "(a) HS⁻ + H⁺ → H₂S   by acid-frees-sulfide, step 2",
        "(b) H₂S + Cl₂ → sulfur + 2 H⁺ + 2 Cl⁻   step 3",
    ]


def test_one_label_alone():
    burst = step("stands-badly", "Cyanide in closed bottles", ["HS-"], ["H2S"], 2)
    assert drawn([SULFIDE, burst], ["H2S"], Style(80)) == [
        "20 g of sodium sulfide ── HS⁻ ───(a)─ H₂S",
        "(a) Cyanide in closed bottles   by stands-badly, step 2",
    ]


def test_long_labels_are_wrapped_within_the_width_and_dropped_where_nothing_helps():
    name = "sodium sulfide nonahydrate in 4 L of (0.1 M sodium sulfide nonahydrate + 2 M sodium hydroxide)"
    path = [SULFIDE.model_copy(update={"from_": [name]}), ACID, MEETING]
    for width in (92, 80, 60, 44):
        lines = drawn(path, ["H2S"], Style(width), indent=4)
        assert all(columns_of(line) <= width for line in lines)
        assert any("HS⁻ + H⁺ → H₂S" in line for line in lines)
    assert drawn(path, ["H2S"], Style(80))[:4] == [
        "sodium sulfide nonahydrate in 4 L of",
        "(0.1 M sodium sulfide nonahydrate + 2",
        "M sodium hydroxide)                   ── HS⁻ ─┬─(a)─ H₂S",
        "1 L of 0.5 M HCl ── H⁺ ───────────────────────┘",
    ]
