"""Roots of rising functions, many lanes at once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from carboy.chemistry.mixture import Array

_MOST = 60


def bracketed_root(
    function: Callable[[Array], Array],
    low: Array,
    high: Array,
    *,
    tolerance: float,
    precision: float = 0.0,
    guess: Array | None = None,
) -> Array:
    """Where a rising ``function`` is zero, ``[L]``, between ``low`` and ``high`` in each lane.

    The Illinois variant of false position (Dowell and Jarratt 1971, BIT 11, 168), with a halving whenever a bracket shrinks too little.
    Ends when ``|function|`` is below ``tolerance``, or the bracket narrower than ``precision``, everywhere. ``guess`` is tried first.
    A lane without a change of sign gets the end nearest to zero.
    """
    low, high = low.astype(float).copy(), high.astype(float).copy()
    at_low, at_high = function(low), function(high)
    kept_low = np.zeros(len(low), dtype=int)
    kept_high = np.zeros(len(low), dtype=int)
    best = np.where(np.abs(at_low) < np.abs(at_high), low, high)
    best_error = np.minimum(np.abs(at_low), np.abs(at_high))
    for turn in range(_MOST):
        width = high - low
        false = (low * at_high - high * at_low) / np.where(at_high == at_low, 1.0, at_high - at_low)
        inside = (false > low + 0.01 * width) & (false < high - 0.01 * width) & (turn % 3 != 2)
        trial = np.where(inside, false, 0.5 * (low + high))
        if turn == 0 and guess is not None:
            trial = np.clip(guess, low + 1e-6 * width, high - 1e-6 * width)
        value = function(trial)
        better = np.abs(value) < best_error
        best, best_error = np.where(better, trial, best), np.where(better, np.abs(value), best_error)
        if np.all((best_error < tolerance) | (width < precision)):
            break
        above = value > 0
        high, at_high = np.where(above, trial, high), np.where(above, value, at_high)
        low, at_low = np.where(above, low, trial), np.where(above, at_low, value)
        kept_low, kept_high = np.where(above, kept_low + 1, 0), np.where(above, 0, kept_high + 1)
        at_low = np.where(kept_low > 1, 0.5 * at_low, at_low)
        at_high = np.where(kept_high > 1, 0.5 * at_high, at_high)
    return best
