"""Columns of the balances for components that never share a vessel.

A batch of vessels that hold different things has many components, of which each vessel holds a few. Two that never
stand in one vessel can take turns in one column of the matrices (a colouring of the graph of components that meet,
greedy by degree: Welsh and Powell 1967), so that the matrices are no larger than the fullest vessel needs.
"""

from __future__ import annotations

import numpy as np

from carboy.chemistry.mass_action import BoolArray, IntArray


def shared_columns(present: BoolArray) -> IntArray:
    """The column of each component, [C], for ``present`` [L, C]; H+, the first, has column 0 to itself."""
    meets = present.T.astype(float) @ present.astype(float) > 0.0
    np.fill_diagonal(meets, False)
    column = np.zeros(present.shape[1], dtype=np.intp)
    placed = [0]
    for component in 1 + np.argsort(-meets[1:].sum(axis=1), kind="stable"):
        taken = {0, *(int(column[other]) for other in placed if meets[component, other])}
        column[component] = next(place for place in range(1, len(column) + 1) if place not in taken)
        placed.append(int(component))
    return column
