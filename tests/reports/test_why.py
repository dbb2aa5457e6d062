"""The page on one finding: every number down to its constants, what the rules saw, what judged it."""

from __future__ import annotations

import pytest

from carboy.errors import InputError
from carboy.model.knowledge import Threshold, Value
from carboy.model.report import Measure, Pour, Report, RuleSight
from carboy.reports.style import Style, columns_of
from carboy.reports.why import explained, why_text
from tests.reports.made_report import MEETING, SOURCES, finding, report

CONSTANT = Measure(
    quantity="log10 K of H2S(g) = H2S", value=-0.997, unit="1", basis="from memory", source="mendel-2001"
)
LEAVING = Measure(quantity="gas that can leave", value=0.1, unit="mol", basis="bubbles", equation="n = n(bubbles)")
AIR = Measure(
    quantity="air brought to the IDLH", value=24.5, unit="m3", basis="IDLH 100 ppm", equation="V = n x 24.465 L/mol / limit",
    inputs=[Measure(quantity="gas that can leave", value=0.1, unit="mol", basis="", inputs=[CONSTANT])],
)  # fmt: skip
SIGHT = RuleSight(
    rule="acid-frees-sulfide",
    conditions=[
        Measure(quantity="?s is HS-, dissolved", value=0.1, unit="mol", basis="hydrogensulfide ion"),
        Measure(quantity="pH below 9.5", value=0.95, unit="1", basis=""),
        Measure(quantity="cover is sealed", value=None, unit="sealed", basis=""),
    ],
)
THRESHOLDS = {
    "toxic-gas-danger-air": Threshold(
        "toxic-gas-danger-air", Value(1000.0, "L", "mendel-2001"), "A cubic metre is the air before a person."
    )
}


def made() -> Report:
    one = finding(
        measures=[LEAVING, AIR], sight=[SIGHT], thresholds=["toxic-gas-danger-air", "gone"],
        other_paths=[[MEETING.model_copy(update={"equation": "S-2 + 2 H+ -> H2S"})]],
    )  # fmt: skip
    whole = report(findings=[finding(signal="note", summary="A note."), one])
    steps = [
        whole.steps[0].model_copy(
            update={
                "poured": Pour(
                    label="20 g of sodium sulfide",
                    volume_L=(0.01, 0.01),
                    mass_g=(20, 20),
                    holds_mol={"sodium sulfide": (0.25, 0.26)},
                )
            }
        ),
        whole.steps[1],
    ]
    return whole.model_copy(update={"steps": steps})


def page(width: int = 80, *, plain: bool = False) -> str:
    return why_text(made(), 1, Style(width, plain=plain), [], THRESHOLDS, SOURCES)


def test_numbers_are_told_with_equation_and_inputs_further_in():
    lines = page().replace("\u00a0", " ").splitlines()
    start = lines.index("  air brought to the IDLH = 24.5 m³ (IDLH 100 ppm)")
    assert lines[start : start + 4] == [
        "  air brought to the IDLH = 24.5 m³ (IDLH 100 ppm)",
        "    by V = n × 24.465 L/mol / limit",
        "      gas that can leave = 0.1 mol",
        "          log K of H₂S(g) ⇌ H₂S = −0.997 (from memory) [1]",
    ]


def test_label_rules_thresholds_paths_and_sources_are_there():
    shown = page().replace("\u00a0", " ")
    assert shown.startswith("(1) DANGER  Hydrogen sulfide is set free: 0.1 mol.")
    assert "sodium sulfide  0.25 to 0.26 mol; in water Na₂S + H₂O → 2 Na⁺ + HS⁻ + OH⁻" in shown
    assert "?s is HS⁻, dissolved  hydrogensulfide ion, 0.1 mol" in shown
    assert "pH below 9.5          0.95" in shown
    assert "cover is sealed       sealed" in shown
    assert "toxic-gas-danger-air = 1 m³ [1]" in shown
    assert "A cubic metre is the air before a person." in shown
    assert "S²⁻ + 2 H⁺ → H₂S" in shown
    assert "[1] Mendel F. Gases over waste." in shown


def test_plain_is_ascii():
    assert page(plain=True).isascii()


@pytest.mark.parametrize("width", [44, 60, 80])
def test_no_line_is_wider_than_the_terminal(width):
    assert max(map(columns_of, page(width).splitlines())) <= width


@pytest.mark.parametrize("number", [0, 2, -1])
def test_a_number_that_is_not_there_is_said(number):
    with pytest.raises(InputError, match=r"there is no finding \(-?\d\): the report has \(1\) only"):
        explained(made(), number)


def test_a_report_without_findings_says_so():
    with pytest.raises(InputError, match="nothing above a note"):
        explained(report(findings=[finding(signal="note")]), 1)
