"""Coefficients of an equation from its elements and charge, exactly.

Method: the coefficients are the null space of the matrix of elements (and charge) against terms, found by
Gauss-Jordan elimination over the rationals; the equation is balanced when that space has one dimension and one of its
directions has a positive number for every term.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from fractions import Fraction
from math import gcd, lcm

from carboy.errors import RuleError

Formula = tuple[Mapping[str, float], int]  # atoms per formula unit, charge
CHARGE = "charge"


def balance(
    reactants: Sequence[Formula], products: Sequence[Formula], *, fixed: Mapping[int, float] | None = None
) -> tuple[Fraction, ...]:
    """Coefficients of the reactants, then of the products, all positive: the smallest whole numbers.

    ``fixed`` gives the coefficient of some terms by position (reactants first); the others then follow from these,
    and may be fractions. Raises RuleError where no coefficients, or more than one set,
    balance every element and the charge.
    """
    columns = [_column(term, 1) for term in reactants] + [_column(term, -1) for term in products]
    known = {position: _exact(value) for position, value in (fixed or {}).items()}
    free = [position for position in range(len(columns)) if position not in known]
    keys = sorted({key for column in columns for key in column})
    rows = []
    for key in keys:
        right = -sum(
            (columns[position].get(key, Fraction(0)) * value for position, value in known.items()), Fraction(0)
        )
        rows.append([columns[position].get(key, Fraction(0)) for position in free] + [right])
    pivots = _eliminate(rows, len(free))
    if any(row[-1] != 0 and not any(row[:-1]) for row in rows):
        raise RuleError("no coefficients balance the equation with those that are written")
    loose = [column for column in range(len(free)) if column not in pivots]
    if len(loose) > (0 if known else 1):
        raise RuleError("more than one set of coefficients balances the equation; write some of them, or split it")
    if not known and not loose:
        raise RuleError("no coefficients balance the equation")
    solution = [Fraction(0)] * len(free)
    for column in loose:
        solution[column] = Fraction(1)
    for column, row in pivots.items():
        solution[column] = rows[row][-1] - sum((rows[row][other] for other in loose), Fraction(0))
    whole = [Fraction(0)] * len(columns)
    for position, value in known.items():
        whole[position] = value
    for position, value in zip(free, solution, strict=True):
        whole[position] = value
    if not known:
        whole = _smallest(whole)
    if any(value <= 0 for value in whole):
        raise RuleError(
            "no coefficients that are all positive balance the equation; a term is missing or on the wrong side"
        )
    return tuple(whole)


def imbalance(
    reactants: Sequence[tuple[float, Formula]], products: Sequence[tuple[float, Formula]], *, tolerance: float = 1e-9
) -> dict[str, float]:
    """What the products have more than the reactants, by element and ``charge``; empty if that is nothing."""
    excess: dict[str, float] = {}
    for sign, side in ((-1.0, reactants), (1.0, products)):
        for coefficient, (atoms, charge) in side:
            for key, count in (*atoms.items(), (CHARGE, charge)):
                excess[key] = excess.get(key, 0.0) + sign * coefficient * count
    return {key: value for key, value in sorted(excess.items()) if abs(value) > tolerance}


def _exact(value: float) -> Fraction:
    return Fraction(value).limit_denominator(10_000)


def _column(term: Formula, sign: int) -> dict[str, Fraction]:
    atoms, charge = term
    return {element: sign * _exact(count) for element, count in atoms.items()} | {CHARGE: Fraction(sign * charge)}


def _eliminate(rows: list[list[Fraction]], width: int) -> dict[int, int]:
    """Gauss-Jordan on ``rows`` in place; the pivot columns and their rows."""
    pivots: dict[int, int] = {}
    top = 0
    for column in range(width):
        chosen = next((row for row in range(top, len(rows)) if rows[row][column] != 0), None)
        if chosen is None:
            continue
        rows[top], rows[chosen] = rows[chosen], rows[top]
        scale = rows[top][column]
        rows[top] = [value / scale for value in rows[top]]
        for row in range(len(rows)):
            factor = rows[row][column]
            if row != top and factor != 0:
                rows[row] = [value - factor * above for value, above in zip(rows[row], rows[top], strict=True)]
        pivots[column] = top
        top += 1
    return pivots


def _smallest(values: list[Fraction]) -> list[Fraction]:
    """The same direction in the smallest whole numbers, turned so that the first one is positive."""
    multiple = lcm(*(value.denominator for value in values))
    whole = [int(value * multiple) for value in values]
    divisor = gcd(*whole) or 1
    sign = -1 if next((value for value in whole if value), 1) < 0 else 1
    return [Fraction(sign * value, divisor) for value in whole]
