"""A case that is written and read again is the same case."""

from __future__ import annotations

import math
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from carboy.model.plan import Case, Interval
from carboy.text.case_writer import case_text, quantity_text, with_vessel
from carboy.text.cases import read_case
from carboy.text.quantities import parse_quantity
from carboy.vetting import laboratory

CASES = sorted((Path(__file__).parents[2] / "cases").glob("*.yaml"))


def content(case: Case) -> dict:
    """Everything of a case but where it was read."""
    return case.model_dump(exclude={"file"})


@pytest.mark.parametrize("file", CASES, ids=lambda file: file.stem)
def test_shipped_cases_come_back(file):
    names = laboratory().names
    case = read_case(file, names)
    again = read_case(case_text(case), names)
    assert content(again) == content(case)
    assert case_text(again) == case_text(case)


ALL_STEPS = """\
title: "Every kind of step: with a colon, and # no comment"
setting: {place: room, room_volume: 33.3 m3, air_changes: 2-6 /h, temperature: -5 to 4 degC}
bottles:
  rinse no. 3: about 6 L of (0.02 M copper(II) nitrate + 0.3 M nitric acid)
  powder: 100 g of sodium carbonate
vessels:
  tank: {volume: 20-25 L, material: HDPE, cover: loose, rating: 50 kPa, holds: 1 L of water}
  jar: 2 L
steps:
  - add: 1 L from rinse no. 3
    to: tank
    over: 90 s
  - add: the rest of rinse no. 3
    to: tank
  - add: half of powder
    to: tank
    over: 1 h 30 min
  - add: all of powder
    to: tank
  - stir: 10 min
    in: tank
  - heat: 60 degC
    in: tank
  - cool: 5-10 degC
    in: tank
  - check: pH in tank between 8 and 10
  - check: temperature below 30 degC
    in: tank
  - stand: tank
  - decant: tank
    to: jar
    passes: 1-3 %
    retained: 0.5 mL/g
  - filter: jar
    cake: paper
    filtrate: flask
  - rinse: paper
    with: 50 mL of water
  - transfer: 100 mL of flask
    to: jar
    over: up to 5 min
  - transfer: flask
    to: jar
    heel: 5 mL
  - seal: jar
  - open: jar
  - vent: jar
  - wait: 2 d
goals:
  - pH in jar between 6 and 12
expect:
  - {step: 3, quantity: dissolved_mol Cu, below: 1.0e-6}
  - {step: 3, kind: foam, absent: true, words: "comma, colon: and so on"}
  - {goal: pH in jar between 6 and 12, met: true, known_failure: 'it is "not" so'}
"""


def test_every_kind_of_step_comes_back():
    names = laboratory().names
    case = read_case(ALL_STEPS, names)
    assert content(read_case(case_text(case, ["Two\nlines", ""]), names)) == content(case)
    assert case_text(case, ["Two\nlines"]).startswith("# Two\n# lines\ntitle:")


def test_case_without_vessels_comes_back():
    names = laboratory().names
    case = read_case(
        "title: t\nsteps:\n  - add: 1 L of water\n  - add: 2-5 g of sodium carbonate\n  - wait: 1 h\n", names
    )
    assert content(read_case(case_text(case), names)) == content(case)


@settings(max_examples=200, deadline=None)
@given(
    st.floats(1e-6, 1e5),
    st.one_of(st.just(0.0), st.floats(0.0, 1e5), st.just(math.inf)),
    st.sampled_from([("L", "volume"), ("g", "mass"), ("s", "time"), ("kPa", "pressure"), ("m3/s", "flow")]),
)
def test_quantities_come_back(low, width, measured):
    unit, dimension = measured
    interval = Interval(low=low, high=low + width)
    again = parse_quantity(quantity_text(interval, unit), dimension)
    assert again.low == pytest.approx(interval.low, rel=1e-11)
    assert again.high == pytest.approx(interval.high, rel=1e-11)


def test_only_the_named_vessel_is_replaced():
    assert with_vessel("dissolved mercury in tank below 0.2 mg/L", "tank", "tank-filtrate") == (
        "dissolved mercury in tank-filtrate below 0.2 mg/L"
    )
    assert with_vessel("pH in tank 2 above 7", "tank 20", "jug") == "pH in tank 2 above 7"
    assert with_vessel("pH above 7", "tank", "jug") == "pH above 7"
