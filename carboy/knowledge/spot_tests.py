"""Tests at the bench: checked facts to records of the index."""

from __future__ import annotations

from collections.abc import Callable, Mapping

from carboy.knowledge.loading import Facts, Node
from carboy.model.knowledge import Species, SpotTest

BENCH_QUANTITIES = frozenset({"pH", "temperature", "gas"})  # what a test may read besides components


def spot_tests(
    facts: Facts, species: Mapping[str, Species], report: Callable[[Node | None, str], None]
) -> tuple[SpotTest, ...]:
    """The spot tests by key; what a test detects that is no report key and no quantity of the bench is reported."""
    keys = {item.report_key for item in species.values() if item.component} | BENCH_QUANTITIES
    found = []
    for node in facts.of_type(":SpotTest"):
        for word in (*node.texts(":detects"), *node.texts(":besideReagent")):
            if word not in keys:
                report(node, f"'{word}' is neither the report key of a component nor pH, temperature or gas")
        found.append(
            SpotTest(
                key=node.name.partition(":")[2],
                name=node.text("skos:prefLabel"),
                shows=node.text(":shows"),
                procedure=node.text(":procedure"),
                reading=node.text(":reading"),
                detects=tuple(sorted(node.texts(":detects"))),
                beside_reagent=tuple(sorted(node.texts(":besideReagent"))),
                above_pH=node.number(":onlyAbovePH"),
                caution=node.text(":note"),
                basis=node.text(":basis"),
                sources=tuple(sorted(ref.local for ref in node.refs(":source"))),
            )
        )
    return tuple(sorted(found, key=lambda one: one.key))
