"""What is said on standard error while one waits: on a terminal only, and gone when it is over."""

from __future__ import annotations

import io
import sys

import pytest

from carboy.cli import output
from carboy.cli.output import FIRST_READING, Progress, Waiting, counted_words, first_reading
from carboy.knowledge import index


class Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


def terminal(monkeypatch: pytest.MonkeyPatch) -> Terminal:
    """Standard error as a terminal; called in the test, since pytest puts its own in place when that begins."""
    made = Terminal()
    monkeypatch.setattr(sys, "stderr", made)
    return made


@pytest.mark.parametrize("compiled", [True, False])
def test_the_first_reading_is_told_where_the_graph_must_be_compiled(monkeypatch, compiled):
    shown = terminal(monkeypatch)
    monkeypatch.setattr(index, "is_compiled", lambda: compiled)
    with first_reading():
        assert shown.getvalue() == ("" if compiled else FIRST_READING)
    assert shown.getvalue() == ("" if compiled else f"{FIRST_READING}\r\033[K")


def test_nothing_is_told_where_that_is_no_terminal(monkeypatch):
    quiet = io.StringIO()
    monkeypatch.setattr(sys, "stderr", quiet)
    monkeypatch.setattr(index, "is_compiled", lambda: pytest.fail("the files need not be read"))
    with first_reading(), Waiting("Waiting"), Progress("step") as progress:
        progress(1, 2)
    assert quiet.getvalue() == ""


def test_progress_waits_a_second_and_cleans_up(monkeypatch):
    shown = terminal(monkeypatch)
    now = [0.0]
    monkeypatch.setattr(output.time, "monotonic", lambda: now[0])
    with Progress("step") as progress:
        progress(1, 9)
        assert shown.getvalue() == ""
        now[0] = 1.5
        progress(4, 9, "pour")
        assert shown.getvalue().endswith("step 4 of 9 pour")
    assert shown.getvalue().endswith("\r\033[K")


def test_counted_words():
    assert [counted_words(number, "case") for number in (0, 1, 2)] == ["0 cases", "1 case", "2 cases"]
