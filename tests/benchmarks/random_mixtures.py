"""Mixtures drawn from the whole graph, in full: ``python -m tests.benchmarks.random_mixtures [count] [seed]``."""

from __future__ import annotations

import sys
import time
from collections import Counter

import numpy as np

from tests.chemistry.graph_mixtures import difference, draw


def run(count: int, seed: int) -> int:
    """Prints what is wrong with each and a summary; the number that fail."""
    random = np.random.default_rng(seed)
    failed, iterations, strengths, styles = 0, [], [], Counter()
    spent = 0.0
    for number in range(count):
        mixture = draw(seed, number)
        began = time.process_time()
        answer = mixture.solve()
        spent += time.process_time() - began
        wrong = mixture.wrong(answer)
        if number % 4 == 0:
            text = difference(answer, mixture.solve_in_order(random.permutation(len(mixture.network.components) - 1)))
            wrong += [f"in another order: {text}"] * bool(text)
        if wrong:
            failed += 1
            print(f"{number} {mixture.style} {mixture.vessel} {mixture.portions}: {wrong}")
        iterations.append(answer.iterations[0])
        strengths.append(answer.ionic_strength[0])
        styles[mixture.style] += 1
    low, middle, high = np.quantile(strengths, [0.5, 0.9, 1.0])
    print(
        f"{count} mixtures ({dict(styles)}), {failed} fail; iterations median {np.median(iterations):.0f}, most "
        f"{max(iterations)}; ionic strength median {low:.2f}, 90 % below {middle:.1f}, most {high:.0f}; "
        f"{1e3 * spent / count:.1f} ms of processor time each"
    )
    return failed


def main(arguments: list[str]) -> int:
    """Nought where all hold."""
    numbers = [int(argument) for argument in arguments] + [6000, 2026][len(arguments) :]
    return int(run(*numbers) > 0)


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
