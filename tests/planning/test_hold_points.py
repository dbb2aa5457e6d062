"""Hold points: the margin that is stated must be that of the engine, asked by other bottles."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

import carboy
from carboy.datafiles import data_dir
from carboy.model.report import HoldPoint, Report
from carboy.text.cases import read_case
from carboy.vetting import laboratory


def vetted(text: str) -> Report:
    lab = laboratory()
    return lab.vet(read_case(text, lab.names), hold_points=True)


def shipped(name: str) -> Path:
    return data_dir("cases") / name


def bound(point: HoldPoint) -> float:
    found = re.search(r"[\d.]+$", point.must)
    assert found is not None
    return float(found[0])


def pH_points(report: Report) -> list[HoldPoint]:
    return [point for point in report.hold_points if point.must.startswith("pH")]


def test_sulfide_waits_for_the_pH() -> None:
    report = carboy.vet(shipped("mercury-sulfide-right-order.yaml"))
    (point,) = [one for one in pH_points(report) if one.step == 6]
    assert point.must.startswith("pH above")
    # H2S has pK1 7.0: the half of the sulfide is gas at pH 7, a hundredth at 9
    assert 7.0 <= bound(point) <= 9.5
    assert "pH strip" in point.test
    assert "hydrogen sulfide" in point.basis
    assert any("alarm for hydrogen sulfide" in one.must for one in report.hold_points if one.step == 6)


def test_chlorination_of_cyanide_waits_for_alkali() -> None:
    # Common practice: at pH 10 to 11 and above in the first stage, against cyanogen chloride (EPA, Managing Cyanide in Metal
    # Finishing, 2000, from memory)
    report = carboy.vet(shipped("cyanide-alkaline-chlorination.yaml"))
    (point,) = [one for one in pH_points(report) if one.step == 4]
    assert 9.5 <= bound(point) <= 11.5
    assert "cyanogen chloride" in point.basis


SULFIDE_CASE = """
title: sulfide into a buffer
vessels: {{beaker: 3 L}}
steps:
  - add: 1 L of ({buffer})
    to: beaker
  - add: 100 mL of 0.1 M sodium sulfide
    to: beaker
"""


def test_margin_holds_in_vessels_made_from_bottles() -> None:
    """Beyond the stated pH no warning stands, however the vessel was brought there; well short of it one does."""
    report = vetted(SULFIDE_CASE.format(buffer="0.2 M sodium carbonate"))
    (point,) = pH_points(report)
    must = bound(point)
    near = []
    for buffer in (
        "0.2 M sodium carbonate + 0.1 M nitric acid",
        "0.2 M sodium carbonate + 0.18 M nitric acid",
        "0.2 M sodium carbonate + 0.2 M nitric acid",
        "0.2 M sodium phosphate + 0.3 M nitric acid",
        "0.2 M sodium acetate + 0.1 M nitric acid",
    ):
        other = vetted(SULFIDE_CASE.format(buffer=buffer))
        assert other.steps[0].pH is not None
        pH = other.steps[0].pH[0]
        grave = [one for one in other.findings if one.kind == "toxic-gas" and one.signal != "note" and one.step == 2]
        near.append((pH, bool(grave)))
        if pH > must:
            assert not grave, f"{buffer}: pH {pH:.2f}"
        if pH < must - 2:
            assert grave, f"{buffer}: pH {pH:.2f}"
    assert {grave for _, grave in near} == {True, False}


RESTS = """
title: bleach quenched, then made acid
vessels: {beaker: 5 L}
steps:
  - add: 1 L of (0.3 M sodium hypochlorite + 0.05 M sodium hydroxide)
    to: beaker
  - add: 1 L of 0.3 M sodium sulfite
    to: beaker
  - add: 800 mL of 1 M hydrochloric acid
    to: beaker
"""


def test_what_was_taken_away_is_tested_before_acid() -> None:
    report = vetted(RESTS)
    rests = [one for one in report.hold_points if one.must.startswith("no ")]
    # each of the two would give its gas with the acid, had the other not taken it away
    assert [one.step for one in rests] == [3, 3]
    rests.sort(key=lambda one: "hypochlorite" not in one.must)
    assert "hypochlorite" in rests[0].must
    assert "sulfite" in rests[1].must
    assert "sulfur dioxide" in rests[1].basis
    assert "tarch-iodide" in rests[0].test
    assert "chlorine" in rests[0].basis
    # and it is so: without the quench the acid is refused
    unquenched = vetted(RESTS.replace("0.3 M sodium sulfite", "water"))
    assert any(one.kind == "toxic-gas" and one.signal == "danger" and one.step == 3 for one in unquenched.findings)


def test_acid_into_water_must_be_cool() -> None:
    report = carboy.vet(shipped("sulfuric-acid-into-water.yaml"))
    (point,) = [one for one in report.hold_points if one.must.startswith("temperature")]
    rise = float(re.search(r"up to ([\d.]+) K", point.basis)[1])  # type: ignore[index]
    stated = float(re.search(r"below (\d+)", point.must)[1])  # type: ignore[index]
    assert stated == pytest.approx(90 - rise, abs=1.5)  # ten kelvin below boiling, less the warming


def test_harmless_steps_hold_nothing() -> None:
    assert carboy.vet(shipped("harmless-dilution.yaml")).hold_points == []


def test_refused_step_gets_no_test_that_would_excuse_it() -> None:
    report = carboy.vet(shipped("cyanide-chlorination-at-ph-7.yaml"))
    refused = {one.step for one in report.findings if one.signal == "danger" and one.kind == "toxic-gas"}
    assert refused
    assert not [one for one in report.hold_points if one.step in refused]


def test_bottles_poured_together_have_none() -> None:
    assert carboy.combine("1 L of 0.1 M sodium sulfide", "1 L of 0.5 M sodium hydroxide").hold_points == []


def test_every_hold_point_has_test_basis_and_sources() -> None:
    for name in (
        "mercury-sulfide-right-order.yaml",
        "cyanide-alkaline-chlorination.yaml",
        "sulfuric-acid-into-water.yaml",
    ):
        for point in carboy.vet(shipped(name)).hold_points:
            assert ": " in point.test
            assert point.basis.endswith(".")
            assert point.sources
