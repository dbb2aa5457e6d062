"""Which tests at the bench speak of what is treated, and of what treats it."""

from __future__ import annotations

from collections.abc import Collection

from carboy.model.dosing import SpotTestReport
from carboy.model.knowledge import Index, SpotTest


def tests_for(keys: Collection[str], index: Index) -> list[SpotTest]:
    """The tests that detect one of ``keys``, whatever the reagent; those that detect the fewest things first."""
    found = [test for test in index.spot_tests if not test.beside_reagent and set(test.detects) & set(keys)]
    return sorted(found, key=lambda test: (len(test.detects), test.key))


def stop_tests(
    subject: Collection[str], reagent: Collection[str], pH: float | None, index: Index
) -> tuple[list[SpotTestReport], list[str]]:
    """The tests that tell when to stop dosing: whether any of the ``subject`` is left, and whether ``reagent`` is in excess. Both are report
    keys, or ``pH`` where that is what is aimed at or moved. Then a word on each test that a liquid of this ``pH`` forbids."""
    told: list[tuple[int, SpotTest, str]] = []
    forbidden: list[str] = []
    for test in index.spot_tests:
        if test.beside_reagent and not set(test.beside_reagent) & set(reagent):
            continue
        left, over = set(test.detects) & set(subject), set(test.detects) & set(reagent)
        if not left and not over:
            continue
        if test.above_pH is not None and pH is not None and pH < test.above_pH:
            forbidden.append(
                f"The test '{test.name}' is not for this liquid: it is only safe above pH {test.above_pH:g}, and this has {pH:.1f}."
            )
        elif "pH" in left | over:
            told.append((0 if left else 2, test, "tells where the pH stands"))
        else:
            role = "tells whether what is treated is still there" if left else "tells whether the reagent is in excess"
            told.append((0 if left else 1, test, role))
    told.sort(key=lambda one: (one[0], one[1].key))
    return [report_of(test, role) for _, test, role in told], forbidden


def report_of(test: SpotTest, role: str) -> SpotTestReport:
    """A test as the report has it."""
    return SpotTestReport(
        name=test.name,
        role=role,
        shows=test.shows,
        procedure=test.procedure,
        reading=test.reading,
        caution=test.caution,
        basis=test.basis,
        sources=list(test.sources),
    )
