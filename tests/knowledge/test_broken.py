"""Every broken file of tests/broken/kb gives exactly the messages that stand beside it."""

from __future__ import annotations

from pathlib import Path

import pytest

from carboy.knowledge.compile import compile_index
from carboy.knowledge.loading import load_facts
from carboy.knowledge.problems import Problem
from tests.knowledge.small_knowledge import BROKEN, small_files


def problems_of(*more: Path) -> list[Problem]:
    facts, problems = load_facts(small_files(*more))
    assert facts is not None
    return [*problems, *compile_index(facts)[1]]


CASES = sorted(file for file in BROKEN.glob("*.ttl") if file.stem != "base")


def test_base_is_sound() -> None:
    assert [str(problem) for problem in problems_of()] == []


def test_every_broken_file_has_its_message() -> None:
    assert {file.stem for file in CASES} == {file.stem for file in BROKEN.glob("*.txt")}
    assert len(CASES) > 50


@pytest.mark.parametrize("file", CASES, ids=lambda file: file.stem)
def test_broken_file(file: Path) -> None:
    expected = file.with_suffix(".txt").read_text(encoding="utf-8").splitlines()
    found = problems_of(file)
    shown = "\n".join(str(problem) for problem in found)
    for line in expected:
        assert line in shown
    assert len(found) == len(expected), shown
    assert all(problem.severity == "error" for problem in found)
    assert all(problem.file == file.name for problem in found), shown


def test_place_is_the_line_of_the_subject() -> None:
    file = BROKEN / "cas-check-digit.ttl"
    (problem,) = problems_of(file)
    line = 1 + next(
        n for n, text in enumerate(file.read_text(encoding="utf-8").splitlines()) if text.startswith("sub:thing")
    )
    assert problem.place == f"cas-check-digit.ttl:{line}"


def test_all_faults_are_collected() -> None:
    files = [BROKEN / "cas-check-digit.ttl", BROKEN / "unbalanced-equilibrium.ttl", BROKEN / "syntax.ttl"]
    assert {problem.file for problem in problems_of(*files)} == {file.name for file in files}


def test_a_file_that_is_not_utf8_is_a_problem(tmp_path: Path) -> None:
    file = tmp_path / "latin.ttl"
    file.write_bytes("# caf\u00e9".encode("latin-1"))
    (problem,) = problems_of(file)
    assert "not UTF-8" in problem.message


def test_elements_must_be_readable_line_by_line() -> None:
    files = small_files()
    files["elements.ttl"] = files["elements.ttl"].replace(b":magnitude 22.99 ;", b":magnitude 23 ;")
    facts, problems = load_facts(files)
    assert facts is not None
    found = [str(problem) for problem in (*problems, *compile_index(facts)[1])]
    assert len(found) == 1
    assert "el:Na: the formula reader takes this line otherwise" in found[0]


def test_water_and_proton_must_be_components() -> None:
    files = small_files()
    line = b'sp:H2O a :Component ; skos:prefLabel "water" ; :reportKey "H2O" .'
    assert line in files["base.ttl"]
    files["base.ttl"] = files["base.ttl"].replace(line, b"")
    facts, _ = load_facts(files)
    assert facts is not None
    assert any("sp:H2O: must be declared as a :Component" in str(problem) for problem in compile_index(facts)[1])


def test_a_folder_without_readable_vocabulary_says_so() -> None:
    facts, problems = load_facts({**small_files(), "schema.ttl": b"this is no Turtle"})
    assert facts is None
    assert any(problem.file == "schema.ttl" for problem in problems)
