"""Checked facts -> the records of treatment: hazards of liquids, ways to take them out, and what no bench treatment is sound for."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, cast

from carboy.knowledge.loading import Facts, Node
from carboy.model.knowledge import Demand, LiquidHazard, Stage, Treatment, Untreatable, Value

ReadValue = Callable[[Node, str], Value | None]


def liquid_hazards(facts: Facts, value: ReadValue) -> dict[str, LiquidHazard]:
    """Hazards of liquids by id; ``value`` reads a value with its unit and source."""
    found = {}
    for node in facts.of_type(":LiquidHazard"):
        key = _local(node)
        found[key] = LiquidHazard(
            id=key,
            name=node.text("skos:prefLabel"),
            species=_locals(node, ":ofSpecies"),
            classes=_locals(node, ":ofClass"),
            except_classes=_locals(node, ":exceptClass"),
            above=value(node, ":above"),
            pH_low=value(node, ":pHBelow"),
            pH_high=value(node, ":pHAbove"),
        )
    return found


def treatments(facts: Facts) -> dict[str, Treatment]:
    """Treatments by id, the stages of each in order."""
    found = {}
    for node in facts.of_type(":Treatment"):
        key = _local(node)
        found[key] = Treatment(
            id=key,
            name=node.text("skos:prefLabel"),
            takes=_locals(node, ":takes"),
            stages=tuple(sorted((_stage(part) for part in node.parts(":stage")), key=lambda stage: stage.order)),
            leaves=_locals(node, ":leaves"),
            forbidden_by=_locals(node, ":forbiddenBy"),
            dilute_below={
                ref.local: part.number(":molPerLitre") or 0.0
                for part in node.parts(":dilute")
                if (ref := part.ref(":bySpecies")) is not None
            },
            harshness=node.number(":harshness") or 0.0,
            products=node.text(":products"),
            goes_to=node.text(":goesTo"),
            dangers=tuple(sorted(node.texts(":sideHazard"))),
            sources=_locals(node, ":source"),
            note=node.text(":note"),
            not_calculated=node.text(":notCalculated"),
        )
    return found


def untreatable(facts: Facts) -> dict[str, Untreatable]:
    """What leaves untreated, by id."""
    return {
        _local(node): Untreatable(
            _local(node),
            node.text("skos:prefLabel"),
            _locals(node, ":takes"),
            node.text(":reason"),
            _locals(node, ":source"),
        )
        for node in facts.of_type(":Untreatable")
    }


def _stage(part: Node) -> Stage:
    agent = part.ref(":agent")
    demands = [
        Demand(ref.local, demand.number(":molPerMol") or 0.0)
        for demand in part.parts(":demand")
        if (ref := demand.ref(":bySpecies")) is not None
    ]
    return Stage(
        order=int(part.number(":order") or 0),
        action=cast(Any, part.text(":action")),
        reagent=part.text(":reagent"),
        agent=agent.local if agent else "",
        demands=tuple(sorted(demands, key=lambda demand: demand.species)),
        excess=part.number(":excess") or 1.0,
        pH_low=part.number(":pHLow"),
        pH_high=part.number(":pHHigh"),
        minutes=part.number(":minutes") or 0.0,
        test=part.text(":test"),
    )


def _local(node: Node) -> str:
    return node.name.partition(":")[2]


def _locals(node: Node, key: str) -> tuple[str, ...]:
    return tuple(ref.local for ref in node.refs(key))
