"""The graph of states: a state is the set of hazards still in the liquid, an edge a treatment that may be done in it."""

from __future__ import annotations

from collections import deque
from collections.abc import Iterator
from itertools import islice

import networkx as nx

from carboy.model.knowledge import Index, Treatment

State = frozenset[str]
_DONE = "done"
_LONGEST = 7  # treatments in a row
_LOOKED_AT = 400  # sequences looked at, cheapest first
PH = ("acid", "base")


def must_go(index: Index) -> State:
    """The hazards that some record takes, or declares untreatable; the others (ammonium) may stay, and are told."""
    taken = {key for treatment in index.treatments.values() for key in treatment.takes}
    return frozenset(taken | {key for item in index.untreatable.values() for key in item.hazards})


def applies(treatment: Treatment, state: State) -> bool:
    """Whether a treatment may be done in a state, and for more than the pH it brings on the way."""
    takes = set(treatment.takes)
    meant = takes - set(PH) or takes
    return bool(meant & state) and not set(treatment.forbidden_by) & state


def after(treatment: Treatment, state: State) -> State:
    """The state that a treatment leaves, as its record has it."""
    left = set(state) - set(treatment.takes)
    if set(treatment.leaves) & set(PH):
        left -= set(PH)
    return frozenset(left | set(treatment.leaves))


def cost(treatment: Treatment) -> float:
    """Steps, then sludge, then how harsh the reagents are."""
    filters = sum(stage.action == "filter" for stage in treatment.stages)
    return len(treatment.stages) + 2.0 * filters + 1.5 * treatment.harshness + 1.0


def state_graph(start: State, index: Index) -> nx.DiGraph:
    """Every state that can be reached, with a node (state, treatment id) for each treatment done in it."""
    graph = nx.DiGraph()
    needed = must_go(index)
    queue = deque([(start, 0)])
    graph.add_node(start)
    seen = {start}
    while queue:
        state, depth = queue.popleft()
        if not state & needed:
            graph.add_edge(state, _DONE, cost=0.0)
            continue
        if depth == _LONGEST:
            continue
        for key, treatment in sorted(index.treatments.items()):
            if not applies(treatment, state):
                continue
            then = after(treatment, state)
            if then == state:
                continue
            graph.add_edge(state, (state, key), cost=cost(treatment))
            graph.add_edge((state, key), then, cost=0.0)
            if then not in seen:
                seen.add(then)
                queue.append((then, depth + 1))
    return graph


def sequences(start: State, index: Index, most: int) -> Iterator[tuple[str, ...]]:
    """Sequences of treatments to a safe state, the cheapest first; of those with the same treatments only the first two orders."""
    graph = state_graph(start, index)
    if _DONE not in graph or not nx.has_path(graph, start, _DONE):
        return
    orders: dict[frozenset[str], int] = {}
    given = 0
    for path in islice(nx.shortest_simple_paths(graph, start, _DONE, weight="cost"), _LOOKED_AT):
        found = tuple(node[1] for node in path if isinstance(node, tuple))
        if len(set(found)) < len(found):
            continue
        kind = frozenset(found)
        orders[kind] = orders.get(kind, 0) + 1
        if orders[kind] > 2:
            continue
        yield found
        given += 1
        if given == most:
            return


def reachable(start: State, index: Index) -> State:
    """The hazards that no sequence of treatments gets rid of: what stands in every state that can be reached."""
    graph = state_graph(start, index)
    states = [node for node in graph if isinstance(node, frozenset)]
    return frozenset.intersection(*states) & must_go(index) if states else start
