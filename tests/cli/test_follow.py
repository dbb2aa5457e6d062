"""``vet --follow``: where every gram of an element went, as text and as JSON."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from carboy.vetting import vet


@pytest.fixture
def rinse(tmp_path: Path) -> Path:
    """0.01 mol of lead, 2.07 g (207.2 g/mol)."""
    lines = ["title: rinse", "steps:", "  - add: 1 L of 0.01 M lead nitrate", "  - add: 40 mL of 1 M sodium carbonate"]
    file = tmp_path / "rinse.yaml"
    file.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return file


def test_on_a_terminal_it_is_narrow_ascii_and_closes(carboy, rinse: Path):
    ran = carboy("vet", str(rinse), "--follow", "lead", "--plain")
    assert ran.status in (0, 1), ran.err
    part = ran.out.split("Where the lead went")[1].split("Taken as given")[0]
    assert part.isascii()
    assert max(map(len, part.splitlines())) <= 100
    assert "2.07 g of lead was put in" in part
    assert "nothing is missing" in part


def test_as_json_it_is_a_list_beside_the_rest(carboy, rinse: Path):
    ran = carboy("vet", str(rinse), "--follow", "Pb", "--follow", "sodium", "--json")
    data = json.loads(ran.out)
    assert data["format"] == "carboy-report/1"
    assert [one["element"] for one in data["accounts"]] == ["Pb", "Na"]
    assert data["accounts"][0]["gap_share"] < 1e-9
    # 40 mL x 1 M x 2 x 22.990 g/mol
    assert data["accounts"][1]["put_in_g"] == pytest.approx([1.839, 1.839], rel=1e-3)
    report = vet(rinse, follow=["lead", "Na"])
    assert [one.model_dump(mode="json") for one in report.accounts] == data["accounts"]


def test_without_it_the_list_is_empty(carboy, rinse: Path):
    assert json.loads(carboy("vet", str(rinse), "--json").out)["accounts"] == []


def test_what_is_no_element_is_refused_with_what_was_meant(carboy, rinse: Path):
    ran = carboy("vet", str(rinse), "--follow", "leed")
    assert ran.status == 2
    assert "'lead'" in ran.err
    assert ran.out == ""


def test_it_does_not_go_with_why(carboy, rinse: Path):
    assert carboy("vet", str(rinse), "--follow", "lead", "--why", "1").status == 2
