"""The report's contract: names, types, words, exit status, precedence of verdicts, the other order, paths, sources."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path
from typing import Any, get_args

import pytest

import carboy
from carboy.cli.output import Status, status_of
from carboy.errors import InputError
from carboy.model.report import Finding, PathStep, Report
from carboy.model.rule import Kind
from carboy.vetting import OTHER_ORDER, compare_orders, laboratory, verdict_of
from tests.bench.reports import combined, only, select

ROOT = Path(__file__).parents[1]

KINDS = {
    "toxic-gas", "flammable-gas", "asphyxiant-gas", "oxygen", "pressure", "heat", "foam", "fire", "explosive",
    "polymerization", "toxic-product", "remobilised", "incomplete", "attack",
}  # fmt: skip
SIGNALS = {"danger", "warning", "note"}
MOMENTS = {"contact", "during", "after", "storage"}
VERDICTS = {"refuse", "conditional", "no objection", "cannot say"}

# mixtures that between them bring gases, heat, foam, pressure, metals, organics, ranges and unknowns
MIXTURES: dict[str, tuple[tuple[str, ...], dict[str, Any]]] = {
    "bleach and acid": (("500 mL of 6 % sodium hypochlorite", "100 mL of 31 % hydrochloric acid"), {}),
    "sulfide and acid": (("1 L of 0.1 M sodium sulfide", "1 L of 0.5 M hydrochloric acid"), {}),
    "sealed soda": (
        ("50 g of sodium bicarbonate", "1 L of 1 M hydrochloric acid"),
        {"volume_L": 2.0, "cover": "sealed"},
    ),
    "too much sulfide": (
        ("1 L of (0.01 M mercury(II) nitrate + 0.5 M sodium bicarbonate)", "100 mL of 5 M sodium sulfide"),
        {},
    ),
    "ammonia and bleach": (("100 mL of household ammonia", "100 mL of bleach"), {}),
    "unknown and cyanide": (("1 L of unknown, pH 2", "1 L of 0.1 M potassium cyanide"), {}),
    "unrecognised": (("100 mL of flurbium nitrate", "10 mL of water"), {}),
    "zinc and acid": (("5 g of zinc powder", "200 mL of 2 M hydrochloric acid"), {}),
    "sulfuric acid and water": (("20 mL of 96 % sulfuric acid", "200 mL of water"), {}),
    "nitric acid and acetone": (("100 mL of concentrated nitric acid", "50 mL of acetone"), {}),
    "a range of copper": (("1 L of 1-50 g/L copper sulfate", "1 L of 0.1 M sodium sulfide"), {}),
    "silver and ammonia": (("100 mL of 0.1 M silver nitrate", "100 mL of concentrated ammonia"), {}),
    "three bottles": (
        ("100 mL of 1 M sodium nitrite", "100 mL of 1 M potassium iodide", "100 mL of 2 M hydrochloric acid"),
        {},
    ),
    "harmless": (("100 mL of 1 M sodium chloride", "100 mL of water"), {}),
}

every_mixture = pytest.mark.parametrize("name", MIXTURES)


def report_of(name: str) -> Report:
    portions, vessel = MIXTURES[name]
    return combined(*portions, **vessel)


def is_pair(value: object) -> bool:
    return isinstance(value, list) and len(value) == 2 and all(isinstance(one, int | float) for one in value)


@every_mixture
def test_report_is_as_the_contract_says(name: str) -> None:
    printed = report_of(name).model_dump(mode="json")
    assert printed["format"] == "carboy-report/1"
    assert printed["verdict"] in VERDICTS
    for key in ("findings", "steps", "goals", "unrecognised", "assumptions", "questions", "cautions"):
        assert isinstance(printed[key], list), key
    for key in ("unrecognised", "assumptions", "questions", "cautions"):
        assert all(isinstance(line, str) and line.strip() for line in printed[key]), key
    assert len(printed["cautions"]) >= 3


@every_mixture
def test_findings_are_as_the_contract_says(name: str) -> None:
    for found in report_of(name).model_dump(mode="json")["findings"]:
        assert found["kind"] in KINDS
        assert found["signal"] in SIGNALS
        assert found["moment"] in MOMENTS
        assert found["holds"] in ("throughout", "in part")
        assert found["rule"]
        assert isinstance(found["step"], int)
        first, last = found["fractions"]
        assert 0.0 <= first <= last <= 1.0
        assert all(isinstance(word, str) for word in found["species"])
        assert found["amount_mol"] is None or is_pair(found["amount_mol"])
        if found["amount_mol"] is not None:
            low, high = found["amount_mol"]
            assert 0.0 <= low <= high
        assert found["summary"].strip().endswith(".")
        assert "?" not in found["summary"] + found["says"], found["summary"]
        for step in found["path"]:
            assert {"rule", "equation", "from", "to", "step"} <= set(step)
            assert isinstance(step["from"], list)
            assert isinstance(step["to"], list)
        for one in found["measures"]:
            assert {"quantity", "value", "unit", "basis"} <= set(one)
            assert one["quantity"]
            assert isinstance(one["unit"], str)
            assert one["basis"]
        assert all(isinstance(line, str) and line for line in [*found["controls"], *found["sources"]])


@every_mixture
def test_steps_are_as_the_contract_says(name: str) -> None:
    printed = report_of(name).model_dump(mode="json")
    portions, _ = MIXTURES[name]
    assert [step["step"] for step in printed["steps"]] == list(range(1, len(portions) + 1))
    for step in printed["steps"]:
        assert isinstance(step["vessel"], str)
        for key in ("pH", "temperature_C", "gauge_kPa"):
            assert step[key] is None or is_pair(step[key]), key
        for key in ("dissolved_mol", "solids_mol", "gas_mol"):
            assert all(is_pair(pair) and 0 <= pair[0] <= pair[1] for pair in step[key].values()), (key, step[key])
        for key in ("solids_mol", "gas_mol"):
            assert not any(mark in formula for formula in step[key] for mark in ("(g)", "+", "-")), step[key]


@every_mixture
def test_one_finding_per_kind_species_step_and_vessel(name: str) -> None:
    seen = [
        (one.kind, tuple(one.species), one.step, one.vessel, one.order == "other order")
        for one in report_of(name).findings
    ]
    assert len(seen) == len(set(seen)), seen


@every_mixture
def test_paths_start_at_labels_and_end_in_the_species(name: str) -> None:
    for found in report_of(name).findings:
        if found.kind == "heat":
            continue
        assert found.path, (found.kind, found.species)
        for path in (found.path, *found.other_paths):
            assert path[0].rule == "label", (found.kind, found.species, path)
            last = path[-1]
            assert last.rule != "label" or last.to, (found.kind, path)
            if found.species:
                ends = {laboratory().judge.plain_formula(word) for word in (*last.to, *last.from_)}
                assert ends.intersection(found.species), (found.kind, found.species, last)


@every_mixture
def test_every_link_of_a_path_is_supplied_by_an_earlier_one(name: str) -> None:
    stock = laboratory().stock

    def parts(words: list[str]) -> set[str]:
        known = [word for word in words if word in stock.index.species or word in stock.index.substances]
        return {part for word in known for part in stock.components_of(word)} - {"H+", "H2O"}

    for found in report_of(name).findings:
        for path in (found.path, *found.other_paths):
            held: set[str] = set()
            for step in path:
                assert step.step >= 1
                if step.rule == "label":
                    assert len(step.from_) == 1
                else:
                    assert parts(step.from_) <= held, (found.kind, found.species, step)
                held |= parts(step.to)


@every_mixture
def test_sources_are_in_the_graph(name: str) -> None:
    sources = laboratory().index.sources
    for found in report_of(name).findings:
        assert set(found.sources) <= set(sources), (found.kind, found.sources)
        if found.signal != "note" and found.kind not in ("heat", "foam", "pressure"):
            assert found.sources, (found.kind, found.species)


@every_mixture
def test_species_are_plain_formulas(name: str) -> None:
    for found in report_of(name).findings:
        for formula in found.species:
            assert formula
            assert "(g)" not in formula
            assert not formula.endswith(("+", "-"))


@every_mixture
def test_verdict_follows_from_the_findings(name: str) -> None:
    report = report_of(name)
    if report.verdict == "no objection":
        assert not [one for one in report.findings if one.signal != "note" and one.order != "other order"]
    if any(
        one.signal == "danger" and one.order != "other order" and OTHER_ORDER not in one.controls
        for one in report.findings
    ):
        assert report.verdict == "refuse"
    if report.unrecognised:
        assert report.verdict in ("refuse", "cannot say")


def test_kinds_of_the_code_are_those_of_the_contract() -> None:
    assert set(get_args(Kind)) == KINDS


# --- exit status -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("verdict", "status"), [("no objection", 0), ("conditional", 1), ("refuse", 1), ("cannot say", 3)]
)
def test_exit_status_of_a_verdict(verdict: str, status: int) -> None:
    assert status_of([Report(verdict=verdict)]) == status  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("verdicts", "status"),
    [
        (("refuse", "cannot say"), Status.OBJECTION),
        (("cannot say", "conditional"), Status.CANNOT_SAY),
        (("no objection", "conditional"), Status.OBJECTION),
        (("no objection", "no objection"), Status.NO_OBJECTION),
    ],
)
def test_exit_status_of_several_reports_is_that_of_the_gravest(verdicts: tuple[str, ...], status: Status) -> None:
    assert status_of([Report(verdict=one) for one in verdicts]) is status  # type: ignore[arg-type]


# --- precedence ------------------------------------------------------------------------------------------------


def finding(signal: str, *, order: str = "either order", controls: tuple[str, ...] = (), **more: Any) -> Finding:
    fields: dict[str, Any] = {
        "rule": "a-rule", "kind": "toxic-gas", "step": 2, "moment": "during", "fractions": (0.1, 1.0),
        "holds": "throughout", "species": ["H2S"], "amount_mol": None, "summary": "A sentence.", "path": [],
    }  # fmt: skip
    return Finding(signal=signal, order=order, controls=list(controls), **{**fields, **more})  # type: ignore[arg-type]


def test_refuse_outranks_cannot_say_outranks_conditional() -> None:
    danger, warning, note = finding("danger"), finding("warning"), finding("note")
    assert verdict_of([danger], True) == "refuse"
    assert verdict_of([warning], True) == "cannot say"
    assert verdict_of([], True) == "cannot say"
    assert verdict_of([danger, warning], False) == "refuse"
    assert verdict_of([warning, note], False) == "conditional"
    assert verdict_of([note], False) == "no objection"
    assert verdict_of([], False) == "no objection"


def test_a_danger_of_the_other_order_is_a_condition() -> None:
    assert verdict_of([finding("danger", order="other order")], False) == "conditional"
    assert verdict_of([finding("warning", order="other order")], False) == "no objection"
    assert verdict_of([finding("danger", order="as written", controls=(OTHER_ORDER,))], False) == "conditional"


def test_a_danger_beside_an_unrecognised_name_is_refused() -> None:
    report = combined("1 L of 0.1 M sodium sulfide", "1 L of (0.5 M hydrochloric acid + 0.1 M flurbium nitrate)")
    assert "flurbium nitrate" in report.unrecognised
    assert report.verdict == "refuse"


# --- the two orders --------------------------------------------------------------------------------------------


def test_orders_same_signal_is_either_order() -> None:
    merged = compare_orders([finding("danger", order="")], [finding("danger", order="")])
    assert [one.order for one in merged] == ["either order"]


def test_orders_only_here() -> None:
    merged = compare_orders([finding("danger", order="", fractions=(0.1, 0.5))], [])
    assert [one.order for one in merged] == ["as written"]
    assert merged[0].controls[0] == OTHER_ORDER  # it passes, and the other order is free of danger


def test_other_order_is_no_control_for_what_stands_at_the_end() -> None:
    merged = compare_orders([finding("danger", order="", fractions=(0.1, 1.0))], [])
    assert OTHER_ORDER not in merged[0].controls


def test_orders_only_there_is_added() -> None:
    merged = compare_orders([], [finding("danger", order="")])
    assert [one.order for one in merged] == ["other order"]


def test_orders_worse_there_is_added_beside_what_is_here() -> None:
    merged = compare_orders([finding("note", order="")], [finding("danger", order="")])
    assert [(one.order, one.signal) for one in merged] == [("as written", "note"), ("other order", "danger")]


def test_orders_milder_there_is_not_added() -> None:
    merged = compare_orders([finding("danger", order="")], [finding("warning", order="")])
    assert [(one.order, one.signal) for one in merged] == [("as written", "danger")]


def test_combine_of_two_has_an_order_in_each_finding_of_the_pour() -> None:
    for name in MIXTURES:
        if len(MIXTURES[name][0]) == 2:
            for one in select(report_of(name), step=2):
                assert one.order in ("as written", "other order", "either order"), (name, one.kind)


def test_three_bottles_harmless_in_pairs_only() -> None:
    # 2 HNO2 + 2 I- + 2 H+ -> I2 + 2 NO: nitrite, iodide and acid; nitrite and iodide alone do nothing
    report = report_of("three bottles")
    assert [one for one in report.findings if one.step == 3 and one.kind == "toxic-gas"]
    assert not [one for one in report.findings if one.step == 2 and one.signal != "note"]


# --- JSON ------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["a range of copper", "zinc and acid"])
def test_json_of_the_command_is_the_report(name: str) -> None:
    portions, _ = MIXTURES[name]
    environment = {**os.environ, "PYTHONPATH": str(ROOT), "PYTHONUTF8": "1"}
    done = subprocess.run(
        [sys.executable, "-m", "carboy", "combine", *portions, "--json"],
        capture_output=True, text=True, env=environment, timeout=60, check=False,
    )  # fmt: skip
    assert done.stderr == ""
    assert close(json.loads(done.stdout), carboy.combine(*portions).model_dump(mode="json"))


def close(one: Any, other: Any) -> bool:
    """Equal, with numbers alike to 1 in 1e6 (the order of summation in a library may differ between processes)."""
    if isinstance(one, dict) and isinstance(other, dict):
        return one.keys() == other.keys() and all(close(one[key], other[key]) for key in one)
    if isinstance(one, list) and isinstance(other, list):
        return len(one) == len(other) and all(map(close, one, other))
    if isinstance(one, float) and isinstance(other, float):
        return one == pytest.approx(other, rel=1e-6, abs=1e-15)
    return bool(one == other)


@every_mixture
def test_json_is_strict_and_reads_back(name: str) -> None:
    report = report_of(name)
    text = report.model_dump_json()
    json.loads(text, parse_constant=pytest.fail)  # Infinity and NaN are no JSON
    assert Report.model_validate_json(text).model_dump(mode="json") == json.loads(text)
    assert json.loads(json.dumps(report.model_dump(mode="json"), allow_nan=False)) == json.loads(text)


def test_path_steps_print_from_under_its_own_name() -> None:
    step = PathStep(rule="label", equation="NaCl -> Na+ + Cl-", from_=["salt"], to=["Na+", "Cl-"], step=1)
    report = Report(verdict="no objection", findings=[finding("note", path=[step])])
    assert report.model_dump(mode="json")["findings"][0]["path"][0]["from"] == ["salt"]


# --- calls -----------------------------------------------------------------------------------------------------


def test_the_calls_of_the_contract() -> None:
    assert isinstance(carboy.combine("1 L of water", "1 L of 0.1 M sodium chloride"), carboy.Report)
    with pytest.raises(InputError):
        carboy.combine("1 L of water")
    with pytest.raises(InputError):
        carboy.vet("no-such-file.yaml")


def test_vet_takes_a_file_and_reports_its_goals(tmp_path: Path) -> None:
    file = tmp_path / "case.yaml"
    file.write_text(
        "title: Copper rinse\n"
        "vessels:\n  tank: {volume: 5 L, material: HDPE, cover: open}\n"
        "steps:\n"
        "  - add: 1 L of 0.01 M copper sulfate\n    to: tank\n"
        "  - add: 50 mL of 0.5 M sodium hydroxide\n    to: tank\n"
        "goals:\n  - dissolved copper in tank below 5 mg/L\n",
        encoding="utf-8",
    )
    report = carboy.vet(file)
    printed = report.model_dump(mode="json")
    assert printed["title"] == "Copper rinse"
    (goal,) = printed["goals"]
    assert set(goal) == {"goal", "met", "value", "unit"}
    # 0.01 mol Cu and 0.025 mol OH-: Cu(OH)2 or CuO at pH near 11.6, dissolved below 1 mg/L
    assert goal["met"] is True
    assert is_pair(goal["value"])
    assert goal["unit"] == "mg/L"
    low, _ = report.steps[1].pH or (0.0, 0.0)
    assert low == pytest.approx(11.6, abs=0.2)


def test_only_the_gravest_finding_of_a_gas_carries_the_amount_that_forms() -> None:
    # amount_mol is what forms, what stays dissolved included: 0.01 mol of H2S, of which little leaves 1 L at once
    found = only(combined("500 mL of 0.02 M sodium sulfide", "500 mL of 0.1 M hydrochloric acid"), "toxic-gas", "H2S")
    assert found.amount_mol == pytest.approx((0.01, 0.01), rel=2e-3)
