"""The three stages of a solution: rough start, interior point, finish.

With gamma and the mass of water held, the balances are the gradient of a convex function of the logarithms of the
components' activities; ``ln`` saturation ratio <= 0 of each solid and ``ln(sum p) <= ln(available)`` of the gases
(log-sum-exp, convex too) are its constraints, and the moles of solid and of bubbled gas are the multipliers. Hence:

1. :func:`rough_start`: generalised iterative scaling (Darroch and Ratcliff 1972), which lowers the convex function at
   each pass and solves no equations;
2. :func:`interior_point`: primal-dual, the phases weighted by the most that could form of each;
3. :func:`finish`: Newton with the phases that are present as equalities and with ionic strength, activity of water
   and mass of water as unknowns of their own, so that it ends quadratically and small balances beside large solids
   keep their digits.
"""

from __future__ import annotations

import numpy as np
from msgspec import Struct

from carboy.chemistry.mass_action import (
    KG_PER_MOL_WATER,
    BoolArray,
    Constraints,
    IntArray,
    Lanes,
    Medium,
    State,
    Terms,
    amounts_of,
    diagonal_of,
    ln_constants,
    ln_saturation,
    matrix_vector,
    pairs_of,
    square,
    term_amounts,
    vector_matrix,
)
from carboy.chemistry.network import FloatArray

BALANCE = 1e-9  # of the gross terms
SUPERSATURATION = 1e-6 * np.log(10.0)  # in ln
_TRACE = 1e-12  # mol of a phase, of the most that could form, below which its sign does not matter
_LEAST_CENTRE = 1e-9
_PATIENCE = 8  # turns of the finish without a change of phases
_LAST_STEP = 1e-6  # of an ln activity; the error after a Newton step is of the order of its square
_LEAVING = 0.25  # share of the lanes at work that must be done before they are taken out, which has its price too
_STEADY = 3  # turns of the interior point with the same activity coefficients and water
_SHRINK = 0.05  # of the centring, from turn to turn
_TIE = 0.02  # of the error of the balances, below which the centring does not go


class Pace(Struct, frozen=True):
    """How carefully a solution is approached."""

    passes: int  # of the rough start
    rounds: int  # of the first guess of solids
    turns: int  # of the interior point, at most
    rate: float  # share by which ionic strength and water follow when they do
    longest: float  # largest step of an ln activity
    close: float  # relative error of balances and complementarity at which the interior point hands over
    shift: float = 0.0  # of the first guess of ln a(H+)
    direct: int = 0  # turns of the finish without the interior point, where no phase seems to form


def first_state(lanes: Lanes) -> State:
    """A guess from the totals alone: a tenth of each component free, near neutral."""
    count, size = lanes.totals.shape
    x = np.zeros((count, size))
    with np.errstate(divide="ignore", invalid="ignore"):
        x[:, 1:] = np.where(lanes.totals[:, 1:] > 0.0, np.log(0.1 * np.maximum(lanes.totals[:, 1:], 1e-30)), -20.0)
    x[:, 0] = np.log(1e-7)
    x[lanes.absent] = 0.0
    strength = np.minimum(np.abs(lanes.totals).sum(axis=1), 0.3)
    molality = np.minimum(np.abs(lanes.totals).sum(axis=1), 10.0)
    return State(x, np.zeros(lanes.allowed.shape), strength, molality, np.zeros(count))


def _update_medium(lanes: Lanes, state: State, sums: FloatArray, rate: float, taken: FloatArray) -> None:
    """Move ionic strength, molality and water a part of the way.

    ``sums`` [L, 4] are the terms' sums of z^2, of neutral ones, of water and of all aqueous; ``taken`` is the H2O in
    phases, mol.
    """
    kg = np.exp(state.ln_water)
    state.strength += rate * (np.minimum(0.5 * sums[:, 0] / kg, 100.0) - state.strength)
    state.molality += rate * (np.minimum(sums[:, 3] / kg, 200.0) - state.molality)
    left = KG_PER_MOL_WATER * (lanes.water - sums[:, 2] - taken)
    change = np.log(np.maximum(np.maximum(left, lanes.least_water), 0.2 * kg)) - state.ln_water
    state.ln_water += rate * np.minimum(np.maximum(change, -0.5), 0.5)


def rough_start(terms: Terms, lanes: Lanes, state: State, passes: int) -> None:
    """Iterative scaling in place; solids and bubbles are left out of account."""
    size = terms.size
    surplus, deficit = np.maximum(lanes.totals, 0.0), np.maximum(-lanes.totals, 0.0)
    none = np.zeros(lanes.number.size)
    absent = lanes.absent if lanes.absent.any() else None
    fixed = ln_constants(terms, lanes, state, Medium.at(terms, state.strength, state.molality))
    for turn in range(passes):
        amounts = amounts_of(terms, state, fixed)
        parts = amounts @ terms.scaling
        demand, supply = parts[:, :size], parts[:, size : 2 * size]
        stiffness = (parts[:, 2 * size : 3 * size] + parts[:, 3 * size :]) / np.maximum(demand + supply, 1e-300)
        ratio = np.maximum(surplus + supply, 1e-300) / np.maximum(deficit + demand, 1e-300)
        step = np.log(ratio) / np.maximum(stiffness, 1.0)
        np.minimum(np.maximum(step, -20.0, out=step), 20.0, out=step)
        if absent is not None:
            step[absent] = 0.0
        state.x += step
        if turn % 4 == 3:
            _update_medium(lanes, state, amounts @ terms.features[:, size:], 0.5, none)
            fixed = ln_constants(terms, lanes, state, Medium.at(terms, state.strength, state.molality))


def rough_solids(terms: Terms, lanes: Lanes, state: State, rounds: int) -> None:
    """A first guess of the solids, in place: one a round, the most supersaturated first, as far as its scarcest
    component goes.

    The activity of that component (or of those equally scarce) is lowered until the solid is just saturated.
    """
    solids = terms.solid_nu.shape[0]
    if solids == 0:
        return
    excess = ln_saturation(terms, lanes, state, Medium.at(terms, state.strength, state.molality))
    left = np.maximum(lanes.totals, 0.0)
    every = np.arange(lanes.number.size)
    uses = terms.solid_nu > 0.0
    uses[:, 0] = False
    divisor = np.where(uses, terms.solid_nu, 1.0)
    excess[:, ~uses.any(axis=1)] = -np.inf
    for _ in range(min(rounds, solids)):
        solid = excess.argmax(axis=1)
        over = excess[every, solid]
        which = np.flatnonzero(over > 0.0)
        if which.size == 0:
            return
        if which.size < over.size:
            solid, over = solid[which], over[which]
        rows = terms.solid_nu[solid]
        shares = np.where(uses[solid], left[which] / divisor[solid], np.inf)
        amount = np.maximum(shares.min(axis=1), 0.0)
        scarce = shares <= (1.0 + 1e-3) * amount[:, None]  # at an equivalence point more than one
        lowered = scarce * (over / (scarce * rows).sum(axis=1))[:, None]
        state.x[which] -= lowered
        excess[which] -= lowered @ terms.solid_nu.T
        state.phases[which, solid] += amount
        left[which] = np.maximum(left[which] - amount[:, None] * rows, 0.0)


def _solve(matrix: FloatArray, right: FloatArray) -> FloatArray:
    """Batched solution; lanes whose matrix is singular are solved by least squares."""
    try:
        return np.asarray(np.linalg.solve(matrix, right[..., None])[..., 0])
    except np.linalg.LinAlgError:
        answer = np.empty_like(right)
        for lane in range(right.shape[0]):
            try:
                answer[lane] = np.linalg.solve(matrix[lane], right[lane])
            except np.linalg.LinAlgError:
                answer[lane] = np.linalg.lstsq(matrix[lane], right[lane], rcond=None)[0]
        return answer


def interior_point(terms: Terms, lanes: Lanes, state: State, pace: Pace) -> IntArray:
    """Primal-dual interior point in place; returns the iterations of each lane.

    The activities take their own length of step: where only the slacks are held back, their difference from the
    undersaturation is made up by the next turn. Activity coefficients and water are held for a few turns at a time.
    """
    longest = pace.longest
    count, size = lanes.totals.shape
    turns = np.zeros(count, dtype=np.intp)
    live = np.arange(count)
    whole = state
    state = whole.take(live)
    centre = np.full(count, 0.1)
    slack = np.ones(lanes.allowed.shape)
    for turn in range(pace.turns):
        if turn % _STEADY == 0:
            medium = Medium.at(terms, state.strength, state.molality)
            fixed = ln_constants(terms, lanes, state, medium)
        amounts = amounts_of(terms, state, fixed)
        held = Constraints.at(terms, lanes, state, medium)
        if turn == 0:
            slack = np.maximum(-held.excess, 1.0)
            state.phases = np.where(lanes.allowed, np.maximum(state.phases, centre[:, None] * lanes.most / slack), 0.0)
        sums = amounts @ terms.sums
        in_phases = held.sum_over(terms, state.phases)
        gradient = sums[:, :size] - lanes.totals + in_phases
        gross = sums[:, size : 2 * size] + np.abs(lanes.totals) + np.abs(in_phases) + 1e-300
        gradient[lanes.absent] = 0.0
        share = np.abs(gradient) / gross
        off = np.where(lanes.allowed, held.excess + slack, 0.0)
        gaps = state.phases * slack
        gap = (gaps / lanes.most).max(axis=1)
        if turn:
            open_by = np.maximum(np.maximum(0.1 * share.max(axis=1), gap), np.abs(off).max(axis=1))
            done = open_by < pace.close
            ready = int(np.count_nonzero(done))
            if ready and (ready == live.size or ready >= _LEAVING * live.size):
                whole.put(live[done], state.take(done))
                turns[live[done]] = turn
                stay = ~done
                live = live[stay]
                if live.size == 0:
                    return turns
                lanes, state, held = lanes.take(stay), state.take(stay), held.take(stay)
                centre, slack, gap, gaps = centre[stay], slack[stay], gap[stay], gaps[stay]
                amounts, sums, gradient, off = amounts[stay], sums[stay], gradient[stay], off[stay]
                share, gross = share[stay], gross[stay]
                medium, fixed = medium.take(stay), fixed[stay]
        # The proton balance may be of tiny terms; it is held against all that is there, or it would keep the centre up.
        share[:, 0] *= gross[:, 0] / (gross[:, 0] + lanes.hundredth)
        loose = np.minimum(share.max(axis=1), 1.0)
        centre = np.minimum(centre, np.maximum(np.minimum(centre, gap) * _SHRINK, _TIE * loose))
        centre = np.maximum(centre, _LEAST_CENTRE)
        phases = state.phases
        weight = phases / slack
        matrix = amounts @ terms.nu_pairs
        matrix += weight[:, :-1] @ terms.solid_pairs
        if held.any_gas:
            matrix += (phases[:, -1:] * held.shares) @ terms.gas_pairs
        matrix = square(matrix, size)
        if held.any_gas:
            row = held.gas_row
            matrix += (weight[:, -1] - phases[:, -1])[:, None, None] * (row[:, :, None] * row[:, None, :])
        wanted = centre[:, None] * lanes.most - gaps
        pull = np.where(lanes.allowed, (wanted + phases * off) / slack, 0.0)
        right = -gradient - held.sum_over(terms, pull)
        diagonal = diagonal_of(matrix)
        root = np.where(diagonal > 0.0, diagonal, 1.0)
        root[lanes.absent] = 1.0
        np.divide(1.0, np.sqrt(root, out=root), out=root)
        matrix *= root[:, :, None]
        matrix *= root[:, None, :]
        diagonal += 1e-13
        diagonal[lanes.absent] = 1.0
        step = root * _solve(matrix, root * right)
        step[lanes.absent] = 0.0
        if not np.isfinite(step).all():
            step = np.nan_to_num(step, nan=0.0, posinf=longest, neginf=-longest)
        slack_step = -off - held.along(terms, lanes, step)
        phase_step = np.where(lanes.allowed, (wanted - phases * slack_step) / slack, 0.0)
        primal = np.minimum(1.0, longest / np.maximum(np.abs(step).max(axis=1), 1e-300))
        # As far as 99 % of the way to where a slack or an amount of phase would vanish.
        short = np.minimum(primal, -0.99 / np.minimum((slack_step / slack).min(axis=1), -1e-300))
        dual = -0.99 / np.minimum((phase_step / np.maximum(phases, 1e-300)).min(axis=1), -1e-300)
        state.x += primal[:, None] * step
        slack = slack + short[:, None] * slack_step
        state.phases = phases + np.minimum(dual, 1.0)[:, None] * phase_step
        if turn % _STEADY == _STEADY - 1:
            _update_medium(lanes, state, sums[:, 2 * size :], pace.rate, held.water_in(terms, state.phases))
    whole.put(live, state)
    turns[live] = pace.turns
    return turns


def residuals(terms: Terms, lanes: Lanes, state: State) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Balance of the components over gross terms [L, C], excess [L, K], error of the medium [L], water of the balance
    [L] (kg).
    """
    medium = Medium.at(terms, state.strength, state.molality)
    amounts = term_amounts(terms, lanes, state, medium)
    held = Constraints.at(terms, lanes, state, medium)
    size = terms.size
    sums = amounts @ terms.sums
    gradient = sums[:, :size] - lanes.totals + held.sum_over(terms, state.phases)
    gradient[lanes.absent] = 0.0
    gross = sums[:, size : 2 * size] + np.abs(lanes.totals) + 1e-300
    gross += np.abs(state.phases[:, :-1]) @ np.abs(terms.solid_nu) + np.abs(state.phases[:, -1:] * held.gas_row)
    kg = np.exp(state.ln_water)
    sums = sums[:, 2 * size :]
    left = KG_PER_MOL_WATER * (lanes.water - sums[:, 2] - held.water_in(terms, state.phases))
    wanted = np.maximum(left, lanes.least_water)
    error = np.abs(0.5 * sums[:, 0] / kg - state.strength) / (1.0 + state.strength)
    error = np.maximum(error, np.abs(sums[:, 3] / kg - state.molality) / (1.0 + state.molality))
    error = np.maximum(error, np.abs(wanted - kg) / kg)
    return gradient / gross, held.excess, error, left


def _admit(rows: FloatArray, phases: FloatArray, present: BoolArray, new: int) -> None:
    """Add a phase to those present in one lane; where it is made of the same things as they are, one of them makes
    room.

    ``rows`` [K, C + 1] are the components and water of one mol. The one that leaves is the first to be used up as the
    new one forms (the ratio test of linear programming).
    """
    old = np.flatnonzero(present)
    present[new] = True
    if old.size == 0:
        return
    shares, *_ = np.linalg.lstsq(rows[old].T, rows[new], rcond=None)
    if np.abs(shares @ rows[old] - rows[new]).max() > 1e-8:
        return
    used = shares > 1e-9
    if used.any():
        ratio = np.where(used, phases[old] / np.where(used, shares, 1.0), np.inf)
        leaves = int(old[int(np.argmin(ratio))])
        phases[new] = max(float(ratio.min()), 0.0)
        phases[old] -= phases[new] * shares
        present[leaves] = False
        phases[leaves] = 0.0


class Elimination(Struct, eq=False):
    """The phases that are present, solved for one pivot component each (Gauss-Jordan on their small whole
    coefficients).

    With it the balances split into those without solids, which keep the digits of the dissolved amounts however much
    solid there is, and those of the pivots, which give the solids.
    """

    free: FloatArray  # [L, C, C]: column c: change of all ln activities with that of free component c; zero for pivots
    pivot: FloatArray  # [L, A, C]: 1 at the pivot of each reduced phase
    reduced: FloatArray  # [L, A, M]: the reduced phases as sums of solids
    hydration: FloatArray  # [L, M]: a sum of solids that takes up one H2O and nothing else; zero where there is none

    @classmethod
    def of(cls, terms: Terms, present: BoolArray, order: FloatArray, weight: FloatArray) -> Elimination:
        """Eliminate the solids of ``present`` [L, M], those of the largest ``order`` [L, M] first.

        The pivot is the component of least ``weight`` [L, C]. A solid that differs from earlier ones by water alone, a
        hydrate beside its anhydrous form, fixes the activity of water; one that does not even differ by that is struck
        from ``present``.
        """
        lanes, solids = present.shape
        solid_nu, size = terms.solid_nu, terms.size
        most = int(present.sum(axis=1).max(initial=0))
        every = np.arange(lanes)
        sequence = np.argsort(np.where(present, -order, np.inf), axis=1)[:, :most]
        here = np.take_along_axis(present, sequence, axis=1)
        # The solids' components, and beside them the solids of which the row is the sum.
        both = np.zeros((lanes, most, size + solids))
        both[:, :, :size] = np.where(here[:, :, None], solid_nu[sequence], 0.0)
        both[every[:, None], np.arange(most), size + sequence] = here
        pivot = np.zeros((lanes, most, size))
        hydration = np.zeros((lanes, solids))
        for step in range(most):
            row = both[:, step]
            usable = np.abs(row[:, :size]) > 1e-9
            column = np.where(usable, weight, np.inf).argmin(axis=1)
            found = usable[every, column]
            if not found.all():
                for lane in np.flatnonzero(here[:, step] & ~found):
                    water = float(row[lane, size:] @ terms.solid_water)
                    if abs(water) > 1e-9 and not hydration[lane].any():
                        hydration[lane] = row[lane, size:] / water
                    else:
                        present[lane, sequence[lane, step]] = False
            row = np.where(found[:, None], row / np.where(found, row[every, column], 1.0)[:, None], 0.0)
            pivot[every, step, column] = found
            factor = np.where(found[:, None], both[every, :, column], 0.0)
            both -= factor[:, :, None] * row[:, None, :]
            both[:, step] = row
        rows, reduced = both[:, :, :size], np.ascontiguousarray(both[:, :, size:])
        rows[np.abs(rows) < 1e-12] = 0.0
        taken: BoolArray = np.asarray(pivot.any(axis=1))
        free = -pivot.swapaxes(1, 2) @ np.where(taken[:, None, :], 0.0, rows)
        place = np.arange(size)
        free[:, place, place] += ~taken
        return cls(free, pivot, reduced, hydration)

    def take(self, which: BoolArray) -> Elimination:
        """These lanes only."""
        return Elimination(self.free[which], self.pivot[which], self.reduced[which], self.hydration[which])


def _kept_near(value: FloatArray, change: FloatArray) -> FloatArray:
    """``value + change``, not below a fifth nor far above five times of it."""
    return np.minimum(np.maximum(value + change, 0.2 * value), 5.0 * value + 0.1)


def finish(
    terms: Terms, lanes: Lanes, state: State, present: BoolArray, *, most_turns: int = 40
) -> tuple[BoolArray, IntArray]:
    """Newton with the phases of ``present`` [L, K] as equalities, in place; ``present`` is corrected on the way.

    Returns which lanes ended and the iterations of each.
    """
    count, size = lanes.totals.shape
    solids = terms.solid_nu.shape[0]
    ended = np.zeros(count, dtype=bool)
    turns = np.zeros(count, dtype=np.intp)
    live = np.arange(count)
    whole, whole_present = state, present
    state, present = whole.take(live), present.copy()
    state.phases[~present] = 0.0
    last_change = np.zeros(count, dtype=np.intp)
    gas = np.zeros((terms.gas_nu.shape[0], size + 4))
    gas[:, :size], gas[:, size + 2] = terms.gas_nu, terms.gas_water
    gas_pairs = pairs_of(gas)
    at_b, at_i, at_m, at_w = size, size + 1, size + 2, size + 3  # bubbled gas, ionic strength, molality, ln water
    n = size + 4
    elimination: Elimination | None = None
    for turn in range(most_turns):
        count = live.size
        medium = Medium.at(terms, state.strength, state.molality)
        amounts = term_amounts(terms, lanes, state, medium)
        held = Constraints.at(terms, lanes, state, medium)
        pairs = square(amounts @ terms.feature_pairs, size + 4)
        if elimination is None:
            weight = np.where(lanes.absent, np.inf, diagonal_of(pairs)[:, :size])
            filled = state.phases[:, :solids] / lanes.most[:, :solids]
            elimination = Elimination.of(terms, present[:, :solids], filled, weight)
            state.phases[~present] = 0.0
        free, pivot, reduced = elimination.free, elimination.pivot, elimination.reduced
        bubbling, bubbled = present[:, -1], np.where(present[:, -1], state.phases[:, -1], 0.0)
        row, row_water = held.gas_row, held.gas_water
        if bubbling.any():
            mean = held.shares @ gas
            spread = square(held.shares @ gas_pairs, size + 4) - mean[:, :, None] * mean[:, None, :]
            pairs += bubbled[:, None, None] * spread
        kg = np.exp(state.ln_water)
        both = amounts @ terms.sums
        in_species, sums = both[:, :size], both[:, 2 * size :]  # by component; z^2, neutral, water, aqueous
        dissolved = in_species + bubbled[:, None] * row
        strength_now, molality_now = 0.5 * sums[:, 0] / kg, sums[:, 3] / kg
        in_phases = bubbled * row_water
        balance_totals, balance_dissolved = lanes.totals, dissolved
        gross = both[:, size : 2 * size] + np.abs(bubbled[:, None] * row)
        with_solids = pivot.shape[1] > 0
        if with_solids:
            # Solids from the balances of their pivots.
            pivots = vector_matrix(lanes.totals - dissolved, pivot.swapaxes(1, 2))
            state.phases[:, :solids] = vector_matrix(pivots, reduced)
            water_of_reduced = reduced @ terms.solid_water
            in_phases = in_phases + state.phases[:, :solids] @ terms.solid_water
            # The balances without solids; totals and dissolved are reduced apart, so that small differences stay exact.
            balance_totals, balance_dissolved = vector_matrix(lanes.totals, free), vector_matrix(dissolved, free)
            gross = vector_matrix(gross, np.abs(free))
        right = np.zeros((count, n))
        right[:, :size] = balance_totals - balance_dissolved
        gross = gross + np.abs(balance_totals)
        error = (np.abs(right[:, :size]) / np.maximum(gross, 1e-300)).max(axis=1)
        water_off = lanes.water - kg / KG_PER_MOL_WATER - sums[:, 2] - in_phases
        hydrates = elimination.hydration.any(axis=1)
        floor = ~hydrates & (KG_PER_MOL_WATER * (water_off + kg / KG_PER_MOL_WATER) < lanes.least_water)
        if hydrates.any():
            # Where a hydrate and its anhydrous form are both there, the balance of water says how much of each.
            state.phases[:, :solids] += np.where(hydrates, water_off, 0.0)[:, None] * elimination.hydration
            water_off = np.where(hydrates, 0.0, water_off)
        # The matrix in all components: d ln(term) = features . (dx, -ion' dI, -neutral' dI, water' dM, dlnw).
        down = -medium.ion_slope[:, None] * pairs[:, :, size] - medium.neutral_slope[:, None] * pairs[:, :, size + 1]
        matrix = np.zeros((count, n, n))
        matrix[:, :size, :size] = pairs[:, :size, :size]
        matrix[:, :size, at_b] = row
        matrix[:, :size, at_i] = down[:, :size]
        matrix[:, :size, at_m] = medium.water_slope[:, None] * pairs[:, :size, size + 2]
        matrix[:, :size, at_w] = in_species
        matrix[:, at_b, :size] = row
        matrix[:, at_b, at_m] = medium.water_slope * row_water
        right[:, at_b] = -held.excess[:, -1]
        for place, column, factor, value in (
            (at_i, size, 0.5 / kg, strength_now - state.strength),
            (at_m, size + 3, 1.0 / kg, molality_now - state.molality),
        ):
            matrix[:, place, :size] = -factor[:, None] * pairs[:, column, :size]
            matrix[:, place, at_i] = -factor * down[:, column]
            matrix[:, place, at_m] = -factor * medium.water_slope * pairs[:, column, size + 2]
            matrix[:, place, place] += 1.0
            right[:, place] = value
        matrix[:, at_w, :size] = pairs[:, size + 2, :size]
        matrix[:, at_w, at_b] = row_water
        matrix[:, at_w, at_i] = down[:, size + 2]
        matrix[:, at_w, at_m] = medium.water_slope * pairs[:, size + 2, size + 2]
        matrix[:, at_w, at_w] = kg / KG_PER_MOL_WATER + sums[:, 2]
        right[:, at_w] = water_off
        if with_solids:
            # To free components: columns by dx = free dy + given + by_water dM, rows by the transpose.
            excess = held.excess[:, :solids]
            given = -vector_matrix(matrix_vector(reduced, np.where(present[:, :solids], excess, 0.0)), pivot)
            water_at_pivots = vector_matrix(water_of_reduced, pivot)
            by_water = -medium.water_slope[:, None] * water_at_pivots
            balances = matrix[:, :size].copy()
            matrix[:, at_w] -= vector_matrix(water_at_pivots, balances)
            water_row = matrix[:, at_w].copy()
            right[:, :size] -= vector_matrix(matrix_vector(balances[:, :, :size], given), free)
            right[:, at_b:] -= matrix_vector(matrix[:, at_b:, :size], given)
            matrix[:, :size] = free.swapaxes(1, 2) @ balances
            matrix[:, :, at_m] += matrix_vector(matrix[:, :, :size], by_water)
            matrix[:, :, :size] = matrix[:, :, :size] @ free
        matrix[:, at_w] *= KG_PER_MOL_WATER
        right[:, at_w] *= KG_PER_MOL_WATER
        if hydrates.any():
            matrix[hydrates, at_w] = 0.0
            matrix[hydrates, at_w, at_m] = medium.water_slope[hydrates]
            right[hydrates, at_w] = -(elimination.hydration * excess).sum(axis=1)[hydrates]
        if floor.any():
            matrix[floor, at_w] = 0.0
            matrix[floor, at_w, at_w] = 1.0
            right[floor, at_w] = np.log(lanes.least_water[floor]) - state.ln_water[floor]
        still = ~bubbling
        matrix[still, at_b] = 0.0
        matrix[still, :, at_b] = 0.0
        matrix[still, at_b, at_b] = 1.0
        right[still, at_b] = 0.0
        diagonal = diagonal_of(matrix)[:, :size]
        fixed = diagonal <= 0.0  # pivots and absent components
        column_scale = np.ones((count, n))
        column_scale[:, :size] = np.where(fixed, 1.0, 1.0 / np.sqrt(np.where(fixed, 1.0, diagonal)))
        column_scale[:, at_b] = 1.0 / np.maximum(
            np.abs(matrix[:, at_b, :at_b] * column_scale[:, :size]).max(axis=1), 1e-300
        )
        column_scale[still, at_b] = 1.0
        matrix *= column_scale[:, :, None]
        matrix *= column_scale[:, None, :]
        right *= column_scale
        diagonal[fixed] = 1.0
        medium_error = np.abs(right[:, at_i:]).max(axis=1) / (1.0 + state.strength + state.molality)
        step = column_scale * _solve(matrix, right)
        if not np.isfinite(step).all():
            step = np.nan_to_num(step, nan=0.0, posinf=1.0, neginf=-1.0)
        if with_solids:
            step[:, :size] = matrix_vector(free, step[:, :size]) + given + by_water * step[:, at_m, None]
        longest = np.abs(step[:, :size]).max(axis=1)
        part = np.minimum(1.0, 3.0 / np.maximum(longest, 1e-300))
        part = np.minimum(part, 0.7 / np.maximum(np.abs(step[:, at_w]), 1e-300))
        close = (longest < _LAST_STEP) & (error < 0.1 * _LAST_STEP) & (medium_error < 0.1 * _LAST_STEP)
        state.x += part[:, None] * step[:, :size]
        if with_solids:
            gained = vector_matrix(matrix_vector(balances, part[:, None] * step), pivot.swapaxes(1, 2))
            state.phases[:, :solids] -= vector_matrix(gained, reduced)
            released = np.where(hydrates, (water_row * step).sum(axis=1) * part, 0.0)
            state.phases[:, :solids] -= released[:, None] * elimination.hydration
        state.phases[:, -1] = np.where(bubbling, bubbled + part * step[:, at_b], 0.0)
        state.strength = _kept_near(state.strength, part * step[:, at_i])
        state.molality = _kept_near(state.molality, part * step[:, at_m])
        state.ln_water += part * step[:, at_w]
        turns[live] = turn + 1
        # Phases that should go or come, once the lane is near a solution of its present set.
        near = (longest < 1e-2) & (error < 1e-2)
        come = lanes.allowed & ~present & (held.excess > np.where(close, 0.1 * SUPERSATURATION, 0.1)[:, None])
        go = present & (state.phases < -_TRACE * lanes.most)
        change = come.any(axis=1) | go.any(axis=1)
        # A lane that gets nowhere lacks a phase, as a rule.
        stuck = (turn - last_change >= _PATIENCE) & come.any(axis=1)
        settle = ((near & (turn > last_change)) | stuck) & change
        if settle.any():
            for lane in np.flatnonzero(settle):
                if go[lane].any() and not stuck[lane]:
                    worst = int(np.argmin(np.where(go[lane], state.phases[lane] / lanes.most[lane], np.inf)))
                    present[lane, worst] = False
                    state.phases[lane, worst] = 0.0
                else:
                    worst = int(np.argmax(np.where(come[lane], held.excess[lane], -np.inf)))
                    waters = np.append(terms.solid_water, held.gas_water[lane])
                    rows = np.column_stack([np.vstack([terms.solid_nu, held.gas_row[lane]]), waters])
                    _admit(rows, state.phases[lane], present[lane], worst)
                last_change[lane] = turn
            elimination = None
        good = close & ~change
        if good.any():
            whole.put(live[good], state.take(good))
            whole_present[live[good]] = present[good]
            ended[live[good]] = True
            stay = ~good
            live = live[stay]
            if live.size == 0:
                return ended, turns
            lanes, state, present, last_change = lanes.take(stay), state.take(stay), present[stay], last_change[stay]
            if elimination is not None:
                elimination = elimination.take(stay)
    whole.put(live, state)
    whole_present[live] = present
    return ended, turns
