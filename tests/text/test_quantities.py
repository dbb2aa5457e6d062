"""Numbers, units and ranges: exact values, and errors that point at the word."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from carboy.errors import InputError
from carboy.text.figures import read_number
from carboy.text.passages import Passage
from carboy.text.quantities import parse_quantity, read_strength
from carboy.text.units import NAMES_OF

INF = math.inf


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("1 000", 1000.0),
        ("1\u202f000", 1000.0),
        ("1,000", 1000.0),
        ("1,234,567.5", 1234567.5),
        ("1.234,5", 1234.5),
        ("0,5", 0.5),
        ("0,500", 0.5),
        ("12,34", 12.34),
        ("1.000", 1.0),
        (".25", 0.25),
        ("1.5e-3", 0.0015),
        ("2x10^-3", 0.002),
        ("2 x 10^-3", 0.002),
        ("2×10⁻³", 0.002),
        ("2·10**3", 2000.0),
        ("10^-3", 0.001),
        ("1/2", 0.5),
        ("1 1/2", 1.5),
        ("½", 0.5),
        ("2½", 2.5),
        ("−5", -5.0),
    ],
)
def test_numbers(text: str, value: float) -> None:
    read = read_number(Passage(text), 0)
    assert read is not None
    assert read[0] == pytest.approx(value, rel=1e-12)
    assert read[1:] == (0, len(text))


@pytest.mark.parametrize(
    ("text", "dimension", "low", "high"),
    [
        ("500 mL", "volume", 0.5, 0.5),
        ("500ml", "volume", 0.5, 0.5),
        ("500 cc", "volume", 0.5, 0.5),
        ("500 cm³", "volume", 0.5, 0.5),
        ("2 Litres", "volume", 2.0, 2.0),
        ("2 dL", "volume", 0.2, 0.2),
        ("2 cl", "volume", 0.02, 0.02),
        ("250 µL", "volume", 2.5e-4, 2.5e-4),
        ("250 \u03bcL", "volume", 2.5e-4, 2.5e-4),
        ("5 gal", "volume", 18.92705892, 18.92705892),
        ("3 drops", "volume", 1.5e-4, 1.5e-4),
        ("2 m3", "volume", 2000.0, 2000.0),
        ("5 kg", "mass", 5000.0, 5000.0),
        ("1 lb", "mass", 453.59237, 453.59237),
        ("1 oz.", "mass", 28.349523125, 28.349523125),
        ("20 mmol", "amount", 0.02, 0.02),
        ("10-50 mL", "volume", 0.01, 0.05),
        ("10 – 50 mL", "volume", 0.01, 0.05),
        ("10 to 50 mL", "volume", 0.01, 0.05),
        ("10 mL to 1 L", "volume", 0.01, 1.0),
        ("between 1 and 2 L", "volume", 1.0, 2.0),
        ("10 ± 1 mL", "volume", 0.009, 0.011),
        ("10 mL ± 5 %", "volume", 0.0095, 0.0105),
        ("about 2 L", "volume", 1.6, 2.4),
        ("~2 L", "volume", 1.6, 2.4),
        ("ca. 2 L", "volume", 1.6, 2.4),
        ("up to 3 L", "volume", 0.0, 3.0),
        ("less than 3 L", "volume", 0.0, 3.0),
        ("at least 3 L", "volume", 3.0, INF),
        ("unknown", "volume", 0.0, INF),
        ("90 s", "time", 90.0, 90.0),
        ("30 min", "time", 1800.0, 1800.0),
        ("1 h 30 min", "time", 5400.0, 5400.0),
        ("2 days", "time", 172800.0, 172800.0),
        ("22 degC", "temperature", 22.0, 22.0),
        ("22 °C", "temperature", 22.0, 22.0),
        ("-10 to -5 C", "temperature", -10.0, -5.0),
        ("295.15 K", "temperature", 22.0, 22.0),
        ("212 degF", "temperature", 100.0, 100.0),
        ("about 60 degC", "temperature", 55.0, 65.0),
        ("2 bar", "pressure", 200.0, 200.0),
        ("1 atm", "pressure", 101.325, 101.325),
        ("10 psi", "pressure", 68.94757293168, 68.94757293168),
        ("0.4 m3/s", "flow", 0.4, 0.4),
        ("360 m³/h", "flow", 0.1, 0.1),
        ("6 L/min", "flow", 1e-4, 1e-4),
        ("6 L min-1", "flow", 1e-4, 1e-4),
        ("1000 cfm", "flow", 0.4719474432, 0.4719474432),
        ("6 per hour", "air changes", 6.0, 6.0),
        ("6", "air changes", 6.0, 6.0),
        ("7-9", "pH", 7.0, 9.0),
        ("about 2", "pH", 1.5, 2.5),
        ("below 2", "pH", -1.0, 2.0),
        ("1-5 %", "share", 0.01, 0.05),
    ],
)
def test_quantities(text: str, dimension: str, low: float, high: float) -> None:
    interval = parse_quantity(text, dimension)  # type: ignore[arg-type]
    assert interval.low == pytest.approx(low, rel=1e-11)
    assert interval.high == pytest.approx(high, rel=1e-11)


@pytest.mark.parametrize(
    ("text", "unit", "low", "high"),
    [
        ("6 %", "w/w", 0.06, 0.06),
        ("6 % w/w", "w/w", 0.06, 0.06),
        ("6 wt%", "w/w", 0.06, 0.06),
        ("5 % w/v", "w/v", 0.05, 0.05),
        ("5 % (w/v)", "w/v", 0.05, 0.05),
        ("70 % v/v", "v/v", 0.7, 0.7),
        ("70 vol.-%", "v/v", 0.7, 0.7),
        ("70 % by volume", "v/v", 0.7, 0.7),
        ("2M", "mol/L", 2.0, 2.0),
        ("20 mM", "mol/L", 0.02, 0.02),
        ("20 µM", "mol/L", 2e-5, 2e-5),
        ("2 N", "eq/L", 2.0, 2.0),
        ("1 mol L-1", "mol/L", 1.0, 1.0),
        ("1 mol·L⁻¹", "mol/L", 1.0, 1.0),
        ("10-50 g/L", "g/L", 10.0, 50.0),
        ("10 mg/mL", "g/L", 10.0, 10.0),
        ("3 g/100 mL", "g/L", 30.0, 30.0),
        ("40 µg/L", "g/L", 4e-5, 4e-5),
        ("12 ppm", "mass ppm", 12.0, 12.0),
        ("12 ppb", "mass ppm", 0.012, 0.012),
        ("about 90 %", "w/w", 0.72, 1.0),
        ("at least 30 %", "w/w", 0.3, 1.0),
    ],
)
def test_strengths(text: str, unit: str, low: float, high: float) -> None:
    read = read_strength(Passage(text), 0, len(text))
    assert read is not None
    strength, start, end = read
    assert strength.unit == unit
    assert strength.value is not None
    assert (strength.value.low, strength.value.high) == pytest.approx((low, high), rel=1e-11)
    assert (start, end) == (0, len(text))


@pytest.mark.parametrize("text", ["1,2-dichloroethane", "4-nitrophenol", "N,N-dimethylformamide", "18-crown-6", "5 mm"])
def test_no_strength_at_the_front(text: str) -> None:
    assert read_strength(Passage(text), 0, len(text)) is None


@pytest.mark.parametrize(
    ("text", "dimension", "pointed", "message"),
    [
        ("100 mm", "volume", "mm", "'mm' is a length, which is not a volume"),
        ("100 g", "volume", "g", "'g' is a mass, which is not a volume"),
        ("100 mLL", "volume", "mLL", "'mLL' is not a unit of volume that is known here"),
        ("500 ML", "volume", "ML", "'ML' is not a unit of volume that is known here"),
        ("100", "volume", "0", "a unit is missing after this number; a volume needs one, such as mL or L"),
        ("5 mL mL", "volume", "mL", "'mL' cannot be placed after a volume"),
        ("-5 mL", "volume", "-5", "a volume cannot be negative"),
        ("-30 min", "time", "-30", "a time cannot be negative"),
        ("50-10 mL", "volume", "50-10", "this range runs backwards; write the smaller figure first"),
        ("1e999 L", "volume", "1e999", "this number is too large to be meant"),
        ("1/0 L", "volume", "1/0", "this fraction cannot be read as a number"),
        ("up to 1-2 L", "volume", "up to 1-2", "'up to' takes one figure, not a range"),
        ("between 1 L", "volume", "between 1", "'between' needs two figures, as in 'between 1 and 2'"),
        ("lots", "volume", "lots", "'lots' is not a volume; a number is needed first"),
        ("1 L to 5 kg", "volume", "kg", "'kg' is a mass, which is not a volume"),
        ("40", "pH", "40", "a pH lies between -1 and 15"),
        ("-300 degC", "temperature", "-300 degC", "no temperature is below absolute zero (-273.15 degC)"),
        ("20", "temperature", "0", "a unit is missing after this number; a temperature needs one, such as"),
        ("0.4 m3", "flow", "m3", "'m3' is a volume, which is not a flow"),
        ("150 %", "share", "150 %", "a share cannot be more than 100 % (or 1)"),
    ],
)
def test_errors_point_at_the_word(text: str, dimension: str, pointed: str, message: str) -> None:
    with pytest.raises(InputError) as caught:
        parse_quantity(text, dimension)  # type: ignore[arg-type]
    error = caught.value
    assert error.message.startswith(message)
    assert error.span is not None
    assert text[error.span.start : error.span.end] == pointed


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("2 m x", "'m' is molal (mol per kg of solvent), which is not read; give mol/L (M), g/L or %"),
        ("2 molal", "molal (mol per kg of solvent) is not read; give mol/L (M), g/L or %"),
        ("5 mol% x", "mole per cent is not read; give mol/L (M), g/L or %"),
        ("5 ppt", "'ppt' is read as parts per thousand by some and per trillion by others; give mg/L or %"),
        ("200 %", "a strength by mass cannot be more than 100 %"),
        ("90-110 %", "a strength by mass cannot be more than 100 %"),
        ("500 M", "no solution is stronger than 100 mol/L (water itself is 55 mol/L); check the figure and the unit"),
        ("0 M", "a strength of zero says that nothing is there; leave it out"),
        ("-1 M", "a strength cannot be negative"),
    ],
)
def test_impossible_strengths(text: str, message: str) -> None:
    with pytest.raises(InputError) as caught:
        read_strength(Passage(text), 0, len(text))
    assert caught.value.message == message


def test_a_wrong_unit_suggests_the_common_ones() -> None:
    with pytest.raises(InputError) as caught:
        parse_quantity("100 mm", "volume")
    assert caught.value.suggestions[0] == "mL"


@given(st.text(max_size=40), st.sampled_from(sorted(NAMES_OF)))
def test_any_text_gives_an_interval_or_an_input_error(text: str, dimension: str) -> None:
    try:
        interval = parse_quantity(text, dimension)  # type: ignore[arg-type]
    except InputError as caught:
        message = caught.message
    else:
        message = f"{interval.low} to {interval.high}"
        assert interval.low <= interval.high
    assert message


_PIECES = [
    "1",
    "10",
    "-",
    " ",
    " to ",
    "about ",
    "up to ",
    "%",
    "mL",
    "g/L",
    "M",
    ",",
    ".",
    "/",
    "±",
    "x10^",
    "L-1",
    "½",
    "between ",
    " and ",
]


@given(st.lists(st.sampled_from(_PIECES), max_size=8).map("".join), st.sampled_from(sorted(NAMES_OF)))
def test_pieces_of_quantities_give_an_interval_or_an_input_error(text: str, dimension: str) -> None:
    for read in (lambda: parse_quantity(text, dimension), lambda: read_strength(Passage(text), 0, len(text))):  # type: ignore[arg-type]
        try:
            read()
        except InputError as caught:
            span = caught.span
        else:
            continue
        assert span is not None
        assert 0 <= span.start <= span.end <= len(text)


@given(st.floats(min_value=1e-6, max_value=1e6), st.sampled_from(["mL", "L", "µL", "gal"]))
def test_a_written_volume_is_read_back(value: float, unit: str) -> None:
    factor = {"mL": 1e-3, "L": 1.0, "µL": 1e-6, "gal": 3.785411784}[unit]
    interval = parse_quantity(f"{value!r} {unit}", "volume")
    assert interval.exact
    assert interval.low == pytest.approx(value * factor, rel=1e-9)
