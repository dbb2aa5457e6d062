"""Numbers against thresholds."""

from __future__ import annotations

import numpy as np
import pytest

from carboy.hazards.draft import DANGER, NONE, NOTE, WARNING, graded
from carboy.hazards.metals import limit_for
from carboy.vetting import laboratory

THRESHOLDS = laboratory().index.thresholds


def value(key: str) -> float:
    return THRESHOLDS[key].value.magnitude


def test_graded_from_each_threshold_on() -> None:
    figures = np.array([0.0, 0.99, 1.0, 9.9, 10.0, 99.0, 100.0, np.inf, np.nan])
    assert list(graded(figures, 1, 10, 100)) == [NONE, NONE, NOTE, NOTE, WARNING, WARNING, DANGER, DANGER, NONE]


def test_thresholds_are_those_of_the_design() -> None:
    assert (value("toxic-gas-warning-air"), value("toxic-gas-danger-air")) == (10, 1000)  # L at IDLH
    assert (value("flammable-gas-warning-air"), value("flammable-gas-danger-air")) == (10, 1000)
    assert value("closed-vessel-flammable-fraction") == 0.25
    assert (value("pressure-warning"), value("pressure-danger"), value("pressure-rating-fraction")) == (10, 50, 0.5)
    assert (value("heat-note"), value("heat-warning"), value("heat-danger")) == (5, 20, 60)
    assert value("boiling-margin") == 10
    assert value("remobilised-danger-factor") == 10
    assert value("markedly-worse-factor") == 2


@pytest.mark.parametrize("key", sorted(THRESHOLDS))
def test_every_threshold_has_its_reason_and_origin(key: str) -> None:
    one = THRESHOLDS[key]
    assert len(one.reason) > 30
    assert one.value.source in laboratory().index.sources
    assert one.value.basis


@pytest.mark.parametrize(
    ("metal", "mg_per_L"),
    # 40 CFR 261.24, table 1
    [("Hg", 0.2), ("Pb", 5.0), ("Cd", 1.0), ("Ag", 5.0), ("Ba", 100.0), ("As", 5.0), ("Se", 1.0)],
)
def test_limits_of_toxic_metals(metal: str, mg_per_L: float) -> None:
    limit = limit_for(metal, laboratory().index.limits)
    assert limit is not None
    assert limit.value.magnitude == mg_per_L
