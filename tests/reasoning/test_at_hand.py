"""Passing over rules whose things are not there must not change what is found."""

from __future__ import annotations

import pytest

from carboy.reasoning.at_hand import RulesAtHand
from carboy.reasoning.binding import Surroundings, View
from carboy.vetting import laboratory
from tests.bench.reports import walked

MIXTURES = (
    ("500 mL of 6 % sodium hypochlorite", "100 mL of 31 % hydrochloric acid"),
    ("20 g of potassium permanganate", "20 g of sulfur"),
    ("1 L of (0.01 M mercury(II) nitrate + 0.5 M sodium bicarbonate)", "100 mL of 0.11 M sodium sulfide"),
    ("100 mL of nitromethane", "50 mL of ethylenediamine"),
)


@pytest.mark.parametrize("portions", MIXTURES, ids=lambda one: one[0])
def test_every_rule_that_can_bind_is_at_hand(portions: tuple[str, ...]) -> None:
    lab = laboratory()
    rules = tuple(rule for rule in lab.rules if not rule.off)
    book = RulesAtHand(rules, lab.stock)
    views = []
    for trace in walked(*portions).steps:
        assert trace.path is not None
        views += [View(course, Surroundings()) for course in (trace.path.unreacted, trace.path.mixture, trace.after)]
    passed_over = 0
    for view in views:
        able = book.of(view)
        binds = [rule for rule in rules if view.bindings(rule)]
        assert [rule.id for rule in binds if rule not in able] == []
        assert list(able) == [rule for rule in rules if rule in able]  # in the order of the book
        passed_over += len(rules) - len(able)
    assert passed_over > len(views) * len(rules) / 2


def test_two_views_have_the_rules_of_both() -> None:
    lab = laboratory()
    book = RulesAtHand(tuple(rule for rule in lab.rules if not rule.off), lab.stock)
    acid, bleach = (
        View(walked(text).steps[0].after, Surroundings())
        for text in ("100 mL of 1 M hydrochloric acid", "100 mL of 6 % sodium hypochlorite")
    )
    both = {rule.id for rule in book.of(acid, bleach)}
    assert both == {rule.id for rule in book.of(acid)} | {rule.id for rule in book.of(bleach)}
