"""Beside the reference code: the same constants over the whole graph, and its own databases.

A part of what tests/benchmarks/outside_check.py runs in full.
"""

from __future__ import annotations

import pytest

from tests.chemistry.outside_problems import (
    Compared,
    chosen_problems,
    compare,
    compare_strong,
    random_problems,
    strong_problems,
)
from tests.chemistry.own_databases import OwnDatabase, databases, own_problems


def _told(compared: Compared) -> str:
    return f"{compared.name}: {compared.draw.portions} {compared.complaint} pH {compared.pH_gap} {compared.worst}"


@pytest.mark.parametrize("number", range(4))
def test_random_problems_with_the_same_constants(number: int) -> None:
    """40 each; all within 0.02 in pH and 1 % of every dissolved total."""
    assert [
        _told(c) for c in (compare(*problem) for problem in random_problems(100 + number, 40)) if not c.agrees
    ] == []


def test_chosen_problems_with_the_same_constants() -> None:
    answers = [compare(*problem) for problem in chosen_problems()]
    assert len(answers) >= 60
    assert [_told(c) for c in answers if not c.agrees] == []


def test_strong_problems_with_the_same_constants_and_coefficients() -> None:
    """Ionic strength 0.4 to 8 mol/kg."""
    answers = [compare_strong(*problem) for problem in strong_problems(3, 40)]
    assert max(c.answer.ionic_strength[0] for c in answers) > 5.0
    assert [_told(c) for c in answers if not c.agrees] == []


@pytest.mark.parametrize("database", databases(), ids=lambda database: database.path.name)
def test_own_databases(database: OwnDatabase) -> None:
    """pH within 0.1 and metals within 0.3 log units for most; the figure and the rest are in the benchmark's page."""
    answers = [database.compare(salts) for salts in own_problems(database, 11, 60)]
    assert all(answer.answer.converged[0] for answer in answers)
    assert not any(answer.complaint for answer in answers)
    assert sum(answer.agrees for answer in answers) >= 0.75 * len(answers)
