"""Rules written for one test, at work on the real graph."""

from __future__ import annotations

from carboy.bench.walk import Walk, Walker
from carboy.model.rule import Rule
from carboy.reasoning.firing import Firing, Reactor
from carboy.text.cases import combine_case
from carboy.text.rule_reader import read_rules
from carboy.vetting import laboratory

_REST = """
  says    It is so.
  cites   from-memory
"""


def rules(*texts: str) -> tuple[Rule, ...]:
    """Rules from their ``rule``, ``needs``, ``does`` lines; what the reader asks for besides is added."""
    return read_rules("\n".join(f"rule {text.strip()}\n  title   A rule of a test{_REST}" for text in texts))


def walk(book: tuple[Rule, ...], *portions: str) -> Walk:
    """Portions poured one after the other in a laboratory with these rules only."""
    lab = laboratory()
    return Walker(lab.stock, Reactor(book, lab.stock)).walk(combine_case(portions, lab.names))


def firings(walked: Walk, step: int) -> list[Firing]:
    """The firings of a step along its dosing path."""
    path = walked.steps[step - 1].path
    assert path is not None
    return path.firings


def extent(walked: Walk, step: int = 2) -> float:
    """mol of reaction at the end of a pour, all firings together."""
    return float(sum(one.extent[-1] for one in firings(walked, step)))
