"""The record of what led to what, as a graph, and the reaction paths read from it.

Nodes are labelled portions, stocks of a component or species in a vessel after a step, and events (a rule that fired, a shift of the
fast equilibria). Edges run from cause to effect and carry the mol that passed.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import islice
from typing import Literal

import networkx as nx

from carboy.model.report import PathStep

Node = tuple[str, ...]
MOST_PATHS = 12


@dataclass(frozen=True)
class Event:
    """One event: the rule (or ``equilibrium``), its equation and the step."""

    key: str
    rule: str
    equation: str
    consumed: tuple[str, ...]
    made: tuple[str, ...]
    step: int
    sort: Literal["label", "firing", "equilibrium"]


class Record:
    """Grows while a plan is walked; read afterwards."""

    def __init__(self) -> None:
        self.graph: nx.MultiDiGraph = nx.MultiDiGraph()
        self._events: dict[Node, Event] = {}
        self._sources: dict[tuple[str, str], set[Node]] = {}  # (vessel, token) -> events that supply it now
        self._count = 0

    def _node(self, event: Event) -> Node:
        self._count += 1
        node = (event.sort, event.key, str(self._count))
        self._events[node] = event
        self.graph.add_node(node)
        return node

    def poured(self, vessel: str, label: str, equation: str, tokens: dict[str, float], step: int) -> None:
        """A labelled substance came into a vessel and brought ``tokens`` (mol each)."""
        node = self._node(Event(label, "label", equation, (label,), tuple(tokens), step, "label"))
        self.graph.nodes[node]["weight"] = tokens
        for token in tokens:
            self._sources.setdefault((vessel, token), set()).add(node)

    def moved(self, source: str, target: str, tokens: tuple[str, ...]) -> None:
        """Content went from one vessel to another."""
        for token in tokens:
            came = self._sources.get((source, token))
            if came:
                self._sources.setdefault((target, token), set()).update(came)

    def fired(
        self,
        vessel: str,
        rule: str,
        equation: str,
        consumed: dict[str, float],
        made: dict[str, float],
        step: int,
        sort: Literal["firing", "equilibrium"] = "firing",
        shown: tuple[tuple[str, ...], tuple[str, ...]] | None = None,
    ) -> Node:
        """An event used ``consumed`` and made ``made`` (mol each)."""
        left, right = shown if shown is not None else (tuple(consumed), tuple(made))
        node = self._node(Event(rule, rule, equation, left, right, step, sort))
        for token, weight in consumed.items():
            for source in self._sources.get((vessel, token), ()):
                if source != node and self._events[source].step <= step:
                    self.graph.add_edge(source, node, key=token, weight=weight)
        if sort == "firing":
            for token in made:
                self._sources.setdefault((vessel, token), set()).add(node)
        return node

    def sources(self, vessel: str, token: str, step: int) -> list[Node]:
        """The events up to a step that supply a component in a vessel."""
        return sorted(node for node in self._sources.get((vessel, token), ()) if self._events[node].step <= step)

    def events_of(self, rule: str, step: int) -> list[Node]:
        """The firings of a rule in a step."""
        return [
            node
            for node, event in self._events.items()
            if event.sort == "firing" and event.rule == rule and event.step == step
        ]

    def paths(self, node: Node) -> list[list[PathStep]]:
        """All ways from a label to an event, the weightiest first; each ends in the event itself.

        A way holds every label that the event needs through one choice of its events, so it is a small tree written in order:
        causes before effects.
        """
        ways = list(islice(self._ways(node, frozenset()), MOST_PATHS))
        ways.sort(key=lambda way: (-way[0], len(way[1])))
        return [[self._as_step(step) for step in steps] for _, steps in ways]

    def _ways(self, node: Node, above: frozenset[Node]):  # type: ignore[no-untyped-def]
        if node in above:
            return
        by_token: dict[str, list[tuple[float, Node]]] = {}
        for source, _, token, weight in self.graph.in_edges(node, keys=True, data="weight"):
            brought = self.graph.nodes[source].get("weight", {}).get(token, weight)
            by_token.setdefault(token, []).append((brought, source))
        if not by_token:
            yield 0.0, [node]
            return
        for choices in by_token.values():
            choices.sort(key=lambda pair: -pair[0])
        depth = max(len(choices) for choices in by_token.values())
        for rank in range(min(depth, MOST_PATHS)):
            steps: list[Node] = []
            weight = 0.0
            for choices in by_token.values():
                amount, source = choices[min(rank, len(choices) - 1)]
                weight += amount
                best = next(self._ways(source, above | {node}), None)
                if best is not None:
                    steps += [step for step in best[1] if step not in steps]
            yield weight, [*steps, node]

    def _as_step(self, node: Node) -> PathStep:
        event = self._events[node]
        return PathStep.model_validate(
            {
                "rule": event.rule,
                "equation": event.equation,
                "from": list(event.consumed),
                "to": list(event.made),
                "step": event.step,
            }
        )
