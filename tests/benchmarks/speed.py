"""Speed in one run beside the reference code: ``python -m tests.benchmarks.speed [rounds]``.

Ours and theirs are timed in turn, round by round, and the medians compared, so that other work on the machine weighs on
both alike. Processor time is told beside elapsed time: on a busy machine it is the steadier of the two.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from itertools import combinations

import numpy as np

from carboy.chemistry.equilibrium import solve
from carboy.chemistry.many import SolvedMany, solve_many
from tests.benchmarks.dosing_path import DosingPath
from tests.chemistry.graph_mixtures import MOL_PER_KG, components, draw, soluble, stock

# A storeroom: every two of these in every strength.
BOTTLES = (
    "hydrochloric-acid", "nitric-acid", "sulfuric-acid", "acetic-acid", "sodium-hydroxide", "ammonia", "sodium-sulfide",
    "sodium-cyanide", "sodium-carbonate", "copper-ii-sulfate-pentahydrate", "silver-nitrate", "lead-ii-nitrate",
    "mercury-ii-chloride", "potassium-chromate", "sodium-hypochlorite", "zinc-chloride",
)  # fmt: skip
STATES = 1000


class TwoBottles:
    """1,000 states, each of two substances in 1 kg of water, 1 to 500 mmol of each."""

    def __init__(self, pairs: list[tuple[str, str]]) -> None:
        random = np.random.default_rng(5)
        self.totals, water = [], []
        for number in range(STATES):
            amounts = components({name: 10.0 ** random.uniform(-3.0, -0.3) for name in pairs[number % len(pairs)]})
            water.append(MOL_PER_KG + amounts.pop("H2O", 0.0))
            self.totals.append(amounts)
        self.water = np.array(water)

    def solve(self) -> SolvedMany:
        """In one call."""
        return solve_many(stock().networks, self.totals, self.water)


def _pairs_of_the_graph() -> list[tuple[str, str]]:
    random = np.random.default_rng(6)
    return [tuple(str(n) for n in random.choice(soluble(), size=2, replace=False)) for _ in range(STATES)]  # type: ignore[misc]


def measure(things: dict[str, Callable[[], object]], rounds: int) -> dict[str, tuple[float, float, float]]:
    """Name -> ms: median and least elapsed, median of processor time."""
    elapsed: dict[str, list[float]] = {name: [] for name in things}
    processor: dict[str, list[float]] = {name: [] for name in things}
    for turn in range(rounds + 1):
        for name, thing in things.items():
            clock, used = time.perf_counter(), time.process_time()
            thing()
            if turn:  # the first round warms up
                elapsed[name].append(1e3 * (time.perf_counter() - clock))
                processor[name].append(1e3 * (time.process_time() - used))
    return {
        name: (float(np.median(elapsed[name])), min(elapsed[name]), float(np.median(processor[name])))
        for name in things
    }


def main(arguments: list[str]) -> None:
    """Prints a table and the ratios."""
    rounds = int(arguments[0]) if arguments else 15
    path = DosingPath()
    answer = path.ours()
    gap = max(abs(float(ours) - row[0]) for ours, row in zip(answer.pH, path.separate(), strict=True))
    print(f"{len(path.network.species)} species, {len(path.network.solids)} solids that can form; pH within {gap:.1e}")
    typical = [made for made in (draw(9, number) for number in range(60)) if made.style != "strong"][:40]
    ordinary = [made.solve for made in typical]
    wide = np.repeat(path.totals, 25, axis=0), np.repeat(path.water, 25)
    things: dict[str, Callable[[], object]] = {
        "41 points, one call": path.ours,
        "41 points, reference, 41 solves": path.separate,
        "41 points, reference, one incremental input": path.incremental,
        "41 points, one call, started from the answer": lambda: solve(
            path.network, path.totals, path.water, retain_gas=True, start=answer
        ),
        "one state of the path, ten solids": lambda: path.ours(slice(20, 21)),
        "40 states of up to 8 substances, one by one": lambda: [one() for one in ordinary],
        "1025 lanes of the path, one call": lambda: solve(path.network, *wide, retain_gas=True),
    }
    table = measure(things, rounds)
    bottles = {
        "1000 states, one pair of bottles": TwoBottles([("sodium-sulfide", "copper-ii-sulfate-pentahydrate")]),
        "1000 states, 120 pairs of 16 bottles": TwoBottles(list(combinations(BOTTLES, 2))),
        "1000 states, 1000 pairs of the whole graph": TwoBottles(_pairs_of_the_graph()),
    }
    assert all(group.solve().gather("converged").all() for group in bottles.values())
    table |= measure({name: group.solve for name, group in bottles.items()}, max(3, rounds // 4))
    print("| what | median ms | least ms | processor ms |\n| --- | --- | --- | --- |")
    for name, (median, least, processor) in table.items():
        print(f"| {name} | {median:.1f} | {least:.1f} | {processor:.1f} |")
    ours = table["41 points, one call"]
    for name in ("41 points, reference, 41 solves", "41 points, reference, one incremental input"):
        ratios = ", ".join(f"{theirs / mine:.1f}" for theirs, mine in zip(table[name], ours, strict=True))
        print(f"{name}: {ratios} times ours (median, least, processor)")
    lanes = table["1025 lanes of the path, one call"][2] / ours[2]
    print(f"25 times the lanes: {lanes:.1f} times the processor time")


if __name__ == "__main__":
    main(sys.argv[1:])
