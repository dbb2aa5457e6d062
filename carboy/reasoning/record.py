"""The record of what led to what, as a graph, and the reaction paths read from it.

Nodes are labelled portions, stocks of a component or species in a vessel after a step, and events (a rule that fired, a shift of the
fast equilibria). Edges run from cause to effect and carry the mol that passed.
"""

from __future__ import annotations

from itertools import islice, product
from typing import TYPE_CHECKING, Literal

from msgspec import Struct

from carboy.model.report import PathStep

if TYPE_CHECKING:
    import networkx

Node = tuple[str, ...]
MOST_PATHS = 12
_MOST_TRIED = 200


class Event(Struct, frozen=True):
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
        self._events: dict[Node, Event] = {}
        self._causes: dict[Node, dict[str, dict[Node, float]]] = {}  # event -> token it used -> who supplied it, mol
        self._supplied: dict[Node, dict[str, float]] = {}  # event -> mol of each token that it brought
        self._sources: dict[tuple[str, str], set[Node]] = {}  # (vessel, token) -> events that supply it now
        self._count = 0

    def _node(self, event: Event) -> Node:
        self._count += 1
        node = (event.sort, event.key, str(self._count))
        self._events[node] = event
        self._causes[node] = {}
        return node

    def graph(self) -> networkx.MultiDiGraph:
        """The whole record as a graph: nodes carry their ``event``; edges run from cause to effect, keyed by the token that passed, with the
        mol that the cause supplied as ``weight``."""
        import networkx  # costs a tenth of a second, and only those who look at the whole need it

        graph = networkx.MultiDiGraph()
        for node, event in self._events.items():
            graph.add_node(node, event=event)
        for node, by_token in self._causes.items():
            for token, suppliers in by_token.items():
                for source, weight in suppliers.items():
                    graph.add_edge(source, node, key=token, weight=weight)
        return graph

    def poured(self, vessel: str, label: str, equation: str, tokens: dict[str, float], step: int) -> None:
        """A labelled substance came into a vessel and brought ``tokens`` (mol each)."""
        node = self._node(Event(label, "label", equation, (label,), tuple(tokens), step, "label"))
        self._supplied[node] = dict(tokens)
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
                    brought = self._supplied.get(source, {}).get(token, weight)
                    self._causes[node].setdefault(token, {})[source] = brought
        if sort == "firing":
            self._supplied[node] = dict(made)
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
        return [[self._as_step(step) for step in steps] for _, steps in self._ways(node, frozenset(), {})]

    def _ways(
        self, node: Node, above: frozenset[Node], known: dict[Node, list[tuple[float, tuple[Node, ...]]]]
    ) -> list[tuple[float, tuple[Node, ...]]]:
        """Ways to an event with the mol that its own suppliers brought, the weightiest first; none through an event that is on the way."""
        if node in known:
            return known[node]
        by_token: list[list[tuple[float, tuple[Node, ...]]]] = []
        for suppliers in self._causes[node].values():
            options = [
                (weight, steps)
                for source, weight in suppliers.items()
                if source not in above
                for _, steps in self._ways(source, above | {node}, known)
            ]
            if options:
                by_token.append(sorted(options, key=lambda option: -option[0])[:MOST_PATHS])
        ways: dict[tuple[Node, ...], float] = {}
        for chosen in islice(product(*by_token), _MOST_TRIED):
            steps = tuple(dict.fromkeys([step for _, part in chosen for step in part]))
            weight = sum(share for share, _ in chosen)
            ways[(*steps, node)] = max(ways.get((*steps, node), 0.0), weight)
        ordered = sorted(ways.items(), key=lambda way: (-way[1], len(way[0])))
        known[node] = [(weight, steps) for steps, weight in ordered[:MOST_PATHS]]
        return known[node]

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
