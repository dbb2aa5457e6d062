"""Reagents that a repair may put in: checked facts to records of the index."""

from __future__ import annotations

from typing import Literal, cast

from carboy.knowledge.loading import Facts, Node
from carboy.model.knowledge import Quench, RepairReagent

Serves = Literal["base", "acid", "quench", "diluent"]


def repair_reagents(facts: Facts) -> tuple[RepairReagent, ...]:
    """The reagents in the order of the file: bases, acids and quenches stand there with the mildest first."""
    nodes = sorted(facts.of_type(":RepairReagent"), key=lambda node: node.span.start if node.span else 0)
    return tuple(_reagent(node) for node in nodes)


def _reagent(node: Node) -> RepairReagent:
    substance = node.ref(":substance")
    brings = node.part(":bringsPH")
    return RepairReagent(
        id=node.name.partition(":")[2],
        name=node.text("skos:prefLabel"),
        portion_words=node.text(":portionWords"),
        substance=substance.local if substance is not None else "",
        measured_in=cast(Literal["L", "g"], node.text(":measuredIn")),
        serves=cast(Serves, node.text(":serves")),
        brings_pH=None if brings is None else brings.number(":magnitude"),
        quenches=tuple(_quench(part) for part in node.parts(":quench")),
        reason=node.text(":reason"),
        sources=tuple(sorted(ref.local for ref in node.refs(":source"))),
    )


def _quench(part: Node) -> Quench:
    against, source = part.ref(":quenchOf"), part.ref(":source")
    return Quench(
        against=against.local if against is not None else "",
        mol_per_mol=part.number(":molPerMol") or 0.0,
        source=source.local if source is not None else "",
    )
