"""Numbers, ASCII, widths and wrapping."""

from __future__ import annotations

import io
import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from carboy.reports.figures import handy, number, quantity, span
from carboy.reports.style import Style, ascii_text, columns_of, style_for, wrapped
from carboy.reports.table import table


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0"),
        (0.07648, "0.0765"),
        (12.34, "12.3"),
        (100.0, "100"),
        (1004.2, "1000"),
        (968_727.6, "969\u00a0000"),
        (-2.5, "−2.5"),
        (-12_345.0, "−12\u00a0300"),
        (4.81e-8, "4.81×10⁻⁸"),
        (5e-7, "5×10⁻⁷"),
        (2e12, "2×10¹²"),
        (math.inf, "no limit"),
        (math.nan, "unknown"),
    ],
)
def test_number(value, text):
    assert number(value) == text


@given(st.floats(min_value=1e-12, max_value=1e12))
def test_number_is_within_half_of_the_third_figure(value):
    shown = ascii_text(number(value)).replace(" ", "")
    assert float(shown) == pytest.approx(value, rel=0.0051)


def test_span_is_one_figure_where_both_print_alike():
    assert span([0.1, 0.10001]) == "0.1"
    assert span([0.0107, 0.0988]) == "0.0107 to 0.0988"


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (0.43, "mol", "0.43 mol"),
        (0.0123, "mol", "12.3 mmol"),
        (7.53e-5, "mol", "75.3 µmol"),
        (2e-12, "mol", "2×10⁻¹² mol"),
        (0.0, "mol", "0 mol"),
        (0.00357, "kg", "3.57 g"),
        (1400.0, "L", "1.4 m³"),
        (0.0785, "m3", "78.5 L"),
        (0.0126, "min", "0.756 s"),
        (51.0, "min", "51 min"),
        (2003.0, "min", "33.4 h"),
        (34_700.0, "min", "24.1 d"),
        (968_727.0, "ppm", "96.9 vol %"),
        (3830.0, "ppm", "3830 ppm"),
        (61.3, "K", "61.3 K"),
        ([0.011, 0.0988], "mol", "11 to 98.8 mmol"),
        ([0.01, 0.5], "mol", "0.01 to 0.5 mol"),
        (None, "adequate", "adequate"),
    ],
)
def test_handy_units(value, unit, text):
    assert handy(value, unit).replace("\u00a0", " ") == text


def test_quantity():
    assert quantity(24.5, "m3") == "24.5\u00a0m³"
    assert quantity(None, "adequate") == "adequate"
    assert quantity([1.0, 2.0], "degC") == "1 to 2\u00a0°C"
    assert quantity(1.18, "1") == "1.18"


@pytest.mark.parametrize(
    ("text", "plain"),
    [
        ("2 H⁺ + ClO⁻ → Cl₂ + H₂O", "2 H+ + ClO- -> Cl2 + H2O"),
        ("4.81×10⁻⁸ mol", "4.81e-8 mol"),
        ("25 °C", "25 degC"),
        ("── H⁺ ─┬─", "-- H+ -+-"),
        ("crème 1\u00a0004 m³", "creme 1 004 m3"),
        ("水", "?"),
    ],
)
def test_ascii(text, plain):
    assert ascii_text(text) == plain


@given(st.text())
def test_ascii_of_anything_is_ascii(text):
    assert ascii_text(text).isascii()


@given(st.text(alphabet="ab ₂→", max_size=200), st.integers(min_value=20, max_value=80))
def test_wrapped_keeps_every_word_within_the_width(text, width):
    lines = list(wrapped(text, width, "  - "))
    assert (
        " ".join(" ".join(lines).split()).removeprefix("-").split() == text.split(" ")
        or text.split() == " ".join(lines).split()[1:]
    )
    assert all(columns_of(line) <= width or len(line.split()) <= 2 for line in lines)


def test_terminal_control_characters_do_not_get_through():
    assert Style().finished("a\033[31mb\x07\x9b\u202ec\n") == "a[31mbc\n"


def test_colour_only_on_a_terminal_that_wants_it(monkeypatch):
    class Terminal(io.StringIO):
        encoding = "utf-8"

        def isatty(self) -> bool:
            return True

    monkeypatch.delenv("NO_COLOR", raising=False)
    monkeypatch.setenv("TERM", "xterm")
    assert style_for(Terminal()).colour
    assert not style_for(io.StringIO()).colour
    assert not style_for(Terminal(), plain=True).colour
    monkeypatch.setenv("NO_COLOR", "1")
    assert not style_for(Terminal()).colour


def test_words_show_ions_and_leave_the_rest():
    assert (
        Style().words("mostly as HgS2-2, at pH 7-8, by 2-fold, well-known H-bond")
        == "mostly as HgS₂²⁻, at pH 7-8, by 2-fold, well-known H-bond"
    )
    assert Style(plain=True).words("as HgS2-2") == "as HgS2-2"


def test_table_wraps_its_last_column_and_its_capped_ones():
    rows = [["a", "a name that is long", "a remark that is too long for one line"], ["b", "short", ""]]
    assert list(table(rows, 40, indent=2, limits={1: 10})) == [
        "  a  a name      a remark that is too",
        "     that is     long for one line",
        "     long",
        "  b  short",
    ]
    assert list(table([], 40)) == []
