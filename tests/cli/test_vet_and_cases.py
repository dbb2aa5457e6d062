"""``carboy vet`` and ``carboy cases`` on files."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

SAFE = """\
title: Rinse water of the Tarn annex
bottles:
  base: 200 mL of 0.5 M sodium hydroxide
vessels:
  jug: 1 L
steps:
  - add: 200 mL of water
    to: jug
  - add: base
    to: jug
goals:
  - pH in jug between 12 and 14
expect:
  - {verdict: no objection}
  - {step: 2, kind: toxic-gas, absent: true}
  - {step: 2, quantity: pH, between: [13, 13.6]}
  - {goal: pH in jug between 12 and 14, met: true}
"""
UNSAFE = """\
title: The wrong order at Tarn annex
vessels:
  jug: 5 L
steps:
  - add: 1 L of 0.1 M sodium sulfide
    to: jug
  - add: 1 L of 0.5 M hydrochloric acid
    to: jug
expect:
  - {step: 2, kind: toxic-gas, species: H2S, signal: danger}
  - {step: 2, kind: toxic-gas, quantity: amount_mol, between: [0.099, 0.101]}
"""


@pytest.fixture
def files(tmp_path: Path) -> dict[str, Path]:
    made = {}
    for name, text in (("safe", SAFE), ("unsafe", UNSAFE), ("failing", SAFE.replace("[13, 13.6]", "[1, 2]"))):
        made[name] = tmp_path / f"{name}.yaml"
        made[name].write_text(text, encoding="utf-8")
    return made


def test_vet_one_file(carboy, files):
    ran = carboy("vet", str(files["safe"]))
    assert ran.status == 0
    assert "Aims" in ran.out
    assert "met      pH in jug between 12 and 14" in ran.out


def test_vet_json_is_one_object_for_one_file_and_a_list_for_more(carboy, files):
    one = json.loads(carboy("vet", str(files["safe"]), "--json").out)
    assert one["verdict"] == "no objection"
    assert one["goals"][0]["met"] is True
    more = carboy("vet", str(files["safe"]), str(files["unsafe"]), "--json")
    assert more.status == 1
    assert [report["verdict"] for report in json.loads(more.out)] == ["no objection", "refuse"]


def test_vet_reads_every_file_before_it_judges_one(carboy, files, tmp_path):
    ran = carboy("vet", str(files["unsafe"]), str(tmp_path / "nowhere.yaml"))
    assert ran.status == 2
    assert ran.out == ""
    assert "nowhere.yaml' does not exist" in ran.err


def test_cases_run_their_expectations(carboy, files, tmp_path):
    ran = carboy("cases", str(files["safe"]), str(files["unsafe"]))
    assert ran.status == 0
    assert ran.out.splitlines() == [
        "holds  safe: 4 expectations",
        "holds  unsafe: 2 expectations",
        "2 cases, 6 expectations, 0 failed, 0 could not be read",
    ]


def test_cases_say_what_fails_and_what_is_there_instead(carboy, files):
    ran = carboy("cases", str(files["failing"]))
    assert ran.status == 1
    lines = ran.out.splitlines()
    assert lines[0] == "FAILS  failing: 4 expectations"
    assert lines[1].startswith("       step 2, pH between 1 and 2: pH is 13.")


def test_cases_of_a_folder_and_a_file_that_cannot_be_read(carboy, files, tmp_path):
    (tmp_path / "wrong.yaml").write_text("steps:\n  - ad: 1 L of water\n", encoding="utf-8")
    ran = carboy("cases", str(tmp_path))
    assert ran.status == 2
    assert "WRONG  wrong.yaml" in ran.out
    assert "Did you mean 'add'?" in ran.out
    assert ran.out.splitlines()[-1] == "4 cases, 10 expectations, 1 failed, 1 could not be read"


def test_vet_why(carboy, files):
    ran = carboy("vet", str(files["unsafe"]), "--why", "1")
    assert ran.status == 1
    assert ran.out.startswith("(1) DANGER  Hydrogen sulfide")
    assert "step 1: 1 L of 0.1 M sodium sulfide" in ran.out
    assert carboy("vet", str(files["safe"]), "--why", "1").status == 2
    several = carboy("vet", str(files["safe"]), str(files["unsafe"]), "--why", "1")
    assert several.status == 2
    assert "several files" in several.err
