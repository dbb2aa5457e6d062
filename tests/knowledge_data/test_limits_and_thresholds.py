"""Regulatory limits against the rule text, and the thresholds against the table of the design."""

from __future__ import annotations

import pytest

from carboy.knowledge.index import load_index

# 40 CFR 261.24, table 1, mg/L
TOXICITY_CHARACTERISTIC = {"As": 5.0, "Ba": 100.0, "Cd": 1.0, "Cr": 5.0, "Pb": 5.0, "Hg": 0.2, "Se": 1.0, "Ag": 5.0}

THRESHOLDS = {
    "toxic-gas-warning-air": (10, "L"),
    "toxic-gas-danger-air": (1000, "L"),
    "flammable-gas-warning-air": (10, "L"),
    "flammable-gas-danger-air": (1000, "L"),
    "closed-vessel-flammable-fraction": (0.25, "1"),
    "pressure-warning": (10, "kPa"),
    "pressure-danger": (50, "kPa"),
    "pressure-rating-fraction": (0.5, "1"),
    "heat-note": (5, "K"),
    "heat-warning": (20, "K"),
    "heat-danger": (60, "K"),
    "boiling-margin": (10, "K"),
    "foam-note-freeboard-fraction": (0.1, "1"),
    "remobilised-danger-factor": (10, "1"),
    "markedly-worse-factor": (2, "1"),
}


def test_toxicity_characteristic_of_the_metals() -> None:
    limits = {item.subject: item.value for item in load_index().limits if item.kind == "toxicity-characteristic"}
    assert {subject: limits[subject].magnitude for subject in TOXICITY_CHARACTERISTIC} == TOXICITY_CHARACTERISTIC
    assert all(value.unit == "mg/L" for value in limits.values())


def test_one_limit_for_each_subject_and_kind() -> None:
    keys = [(item.subject, item.kind) for item in load_index().limits]
    assert len(keys) == len(set(keys))


@pytest.mark.parametrize(("key", "value"), THRESHOLDS.items())
def test_threshold(key: str, value: tuple[float, str]) -> None:
    threshold = load_index().thresholds[key]
    assert (threshold.value.magnitude, threshold.value.unit) == value


def test_every_threshold_gives_its_reason_in_one_sentence() -> None:
    for key, threshold in load_index().thresholds.items():
        assert threshold.reason.endswith("."), key
        assert len(threshold.reason.split()) >= 8, key
