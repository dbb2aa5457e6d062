"""``carboy combine`` from the words on the labels to exit status, JSON and text. Expected figures are worked by hand."""

from __future__ import annotations

import json
import re

import pytest

import carboy as package
from carboy.model.report import Report

BLEACH = "500 mL of 6 % sodium hypochlorite"
MURIATIC = "100 mL of 31 % hydrochloric acid"


def test_refuse_is_status_1_and_names_the_gas_and_the_way_to_it(carboy):
    ran = carboy("combine", BLEACH, MURIATIC)
    assert ran.status == 1
    assert ran.err == ""
    lines = ran.out.splitlines()
    assert lines[0].startswith("REFUSE  ")
    assert lines[1] == f"{BLEACH} + {MURIATIC}"
    assert "DANGER   Chlorine gas is set free" in ran.out
    assert "How it comes about" in ran.out
    assert "Cl₂" in ran.out
    assert ran.out.rstrip().endswith("leaves only by a licensed contractor.")


def test_json_is_exactly_the_report_of_the_python_call(carboy):
    ran = carboy("combine", BLEACH, MURIATIC, "--json")
    assert ran.status == 1
    printed = json.loads(ran.out)
    report = package.combine(BLEACH, MURIATIC)
    assert printed == report.model_dump(mode="json")
    assert printed["format"] == "carboy-report/1"
    assert Report.model_validate(printed) == report
    # 500 mL of 6 % bleach holds 30 g or more of NaClO (0.40 mol), the scarcer of the two
    chlorine = next(f for f in printed["findings"] if f["species"] == ["Cl2"] and f["kind"] == "toxic-gas")
    assert chlorine["amount_mol"] == pytest.approx([0.41, 0.41], rel=0.1)
    assert {"rule", "equation", "from", "to", "step"} == set(chlorine["path"][0])


def test_no_objection_is_status_0(carboy):
    ran = carboy("combine", "1 L of 0.1 M sodium sulfide", "1 L of 0.5 M sodium hydroxide")
    assert ran.status == 0
    assert ran.out.startswith("NO OBJECTION  ")


def test_what_is_not_known_is_status_3_and_named(carboy):
    ran = carboy("combine", "100 mL of flurbium nitrate", "10 mL of water")
    assert ran.status == 3
    assert ran.out.startswith("CANNOT SAY  ")
    assert "flurbium nitrate" in ran.out.split("Not recognised")[1].splitlines()[1]


def test_a_slip_of_the_pen_is_told_and_another_substance_is_not_suggested(carboy):
    slip = carboy("combine", "1 L of 2 M nitrc acid", "1 L of water")
    assert "- nitrc acid; did you mean 'nitric acid'" in slip.out
    assert "did you mean" not in carboy("combine", "1 L of flurbium nitrate", "1 L of water").out


@pytest.mark.parametrize(
    ("option", "value"),
    [("--hood-flow", "fast"), ("--volume", "big"), ("--cover", "ajar"), ("--temperature", "warm")],
)
def test_what_is_wrong_with_an_option_is_told_by_its_name(carboy, option, value):
    ran = carboy("combine", "1 L of water", "1 L of water", option, value)
    assert ran.status == 2
    assert ran.err.startswith(f"carboy: {option}: '{value}' is ")
    assert f"\n  {value}\n  ^" in ran.err


def test_what_cannot_be_read_is_status_2_with_the_place_marked(carboy):
    ran = carboy("combine", "100 mm of acetone", "10 mL of water")
    assert ran.status == 2
    assert ran.out == ""
    lines = ran.err.splitlines()
    assert lines[1] == "  100 mm of acetone"
    assert lines[2] == "      ^^"


def test_the_vessel_counts(carboy):
    """50 g of NaHCO3 (0.595 mol of CO2) in a closed 2 L bottle with a litre of acid: hundreds of kPa."""
    portions = ("50 g of sodium bicarbonate", "1 L of 1 M hydrochloric acid")
    closed = carboy("combine", *portions, "--volume", "2 L", "--cover", "sealed", "--json")
    pressure = [f for f in json.loads(closed.out)["findings"] if f["kind"] == "pressure"]
    assert [f["signal"] for f in pressure] == ["danger"]
    still_open = carboy("combine", *portions, "--volume", "2 L", "--json")
    assert not [
        f for f in json.loads(still_open.out)["findings"] if f["kind"] == "pressure" and f["signal"] == "danger"
    ]
    assert json.loads(closed.out)["steps"][1]["gauge_kPa"][0] > 500
    assert json.loads(still_open.out)["steps"][1]["gauge_kPa"] == pytest.approx([0, 0], abs=1e-6)


def test_the_place_is_read(carboy):
    ran = carboy(
        "combine", "10 mL of water", "10 mL of water", "--place", "fume hood", "--hood-flow", "0.4 m3/s",
        "--room-volume", "60 m3", "--air-changes", "6 per hour", "--temperature", "22 degC", "--material", "HDPE",
    )  # fmt: skip
    assert ran.status == 0
    assert "22.0" in ran.out


def test_plain_is_ascii_without_escapes(carboy):
    ran = carboy("combine", BLEACH, MURIATIC, "--plain")
    assert ran.out.isascii()
    assert "\033" not in ran.out
    assert "Cl2" in ran.out
    assert max(map(len, ran.out.splitlines())) <= 100


def test_full_draws_more(carboy):
    short, full = carboy("combine", BLEACH, MURIATIC), carboy("combine", BLEACH, MURIATIC, "--full")
    assert len(full.out) > len(short.out)
    assert full.out.splitlines()[0] == short.out.splitlines()[0]


def test_why_tells_how_the_numbers_of_a_finding_were_had(carboy):
    """0.1 mol of sulfide with more acid than it takes: 0.1 mol of H2S, 0.1 x 24.465 L / 100 ppm = 24.5 m3."""
    ran = carboy("combine", "1 L of 0.1 M sodium sulfide", "1 L of 0.5 M hydrochloric acid", "--why", "1")
    assert ran.status == 1
    text = " ".join(ran.out.split())
    assert text.startswith("(1) DANGER Hydrogen sulfide is set free")
    assert "sodium sulfide 0.1 mol; in water Na₂S + H₂O → 2 Na⁺ + HS⁻ + OH⁻" in text
    assert "air brought to the IDLH = 24.5 m³ (IDLH 100 ppm) [1] by V(air) = n × 24.465 L/mol / limit" in text
    assert "log K of HS⁻ + H⁺ ⇌ H₂S = 6.99" in text
    assert "acid-frees-hydrogen-sulfide: Acid on a sulfide." in text
    assert re.search(r"pH below 9\.5 [0-8]\.\d", text)
    assert "toxic-gas-danger-air = 1 m³" in text
    assert "National Institute for Occupational Safety and Health" in text


def test_why_as_json_is_the_finding(carboy):
    ran = carboy("combine", BLEACH, MURIATIC, "--why", "1", "--json")
    found = json.loads(ran.out)
    assert found["kind"] == "toxic-gas"
    assert found["sight"][0]["rule"] in found["rules"]
    assert found["thresholds"]


@pytest.mark.parametrize("number", ["0", "99", "-1"])
def test_why_of_a_finding_that_is_not_there(carboy, number):
    ran = carboy("combine", BLEACH, MURIATIC, "--why", number)
    assert ran.status == 2
    assert ran.out == ""
    assert f"there is no finding ({number}): the report has (1) to (" in ran.err


@pytest.mark.parametrize(
    "portions",
    [
        (BLEACH, MURIATIC),
        ("20 g of zinc powder", "500 mL of 10 % sulfuric acid", "--cover", "sealed", "--volume", "1 L"),
        ("1 L of (0.01 M mercury(II) nitrate + 0.5 M sodium bicarbonate)", "100 mL of 5 M sodium sulfide"),
        ("50 mL of water", "50 mL of 96 % sulfuric acid"),
    ],
    ids=lambda given: given[0],
)
def test_every_number_that_is_computed_has_its_equation_and_inputs(carboy, portions):
    findings = [one for one in json.loads(carboy("combine", *portions, "--json").out)["findings"] if one["measures"]]
    assert findings
    for one in findings:
        computed = [
            measure
            for measure in one["measures"]
            if measure["value"] is not None and not measure["source"] and not measure["quantity"].startswith("rating")
        ]
        for measure in computed:
            assert measure["equation"], (one["kind"], measure["quantity"])
            assert measure["inputs"], (one["kind"], measure["quantity"])
        for rule in one["rules"] if one["signal"] != "note" else []:
            assert rule in [sight["rule"] for sight in one["sight"]]
        assert one["thresholds"], one["kind"]
