"""The whole report on a terminal: what comes first, what is shown once, what must never be missing."""

from __future__ import annotations

import pytest

from carboy.model.report import Measure, Report
from carboy.reports.style import Style, columns_of
from carboy.reports.terminal import report_text
from tests.reports.made_report import MEETING, SOURCES, finding, goal, report

LIMIT = Measure(quantity="limit", value=4.0, unit="%", basis="looked up")
WHOLE = """\
REFUSE  Do not do this as written.
20 g of sodium sulfide + 1 L of 0.5 M HCl

DANGER   Hydrogen sulfide is set free: 0.1 mol.
         Acid turns HS⁻ into a gas that dulls the sense of smell. [1]
         What prevents it:
         - Keep the sulfide above pH 10.
         (1) Toxic gas, from 25\u00a0% of the addition on; in either order of
         pouring.

Numbers
  (1)  H₂S formed               0.1\u00a0mol
       air brought to the IDLH  24.5\u00a0m³
  --why 1 tells how the numbers of (1) were had, and so on.

After each step
  step  pH    °C    L     what was done
  1     -     25.0  0.02  add 20 g of sodium sulfide
  2     0.95  26.0  1.02  add 1 L of 0.5 M HCl
  step 2  dissolved, mol: S(-II)\u00a00.1; Na\u00a00.2
          gas, mol: H₂S\u00a00.05 to 0.06

How it comes about
  (1) 20 g of sodium sulfide ── HS⁻ ─┬─(a)─ H₂S
      1 L of 0.5 M HCl ── H⁺ ────────┘
      (a) HS⁻ + H⁺ → H₂S   by acid-frees-sulfide, step 2

Taken as given
  - The chemistry is that of 25 °C.

Sources
  [1] Mendel F. Gases over waste. Tarn, 2001.

This is a screening aid, not a permit.
"""


def text(made: Report, width: int = 76, *, full: bool = False, **style: bool) -> str:
    return report_text(made, Style(width, **style), SOURCES, full=full)


def test_the_whole_report():
    assert text(report()) == WHOLE


def test_plain_is_the_same_in_ascii():
    plain = text(report(), plain=True)
    assert plain.isascii()
    assert "20 g of sodium sulfide -- HS- -+-(a)- H2S" in plain
    assert "Acid turns HS- into a gas" in plain
    assert plain.count("\n") == WHOLE.count("\n")


def test_colour_is_for_the_verdict_and_the_signal_word():
    coloured = text(report(), colour=True)
    assert coloured.startswith("\033[1;31mREFUSE\033[0m")
    assert coloured.count("\033[1;31m") == 2
    assert Style().finished(coloured).count("\033") == 0


def test_an_empty_report_still_ends_with_the_cautions():
    bare = Report(verdict="no objection", cautions=["This is a screening aid, not a permit."])
    assert text(bare) == (
        "NO OBJECTION  Nothing above a note was found in what this covers.\n\nThis is a screening aid, not a permit.\n"
    )


def test_what_was_not_recognised_stands_before_everything_else():
    lines = text(report(verdict="cannot say", findings=[], unrecognised=["flurbium nitrate"])).splitlines()
    assert lines[0] == "CANNOT SAY  Something that matters is not known. Do not mix until it is."
    assert lines[3:5] == ["Not recognised", "  - flurbium nitrate"]


def test_dangers_before_warnings_before_notes_and_the_graver_kind_first():
    made = report(
        findings=[
            finding(kind="foam", summary="It foams."),
            finding(signal="note", kind="heat", summary="It warms.", controls=["Never shown for a note."]),
            finding(signal="warning", kind="heat", summary="It gets hot."),
            finding(),
        ]
    )
    shown = text(made)
    order = [shown.index(words) for words in ("Hydrogen sulfide is set free", "It foams.", "It gets hot.", "It warms.")]
    assert order == sorted(order)
    assert "NOTE     It warms." in shown
    assert "Never shown" not in shown


def test_the_other_order_is_told_apart():
    made = report(
        findings=[
            finding(order="as written"),
            finding(order="other order", kind="heat", summary="It boils over.", says="Hot."),
        ]
    )
    shown = text(made)
    before, after = shown.split("If poured the other way round:")
    assert "It boils over." not in before
    assert "It boils over." in after
    assert "in this order of pouring" in " ".join(before.split())


def test_nothing_is_said_twice():
    shown = text(report(findings=[finding(), finding(kind="flammable-gas", signal="warning", summary="It burns.")]))
    assert shown.count("dulls the sense of smell") == 1
    assert shown.count("Keep the sulfide above pH 10.") == 1
    assert "Why, and what prevents it: see (1)." in " ".join(shown.split())
    assert shown.count("20 g of sodium sulfide ──") == 1


def test_numbers_of_one_substance_stand_once_and_full_tells_what_they_rest_on():
    other = finding(kind="flammable-gas", signal="warning", measures=[*finding().measures, LIMIT])
    made = report(findings=[finding(), other])
    numbers = text(made).split("Numbers")[1].split("After each step")[0]
    assert numbers.count("24.5") == 1
    assert "IDLH 100 ppm" not in numbers
    assert "(2)  limit" in numbers
    assert "IDLH 100 ppm" in text(made, full=True)


def test_either_order_is_said_once_where_it_holds_for_all():
    both = text(report(findings=[finding(), finding(kind="foam", summary="It foams.")]))
    assert both.splitlines()[2] == "This holds whichever is poured into which."
    assert "either order" not in both
    mixed = text(report(findings=[finding(), finding(kind="foam", summary="It foams.", order="as written")]))
    assert "whichever" not in mixed
    assert "in either order" in mixed


def test_what_one_gas_does_stands_together():
    foam = finding(kind="foam", summary="It foams.")
    fire = finding(kind="fire", summary="It burns.", species=["C3H6O"])
    shown = text(report(findings=[foam, fire, finding()]))
    order = [shown.index(words) for words in ("Hydrogen sulfide is set free", "It foams.", "It burns.")]
    assert order == sorted(order)


def test_storage_tells_how_fast():
    slow = finding(moment="storage", speed="days", kind="explosive")
    assert "while it stands, over days" in text(report(findings=[slow]))


def test_a_note_on_what_stays_dissolved_is_no_news_beside_the_metal_gone_back():
    measures = [Measure(quantity="dissolved Hg", value=14.0, unit="mg/L", basis="equilibrium")]
    back = finding(kind="remobilised", summary="Hg goes back.", species=["HgS2"], measures=measures)
    note = finding(kind="incomplete", signal="note", summary="Hg stays.", species=["Hg"], measures=measures)
    made = report(findings=[back, note])
    assert "Hg stays." not in text(made)
    assert "Hg stays." in text(made, full=True)
    assert "Hg stays." in text(report(findings=[note]))


def test_full_shows_every_derivation_note_and_citation():
    other = [MEETING.model_copy(update={"equation": "S-2 + 2 H+ -> H2S"})]
    notes = [finding(signal="note", kind="heat", summary=f"Note {n}.") for n in range(9)]
    made = report(findings=[finding(other_paths=[other], sources=["long-one"]), *notes])
    short, full = text(made), text(made, full=True)
    assert "1 other way leads there as well; --full draws them." in short
    assert "S²⁻ + 2 H⁺ → H₂S" in full
    assert "Note 8." not in short
    assert "3 more notes; --full shows them." in short
    assert "Note 8." in full
    assert "…" in short.split("Sources")[1]
    assert "…" not in full.split("Sources")[1]


def test_aims():
    shown = text(report(goals=[goal(True), goal(False), goal(None)]))
    assert "  met      dissolved mercury in jug below 0.2 mg/L. It comes to 0.01 to" in shown
    assert "  NOT MET  dissolved" in shown
    assert "  open     dissolved mercury in jug below 0.2 mg/L. It cannot be told." in shown


@pytest.mark.parametrize("width", [40, 60, 80, 92])
def test_no_line_is_wider_than_the_terminal(width):
    long = finding(
        summary="Hydrogen sulfide " * 20,
        says="Words " * 60,
        controls=["Do this " * 30],
        holds="in part",
        measures=finding().measures * 4,
        sources=["long-one"],
    )
    made = report(findings=[long] * 12, questions=["How much acid does it hold? " * 5], unrecognised=["x y " * 40])
    for line in text(made, width).splitlines():
        assert columns_of(line) <= width, line


def test_what_holds_for_several_steps_is_said_once():
    made = report(
        assumptions=[
            "One.",
            "Step 1: strong.",
            "Step 2: strong.",
            "Step 3: weak.",
            "Step 3: strong.",
            "Step 5: strong.",
        ]
    )
    assert "  - One.\n  - Steps 1 to 3, 5: strong.\n  - Step 3: weak.\n" in text(made)


def test_steps_that_change_nothing_share_a_line():
    steps = report().steps
    again = steps[1].model_copy(update={"step": 3, "action": "stir 30 min"})
    assert "  step 2, 3  dissolved, mol: S(-II)" in text(report(steps=[*steps, again]))
