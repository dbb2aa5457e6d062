"""Case files: the exact records of every step, goals and expectations; broken files with the message beside them."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from carboy.errors import InputError
from carboy.model.plan import (
    Add,
    Case,
    Check,
    Cover,
    Expectation,
    Filter,
    Goal,
    Interval,
    Rinse,
    Setting,
    Temper,
    Transfer,
    VesselSpec,
    Wait,
)
from carboy.text.cases import (
    case_from_mapping,
    combine_case,
    read_case,
    setting_from_mapping,
    vessel_from_mapping,
)
from carboy.text.goals import parse_goal
from carboy.text.portions import parse_portion
from tests.text.stand_in_names import StandInNames

NAMES = StandInNames()
BROKEN = Path(__file__).parents[1] / "broken" / "cases"

MERCURY = """\
title: Mercury(II) rinse water by sulfide precipitation
setting: {place: hood, hood_flow: 0.4 m3/s, temperature: 22 degC}
bottles:
  rinse-14: 3.6 L of (0.02 M mercury(II) nitrate + 0.4 M nitric acid)
vessels:
  tank: {volume: 20 L, material: HDPE, cover: open}      # open | loose | vented | sealed
steps:
  - add: rinse-14                 # a bottle (all of it), "1 L from rinse-14", or a portion
    to: tank
  - add: 180 g of sodium bicarbonate
    to: tank
    over: 30 min
  - check: pH between 7.5 and 9
    in: tank
  - add: 400 mL of 0.25 M sodium sulfide
    to: tank
    over: 10 min
  - wait: 24 h
  - filter: tank
    cake: cake-1
    filtrate: jug
  - seal: jug
goals:
  - dissolved mercury in jug below 0.2 mg/L
expect:                           # optional; `carboy cases` runs them
  - {step: 2, kind: foam}
  - {step: 4, kind: toxic-gas, absent: true}
"""


def at(low: float, high: float | None = None) -> Interval:
    return Interval(low=low, high=low if high is None else high)


def portion(text: str) -> Any:
    """A portion without places, to compare with those of a case."""
    return without_places(parse_portion(text, NAMES))


def without_places(record: Any) -> Any:
    """Portions compare their places too; a case's are in its file."""
    items = tuple(item.model_copy(update={"span": None}) for item in record.ingredients)
    return record.model_copy(update={"ingredients": items})


def steps_of(case: Case) -> list[Any]:
    found: list[Any] = []
    for step in case.steps:
        held = getattr(step, "portion", None)
        found.append(step if held is None else step.model_copy(update={"portion": without_places(held)}))
    return found


def steps(text: str, vessels: str = "  tank: 20 L\n  jug: 5 L\n", bottles: str = "") -> list[Any]:
    return steps_of(case_of(text, vessels, bottles))


def case_of(text: str, vessels: str = "  tank: 20 L\n  jug: 5 L\n", bottles: str = "") -> Case:
    head = f"bottles:\n{bottles}" if bottles else ""
    head += f"vessels:\n{vessels}" if vessels else ""
    return read_case(f"{head}steps:\n{text}", NAMES)


def test_the_case_of_the_bench_language() -> None:
    case = read_case(MERCURY, NAMES, file="mercury.yaml")
    assert case.title == "Mercury(II) rinse water by sulfide precipitation"
    assert case.file == "mercury.yaml"
    assert case.setting == Setting(place="hood", hood_flow=at(0.4), temperature=at(22.0))
    assert list(case.bottles) == ["rinse-14"]
    assert without_places(case.bottles["rinse-14"]) == portion(
        "3.6 L of (0.02 M mercury(II) nitrate + 0.4 M nitric acid)"
    )
    assert case.vessels == (VesselSpec(name="tank", volume=at(20.0), material="hdpe", cover="open"),)
    assert steps_of(case) == [
        Add(source="rinse-14", to="tank"),
        Add(portion=portion("180 g of sodium bicarbonate"), to="tank", over=at(1800.0)),
        Check(vessel="tank", quantity="pH", low=7.5, high=9.0, text="pH between 7.5 and 9"),
        Add(portion=portion("400 mL of 0.25 M sodium sulfide"), to="tank", over=at(600.0)),
        Wait(kind="wait", vessel="tank", duration=at(86400.0)),
        Filter(kind="filter", vessel="tank", cake="cake-1", filtrate="jug"),
        Cover(kind="seal", vessel="jug"),
    ]
    assert case.goals == (
        Goal(
            text="dissolved mercury in jug below 0.2 mg/L",
            quantity="dissolved",
            subject="Hg",
            vessel="jug",
            high=0.2,
            unit="mg/L",
        ),
    )
    assert case.expect == (Expectation(step=2, kind="foam"), Expectation(step=4, kind="toxic-gas", absent=True))


def test_places_of_ingredients_are_in_the_file() -> None:
    case = read_case(MERCURY, NAMES, file="mercury.yaml")
    span = case.bottles["rinse-14"].ingredients[1].span
    assert span is not None
    assert (span.place, span.text[span.start : span.end]) == ("mercury.yaml:4:58", "nitric acid")


def test_one_undeclared_vessel_is_of_glass_and_open() -> None:
    case = read_case("steps:\n  - add: 1 L of water\n  - stir\n  - wait: 5 min\n", NAMES)
    assert case.vessels == (VesselSpec(name="vessel", volume=None, material="glass", cover="open"),)
    assert steps_of(case) == [
        Add(portion=portion("1 L of water"), to="vessel"),
        Wait(kind="stir", vessel="vessel"),
        Wait(kind="wait", vessel="vessel", duration=at(300.0)),
    ]
    assert case_of("  - add: 1 L of water\n    to: beaker\n  - seal:\n", vessels="").vessels[0].name == "beaker"


def test_ways_to_take_from_a_bottle() -> None:
    bottles = "  a: 2 L of acetone\n  b: 100-120 g of zinc\n  c: 1 L of water\n"
    text = (
        "  - {add: 0.5 L from a, to: tank}\n  - {add: 500 mL of a, to: tank}\n  - {add: the rest of a, to: tank}\n"
        "  - {add: half of b, to: tank}\n  - {add: b, to: tank}\n  - {add: all of c, to: tank, over: 1-2 min}\n"
    )
    assert steps(text, bottles=bottles) == [
        Add(source="a", part=at(0.5), part_unit="L", to="tank"),
        Add(source="a", part=at(0.5), part_unit="L", to="tank"),
        Add(source="a", part=at(1.0), part_unit="L", to="tank"),
        Add(source="b", part=at(50.0, 60.0), part_unit="g", to="tank"),
        Add(source="b", part=at(40.0, 70.0), part_unit="g", to="tank"),
        Add(source="c", to="tank", over=at(60.0, 120.0)),
    ]


def test_a_vessel_may_be_a_source() -> None:
    text = "  - {add: 1 L of water, to: tank}\n  - {add: 200 mL from tank, to: jug}\n  - {add: tank, to: jug}\n"
    assert steps(text)[1:] == [
        Add(source="tank", part=at(0.2), part_unit="L", to="jug"),
        Add(source="tank", to="jug"),
    ]


@pytest.mark.parametrize(
    ("text", "step"),
    [
        ("  - {heat: 80 degC, in: tank}\n", Temper(kind="heat", vessel="tank", to=at(80.0))),
        ("  - {heat: tank, to: 80 degC}\n", Temper(kind="heat", vessel="tank", to=at(80.0))),
        ("  - {cool: 0-5 degC, in: tank}\n", Temper(kind="cool", vessel="tank", to=at(0.0, 5.0))),
        ("  - {stir: 10 min, in: tank}\n", Wait(kind="stir", vessel="tank", duration=at(600.0))),
        ("  - {stir: tank, for: 10 min}\n", Wait(kind="stir", vessel="tank", duration=at(600.0))),
        ("  - stir: tank\n", Wait(kind="stir", vessel="tank")),
        ("  - {stand: 1 h, in: tank}\n", Wait(kind="stand", vessel="tank", duration=at(3600.0))),
        ("  - wait: 2 d\n", Wait(kind="wait", vessel="", duration=at(172800.0))),
        ("  - seal: tank\n", Cover(kind="seal", vessel="tank")),
        ("  - {open: null, in: tank}\n", Cover(kind="open", vessel="tank")),
        ("  - vent: tank\n", Cover(kind="vent", vessel="tank")),
        ("  - filter: tank\n", Filter(kind="filter", vessel="tank", cake="cake", filtrate="filtrate")),
        (
            "  - {filter: tank, filtrate: jug, cake: cake-1, retained: 0.5 mL/g, passes: 1-5 %}\n",
            Filter(kind="filter", vessel="tank", cake="cake-1", filtrate="jug", retained=0.5, passes=at(0.01, 0.05)),
        ),
        ("  - {decant: tank, to: jug}\n", Filter(kind="decant", vessel="tank", cake="tank", filtrate="jug")),
        ("  - {transfer: tank, to: jug, heel: 50 mL}\n", Transfer(vessel="tank", to="jug", heel=at(0.05))),
        ("  - {transfer: 200 mL from tank, to: jug}\n", Transfer(vessel="tank", to="jug", part=at(0.2))),
        (
            "  - {transfer: tank, to: jug, part: 200 mL, over: 5 min}\n",
            Transfer(vessel="tank", to="jug", part=at(0.2), over=at(300.0)),
        ),
        (
            "  - {check: dissolved chromium(VI) below 5 mg/L, in: tank}\n",
            Check(
                vessel="tank",
                quantity="dissolved Cr(VI)",
                high=5.0,
                unit="mg/L",
                text="dissolved chromium(VI) below 5 mg/L",
            ),
        ),
        (
            "  - check: temperature in tank below 30 degC\n",
            Check(
                vessel="tank", quantity="temperature", high=30.0, unit="degC", text="temperature in tank below 30 degC"
            ),
        ),
    ],
)
def test_every_kind_of_step(text: str, step: Any) -> None:
    assert steps("  - {add: 1 L of water, to: tank}\n" + text)[1] == step


def test_rinse() -> None:
    read = steps("  - {add: 1 L of water, to: tank}\n  - filter: tank\n  - {rinse: cake, with: 50 mL of water}\n")
    assert read[2] == Rinse(vessel="cake", portion=portion("50 mL of water"))


def test_vessels_and_what_they_hold() -> None:
    case = case_of(
        "  - wait: 1 h\n",
        vessels="  drum:\n    volume: 200 L\n    cover: vented\n    rating: 20 kPa\n    holds:\n"
        "      - 100 L of water\n      - about 2 L of household bleach\n",
    )
    (drum,) = case.vessels
    assert (drum.name, drum.volume, drum.cover, drum.rating) == ("drum", at(200.0), "vented", at(20.0))
    assert [without_places(item) for item in drum.holds] == [
        portion("100 L of water"),
        portion("about 2 L of household bleach"),
    ]


def test_setting() -> None:
    data = {"place": "room", "room_volume": "60 m3", "air_changes": "4-6 per hour", "temperature": "about 20 degC"}
    assert setting_from_mapping(data) == Setting(
        place="room", room_volume=at(60.0), air_changes=at(4.0, 6.0), temperature=at(15.0, 25.0)
    )


def test_vessel_from_python() -> None:
    assert vessel_from_mapping("jar", "2 L", NAMES) == VesselSpec(name="jar", volume=at(2.0))
    assert vessel_from_mapping("jar", {"cover": "sealed"}, NAMES) == VesselSpec(name="jar", cover="sealed")


@pytest.mark.parametrize(
    ("text", "goal"),
    [
        ("pH in tank between 7 and 9", {"quantity": "pH", "vessel": "tank", "low": 7.0, "high": 9.0}),
        ("pH in tank 7-9", {"quantity": "pH", "vessel": "tank", "low": 7.0, "high": 9.0}),
        ("pH above 9", {"quantity": "pH", "low": 9.0}),
        ("pH not above 9", {"quantity": "pH", "high": 9.0}),
        (
            "dissolved cyanide below 1 mg/L",
            {"quantity": "dissolved", "subject": "CN", "high": 1.0, "unit": "mg/L"},
        ),
        (
            "dissolved chromium(VI) in jug below 0.1 mg/L",
            {"quantity": "dissolved", "subject": "Cr(VI)", "vessel": "jug", "high": 0.1, "unit": "mg/L"},
        ),
        ("hexavalent chromium below 100 µg/L", {"quantity": "total", "subject": "Cr(VI)", "high": 0.1, "unit": "mg/L"}),
        ("sulfur below 5 mg/L", {"quantity": "total", "subject": "S", "high": 5.0, "unit": "mg/L"}),
        ("total chromium below 5 ppm", {"quantity": "total", "subject": "Cr", "high": 5.0, "unit": "mg/L"}),
        ("dissolved Hg is at most 1e-6 M", {"quantity": "dissolved", "subject": "Hg", "high": 1e-6, "unit": "mol/L"}),
        (
            "dissolved sulfide in tank 2 below 5 mg/L",
            {"quantity": "dissolved", "subject": "S(-II)", "vessel": "tank 2", "high": 5.0, "unit": "mg/L"},
        ),
    ],
)
def test_goals(text: str, goal: dict[str, Any]) -> None:
    assert parse_goal(text, NAMES) == Goal(text=text, **goal)


def test_expectations() -> None:
    text = """  - {add: 1 L of water, to: tank}
goals:
  - pH in tank between 6 and 8
expect:
  - {verdict: no objection}
  - {step: 1, quantity: pH, between: [6.5, 7.5]}
  - {step: 1, quantity: dissolved_mol Hg, between: 0 and 1e-3}
  - {step: 1, quantity: gauge_kPa, below: 5, above: -1}
  - {goal: pH in tank between 6 and 8, met: yes}
  - {rule: acid-frees-hydrogen-sulfide, signal: danger, moment: contact, species: H2S, absent: true}
  - {words: strength is not known, known_failure: not yet asked}
"""
    assert case_of(text).expect == (
        Expectation(verdict="no objection"),
        Expectation(step=1, quantity="pH", low=6.5, high=7.5),
        Expectation(step=1, quantity="dissolved_mol Hg", low=0.0, high=1e-3),
        Expectation(step=1, quantity="gauge_kPa", low=-1.0, high=5.0),
        Expectation(goal="pH in tank between 6 and 8", met=True),
        Expectation(rule="acid-frees-hydrogen-sulfide", signal="danger", moment="contact", species="H2S", absent=True),
        Expectation(words="strength is not known", known_failure="not yet asked"),
    )


def test_python_data_and_yaml_give_one_case() -> None:
    data = {
        "title": "t",
        "bottles": {"a": "1 L of acetone"},
        "vessels": {"tank": {"volume": "20 L"}},
        "steps": [{"add": "a", "to": "tank"}, {"wait": "1 h"}],
        "goals": ["pH in tank above 2"],
        "expect": [{"step": 1, "kind": "fire", "absent": True}],
    }
    yaml = """title: t
bottles: {a: 1 L of acetone}
vessels: {tank: {volume: 20 L}}
steps: [{add: a, to: tank}, wait: 1 h]
goals: [pH in tank above 2]
expect: [{step: 1, kind: fire, absent: true}]
"""
    first, second = case_from_mapping(data, NAMES), read_case(yaml, NAMES)
    assert first.model_dump() == second.model_dump()


@pytest.mark.parametrize(
    ("data", "message"),
    [
        ({"steps": [{"add": "100 mm of acetone"}]}, "case.steps[1].add:1:5: 'mm' is a length, which is not an amount"),
        ({"steps": [{"add": object()}]}, "case.steps[1].add: a text, number, list or mapping is needed, not object"),
        ({"steps": [{1: "x"}]}, "case.steps[1]: a name must be a text, not 1"),
        ({"steps": b"x"}, "case.steps: a text, number, list or mapping is needed, not bytes"),
        ({"steps": [{"wait": 24}]}, "case.steps[1].wait:1:2: a unit is missing after this number"),
    ],
)
def test_python_data_that_is_wrong(data: Any, message: str) -> None:
    with pytest.raises(InputError) as caught:
        case_from_mapping(data, NAMES)
    assert str(caught.value).startswith(message)


def test_python_data_that_holds_itself() -> None:
    data: dict[str, Any] = {}
    data["steps"] = [data]
    with pytest.raises(InputError, match="nested too deeply"):
        case_from_mapping(data, NAMES)


def test_combine() -> None:
    case = combine_case(["1 L of water", "10 g of zinc"], NAMES)
    assert case.vessels == (VesselSpec(name="vessel"),)
    assert steps_of(case) == [
        Add(portion=portion("1 L of water"), to="vessel"),
        Add(portion=portion("10 g of zinc"), to="vessel"),
    ]
    assert case.title == "1 L of water + 10 g of zinc"
    sealed = combine_case(["1 L of water"], NAMES, Setting(place="hood"), VesselSpec(name="jar", cover="sealed"))
    assert (sealed.setting.place, sealed.vessels[0].cover, sealed.steps[0].to) == ("hood", "sealed", "jar")  # type: ignore[union-attr]
    with pytest.raises(InputError, match="at least one portion is needed"):
        combine_case([], NAMES)
    with pytest.raises(InputError, match="'mm' is a length"):
        combine_case(["1 L of water", "5 mm of acetone"], NAMES)


def test_files(tmp_path: Path) -> None:
    file = tmp_path / "mercury.yaml"
    file.write_text("\ufeff" + MERCURY.replace("\n", "\r\n"), encoding="utf-8")
    assert read_case(file, NAMES).goals == read_case(MERCURY, NAMES).goals
    assert read_case(str(file), NAMES).file == str(file)
    (tmp_path / "untitled-one.yaml").write_text("steps: [add: 1 L of water]", encoding="utf-8")
    assert read_case(tmp_path / "untitled-one.yaml", NAMES).title == "untitled-one"
    with pytest.raises(InputError, match="does not exist"):
        read_case(tmp_path / "none.yaml", NAMES)
    with pytest.raises(InputError, match="is no file"):
        read_case(tmp_path, NAMES)
    (tmp_path / "latin.yaml").write_bytes(b"title: \xe9\n")
    with pytest.raises(InputError, match="is not UTF-8 text"):
        read_case(tmp_path / "latin.yaml", NAMES)
    with pytest.raises(InputError, match="does not exist"):
        read_case("a\0b", NAMES)


def test_a_file_that_is_too_long() -> None:
    with pytest.raises(InputError, match="which no case needs"):
        read_case("steps:\n" + "  - wait: 1 h\n" * 100_000, NAMES)


def test_nothing_of_a_tag_is_run(tmp_path: Path) -> None:
    target = tmp_path / "made"
    with pytest.raises(InputError, match="tags"):
        read_case(f"steps: !!python/object/apply:pathlib.Path.touch ['{target}']\n", NAMES)
    assert not target.exists()


def test_every_broken_case_has_its_message() -> None:
    cases = {file.stem for file in BROKEN.glob("*.yaml")}
    assert cases == {file.stem for file in BROKEN.glob("*.txt")}
    assert len(cases) > 100


@pytest.mark.parametrize("file", sorted(BROKEN.glob("*.yaml")), ids=lambda file: file.stem)
def test_broken_cases(file: Path) -> None:
    with pytest.raises(InputError) as caught:
        read_case(file, NAMES, file=file.name)
    assert str(caught.value) == file.with_suffix(".txt").read_text(encoding="utf-8").removesuffix("\n")


def check(text: str) -> None:
    try:
        case = read_case(text + "\n", NAMES, file="x.yaml")
    except InputError as caught:
        span = caught.span
    else:
        assert case.steps
        return
    assert span is None or 0 <= span.start <= span.end <= len(span.text)


@settings(max_examples=200, deadline=None)
@given(st.text(max_size=80))
def test_any_text_gives_a_case_or_an_input_error(text: str) -> None:
    check(text)


@settings(max_examples=200, deadline=None)
@given(st.text(alphabet="ab:-[]{},&*!|>%@`'\"# \n\t?\\0", max_size=40))
def test_any_yaml_gives_a_case_or_an_input_error(text: str) -> None:
    check(text)


@settings(max_examples=200, deadline=None)
@given(st.data())
def test_a_damaged_case_gives_a_case_or_an_input_error(data: st.DataObject) -> None:
    start = data.draw(st.integers(0, len(MERCURY)))
    end = data.draw(st.integers(start, min(len(MERCURY), start + 30)))
    check(MERCURY[:start] + data.draw(st.text(max_size=6)) + MERCURY[end:])


_WORDS = ["tank", "a", "1 L of water", "5 min", "pH above 3", "20 L"]
_VERBS = ["add", "to", "in", "filter", "heat", "wait", "check", "transfer", "over", "rinse", "with", "decant", "stir"]
_VALUES = st.recursive(
    st.one_of(st.none(), st.booleans(), st.integers(), st.floats(), st.sampled_from(_WORDS)),
    lambda inner: st.one_of(
        st.lists(inner, max_size=3),
        st.dictionaries(st.sampled_from(["add", "to", "in", "filter", "heat", "volume"]), inner, max_size=3),
    ),
    max_leaves=8,
)


@settings(max_examples=300, deadline=None)
@given(
    st.fixed_dictionaries(
        {"steps": st.lists(st.dictionaries(st.sampled_from(_VERBS), _VALUES, max_size=3), max_size=4)},
        optional=dict.fromkeys(("vessels", "bottles", "goals", "expect", "setting", "title"), _VALUES),
    )
)
def test_any_data_gives_a_case_or_an_input_error(data: dict[str, Any]) -> None:
    try:
        case = case_from_mapping(data, NAMES)
    except InputError as caught:
        message = caught.message
    else:
        message = f"{len(case.steps)} steps"
    assert message
