"""``--mend`` and ``--apply`` on the command line."""

from __future__ import annotations

import json
import shutil
from pathlib import Path

import pytest
from typer.testing import CliRunner

from carboy.cli.main import application
from carboy.errors import InputError

CASES = Path(__file__).parents[2] / "cases"
WRONG_ORDER = CASES / "water-onto-sulfuric-acid.yaml"


def run(*words: str):
    return CliRunner().invoke(application(), list(words))


def test_mend_lists_what_was_changed():
    result = run("vet", str(WRONG_ORDER), "--mend", "--plain")
    assert result.exit_code == 1
    assert "REFUSE" in result.output
    assert "CONDITIONAL" in result.output
    assert "change places" in result.output


def test_without_mend_nothing_is_searched():
    assert "change places" not in run("vet", str(WRONG_ORDER), "--plain").output


def test_mended_file_keeps_the_old_one_and_can_be_vetted(tmp_path):
    file = tmp_path / "order.yaml"
    shutil.copy(WRONG_ORDER, file)
    result = run("vet", str(file), "--mend", "--apply", "1")
    assert result.exit_code == 1  # conditional
    assert (tmp_path / "order.yaml.bak").read_text() == WRONG_ORDER.read_text()
    assert "Mended" in file.read_text()
    assert "CONDITIONAL" in run("vet", str(file), "--plain").output
    assert sorted(one.name for one in tmp_path.iterdir()) == ["order.yaml", "order.yaml.bak"]


def test_output_is_a_new_file_only(tmp_path):
    target = tmp_path / "mended.yaml"
    words = ("vet", str(WRONG_ORDER), "--mend", "--apply", "1", "--output", str(target))
    assert run(*words).exit_code == 1
    before = target.read_text()
    again = run(*words)
    assert isinstance(again.exception, InputError)
    assert "exists already" in str(again.exception)
    assert target.read_text() == before


def test_mend_as_json():
    data = json.loads(run("vet", str(WRONG_ORDER), "--mend", "--json").output)
    assert data["report"]["verdict"] == "refuse"
    assert data["mendings"][0]["verdict"] == "conditional"
    assert data["mendings"][0]["report"]["format"] == "carboy-report/1"
    assert "steps:" in data["mendings"][0]["case"]


def test_nothing_to_mend():
    assert "Nothing is to be mended" in run("vet", str(CASES / "harmless-dilution.yaml"), "--mend", "--plain").output


@pytest.mark.parametrize(
    "words",
    [
        ("vet", str(WRONG_ORDER), "--apply", "1"),
        ("vet", str(WRONG_ORDER), "--mend", "--apply", "99"),
        ("vet", str(WRONG_ORDER), "--mend", "--output", "x.yaml"),
        ("vet", str(WRONG_ORDER), str(WRONG_ORDER), "--mend"),
        ("combine", "1 L of water", "1 L of water", "--mend", "--apply", "1"),
    ],
)
def test_wrong_use_is_told(words):
    assert isinstance(run(*words).exception, InputError)


def test_combine_is_mended_into_a_case_file(tmp_path):
    target = tmp_path / "together.yaml"
    words = (
        "combine",
        "100 mL of 96 % sulfuric acid",
        "1 L of water",
        "--mend",
        "--apply",
        "1",
        "--output",
        str(target),
    )
    result = run(*words)
    assert result.exit_code in (0, 1)
    assert target.read_text().index("1 L of water") < target.read_text().rindex("96 % sulfuric acid")
