"""Asking the routes of a waste for what a test wants to know."""

from __future__ import annotations

import functools

import carboy
from carboy.bench.make_up import Bench
from carboy.bench.ranges import Ranges
from carboy.model.treatment import Route, TreatReport
from carboy.text.portions import parse_portion
from carboy.vetting import Laboratory


@functools.cache
def treated(waste: str) -> TreatReport:
    return carboy.treat(waste)


def route_of(waste: str, treatment: str) -> Route:
    return next(route for route in treated(waste).routes if treatment in route.treatments)


def poured(lab: Laboratory, text: str, token: str) -> float:
    """mol of a component that a portion brings."""
    mixture = Bench(lab.stock, Ranges()).make_up(parse_portion(text, lab.names), "portion", 25.0).mixture
    return float(mixture.total(token)[0])
