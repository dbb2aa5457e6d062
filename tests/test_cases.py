"""Every case file is run on the engine and its expectations are checked; the index of the folder names each of them once."""

from __future__ import annotations

import re
from itertools import combinations
from pathlib import Path

import pytest

from carboy.model.plan import Add, Case, Expectation
from carboy.rulebook.expectations import check_expectations
from carboy.text.cases import read_case
from carboy.vetting import Laboratory

FOLDER = Path(__file__).resolve().parents[1] / "cases"
FILES = sorted(FOLDER.glob("*.yaml"))
LEAST = 26
_ran: set[str] = set()


@pytest.fixture(scope="module")
def lab() -> Laboratory:
    return Laboratory()


def _read(name: str, lab: Laboratory) -> Case:
    return read_case(FOLDER / name, lab.names)


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.stem)
def test_case(path: Path, lab: Laboratory) -> None:
    case = _read(path.name, lab)
    assert case.expect, "a case without expectations shows nothing"
    failures = check_expectations(lab.vet(case), case)
    _ran.add(path.name)
    assert not failures, "\n".join(f"{failure.text}: {failure.reason}" for failure in failures)


def test_every_case_on_disk_is_run(request: pytest.FixtureRequest) -> None:
    on_disk = {path.name for path in FOLDER.rglob("*") if path.is_file() and path.suffix in (".yaml", ".yml")}
    assert on_disk == {path.name for path in FILES}
    assert len(on_disk) >= LEAST
    chosen = {item.name for item in request.session.items if item.name.startswith("test_case[")}
    if len(chosen) == len(FILES):  # the whole file was asked for, not one case of it
        assert _ran == on_disk


def test_readme_lists_each_case_once() -> None:
    listed = re.findall(r"`([\w-]+\.yaml)`", (FOLDER / "README.md").read_text(encoding="utf-8"))
    assert sorted(listed) == [path.name for path in FILES]


def test_each_case_says_how_it_was_worked_out() -> None:
    missing = [
        path.name for path in FILES if "worked" not in path.read_text(encoding="utf-8").lower().split("title:")[0]
    ]
    assert missing == ["unrecognised-bottle.yaml"]  # which says that there is nothing to work out


def test_titles_differ(lab: Laboratory) -> None:
    titles = [_read(path.name, lab).title for path in FILES]
    assert len(set(titles)) == len(titles)


def test_known_failures_stand_beside_expectations_that_hold(lab: Laboratory) -> None:
    for path in FILES:
        expect = _read(path.name, lab).expect
        assert any(not one.known_failure for one in expect), path.name


def test_three_bottles_are_quiet_in_pairs(lab: Laboratory) -> None:
    case = _read("three-bottles-together.yaml", lab)
    portions = [step.portion.text for step in case.steps if isinstance(step, Add) and step.portion is not None]
    assert len(portions) == 3
    for pair in combinations(portions, 2):
        report = lab.combine(pair)
        assert report.verdict == "no objection", pair
        assert {finding.signal for finding in report.findings} <= {"note"}, pair
    assert lab.combine(tuple(portions)).verdict == "refuse"


def test_an_expectation_can_fail(lab: Laboratory) -> None:
    case = _read("zinc-and-hydrochloric-acid.yaml", lab)
    wrong = (
        Expectation(step=2, kind="flammable-gas", species="H2", absent=True),
        Expectation(step=2, kind="toxic-gas", species="Cl2"),
        Expectation(verdict="no objection"),
        Expectation(step=2, quantity="dissolved_mol Zn", low=0.3),
        Expectation(step=2, kind="flammable-gas", known_failure="it is found all the same"),
        Expectation(step=2, kind="flammable-gas", words="words that no report holds"),
    )
    report = lab.vet(case)
    failures = check_expectations(report, case.model_copy(update={"expect": wrong}))
    assert [failure.expectation for failure in failures] == list(wrong)
