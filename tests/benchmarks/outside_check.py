"""The outside check in full: the reference code with the same constants, and with its own databases.

``python -m tests.benchmarks.outside_check [random problems] [problems a database]``
"""

from __future__ import annotations

import sys
from collections import Counter

import numpy as np

from tests.chemistry.outside_problems import (
    Compared,
    chosen_problems,
    compare,
    compare_strong,
    random_problems,
    strong_problems,
)
from tests.chemistry.own_databases import databases, own_problems

SEED = 2026
SEEDS = (2026, 2027, 7)  # of the problems put to the code's own databases


def same_constants(count: int) -> None:
    """How far apart the answers are, and each that is further than asked."""
    for kind, problems, asked in (
        ("random", random_problems(SEED, count), compare),
        ("chosen", chosen_problems(), compare),
        ("strong", strong_problems(SEED, max(count // 5, 1)), compare_strong),
    ):
        answers = [asked(*problem) for problem in problems]
        answered = [c for c in answers if c.outcome is not None]
        apart = [c for c in answers if not c.agrees]
        pH = np.abs([c.pH_gap for c in answered])
        shares = np.array([abs(a - b) / max(a, b) for c in answered for a, b in c.dissolved().values()])
        print(
            f"{kind}: {len(answers)} problems, {len(answers) - len(apart)} agree; pH gap median {np.median(pH):.1e}, "
            f"99 % {np.quantile(pH, 0.99):.1e}, largest {pH.max():.1e}; {shares.size} dissolved totals: median "
            f"{np.median(shares):.1e}, 99 % {np.quantile(shares, 0.99):.1e}, largest {shares.max():.1e}"
        )
        for c in apart:
            print("  " + _told(c))


def _told(c: Compared) -> str:
    token, share = c.worst
    reasons = "; ".join(filter(None, c.answer.reasons))
    return (
        f"{c.name} {c.draw.portions} {c.draw.vessel}: pH {c.pH_gap:+.3f}, {token} {share:.1%} {c.complaint} {reasons}"
    )


def own_databases(count: int) -> None:
    """Rates of agreement with the activity model of the code and with ours on both sides, and the constants that part the rest."""
    for davies in (False, True):
        print("with Davies on both sides" if davies else "as shipped")
        for database in databases(davies=davies):
            answers = [database.compare(salts) for seed in SEEDS for salts in own_problems(database, seed, count)]
            apart = [c for c in answers if not c.agrees]
            told = {id(c): [c.complaint] if c.complaint else database.constants_that_differ(c) for c in apart}
            # where the answer hangs on a species that only one side has, the problem is outside what both know
            outside = sum(any("is only" in words for words in constants) for constants in told.values())
            agree = len(answers) - len(apart)
            print(
                f"{database.path.name}: {agree} of {len(answers)} agree; {agree} of {len(answers) - outside} in the common domain"
            )
            blamed: Counter[str] = Counter()
            for c in apart:
                constants = told[id(c)]
                blamed.update(constants)
                salts = ", ".join(f"{salt} {amount:.1e}" for salt, amount in c.portions.items())
                metals = ", ".join(f"{token} {gap:+.2f}" for token, gap in c.metals.items() if abs(gap) > 0.3)
                print(f"  {salts}: pH {c.answer.pH[0]:.2f} ({c.pH_gap:+.2f}) {metals} | {'; '.join(constants)}")
            for constant, times in blamed.most_common():
                print(f"  {times} x {constant}")


def main(arguments: list[str]) -> None:
    """Both checks."""
    numbers = [int(argument) for argument in arguments] + [500, 100][len(arguments) :]
    same_constants(numbers[0])
    own_databases(numbers[1])


if __name__ == "__main__":
    main(sys.argv[1:])
