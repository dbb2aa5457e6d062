"""Equilibrium of many vessels at once: what is dissolved, what comes down, what bubbles off."""

from __future__ import annotations

import numpy as np
from msgspec import Struct

from carboy.chemistry import activity
from carboy.chemistry.activity import TRUSTED_IONIC_STRENGTH
from carboy.chemistry.columns import shared_columns
from carboy.chemistry.iteration import (
    BALANCE,
    SUPERSATURATION,
    Pace,
    finish,
    first_state,
    interior_point,
    residuals,
    rough_solids,
    rough_start,
)
from carboy.chemistry.mass_action import (
    ABSENT,
    LN10,
    BoolArray,
    Constraints,
    IntArray,
    Lanes,
    Medium,
    State,
    Terms,
    Vessel,
    ln_pressures,
    ln_saturation,
    make_lanes,
    term_amounts,
)
from carboy.chemistry.network import FloatArray, Network


class Solved(Struct, eq=False):
    """The outcome of :func:`solve` for L lanes. Where ``converged`` is false the numbers are the last iterate and
    mean nothing.
    """

    network: Network
    amounts: FloatArray  # [L, S] mol dissolved
    solids: FloatArray  # [L, M] mol
    gas: FloatArray  # [L, G] mol bubbled off (open) or in the headspace (sealed)
    pressures: FloatArray  # [L, G] atm in equilibrium with the liquid, whether it bubbles or not
    pH: FloatArray  # [L] -log10 activity of H+
    ionic_strength: FloatArray  # [L] mol/kg
    water_kg: FloatArray  # [L]
    log_activity: FloatArray  # [L, C] log10; -inf where the component is absent
    saturation: FloatArray  # [L, M] log10 of the saturation ratio; -inf where a component is absent
    bubbling: BoolArray  # [L]
    converged: BoolArray  # [L]
    reasons: list[str]  # "" where converged
    iterations: IntArray  # [L]
    outside_activity_range: BoolArray  # [L] ionic strength or dryness beyond the activity model

    def take(self, which: IntArray | BoolArray) -> Solved:
        """These lanes only."""
        cut = {name: getattr(self, name)[which] for name in self.__struct_fields__ if name not in _NO_LANES}
        places = np.arange(self.converged.size)[which]
        return Solved(network=self.network, reasons=[self.reasons[place] for place in places], **cut)

    def followed_by(self, other: Solved) -> Solved:
        """These lanes and then those of another solution of the same network."""
        both = {
            name: np.concatenate([getattr(self, name), getattr(other, name)])
            for name in self.__struct_fields__
            if name not in _NO_LANES
        }
        return Solved(network=self.network, reasons=[*self.reasons, *other.reasons], **both)


_NO_LANES = ("network", "reasons")
_ACID_ROUNDS = 60
_ACID_CLOSE = 5e-7  # in ln gamma
_FEW = 12  # components, up to which putting several in one column gains nothing


def solve(
    network: Network,
    totals: FloatArray,
    water_mol: FloatArray,
    *,
    headspace_L: FloatArray | None = None,
    ambient_atm: float = 1.0,
    start: Solved | None = None,
    retain_gas: bool = False,
) -> Solved:
    """Equilibrium of each lane.

    ``totals`` [L, C] are mol of each component, the column of H+ being the proton excess (negative in base);
    ``water_mol`` [L] is the total of the component H2O in mol. ``headspace_L`` None is an open vessel: gas bubbles
    off where the sum of the partial pressures and that of water would exceed ``ambient_atm``, and then that sum
    equals it. With ``headspace_L`` [L] the vessel is sealed and each gas fills the headspace by the gas law.
    ``retain_gas`` allows no gas phase. Water vapour takes no water from the liquid. ``start``, a solution of the same
    network for as many lanes or for one, speeds up a nearby problem.

    There is a floor under the water (1 kg per 50 mol of components); lanes on it are marked
    ``outside_activity_range`` and their water is not conserved. Raises ValueError for shapes that do not fit and for
    a negative total other than that of H+.
    """
    totals = np.atleast_2d(np.asarray(totals, dtype=float))
    water_mol = np.broadcast_to(np.asarray(water_mol, dtype=float), totals.shape[:1]).copy()
    if headspace_L is not None:
        headspace_L = np.broadcast_to(np.asarray(headspace_L, dtype=float), totals.shape[:1]).copy()
    vessel = Vessel(None if retain_gas else headspace_L, ambient_atm, retain_gas)
    _check(network, totals, water_mol, headspace_L, ambient_atm)
    # Overflow and the like are judged by the outcome: a lane that is not finite does not converge.
    with np.errstate(all="ignore"):
        if start is not None and start.network is not network:
            start = None
        solution = _Solution(network, totals, water_mol, vessel, start)
        if start is not None:
            solution.from_neighbour(start)
        for pace in _PACES:
            left = np.flatnonzero([reason != "" for reason in solution.reasons])
            if left.size == 0:
                break
            solution.attempt(left, pace)
        solution.follow_acid()
        return solution.outcome()


# Tried in turn on the lanes that are left: more rough passes, shorter steps, stronger damping, other starts.
_PACES = (
    Pace(passes=16, rounds=12, turns=50, rate=1.0, longest=8.0, close=1e-3, direct=10),
    Pace(passes=100, rounds=0, turns=120, rate=0.6, longest=3.0, close=1e-5),
    Pace(passes=200, rounds=0, turns=250, rate=0.4, longest=1.5, close=1e-7, shift=-10.0),
    Pace(passes=400, rounds=30, turns=400, rate=0.2, longest=1.0, close=1e-6, shift=9.0),
)


class _Judged(Struct, eq=False):
    """What the residuals of some lanes say."""

    reasons: list[str]  # why each is not a solution, or nothing
    on_floor: BoolArray  # whether the floor holds its water

    def take(self, which: BoolArray) -> _Judged:
        """These lanes only."""
        return _Judged([self.reasons[lane] for lane in np.flatnonzero(which)], self.on_floor[which])


class _Solution:
    """The lanes of one call on their way to the outcome."""

    def __init__(
        self, network: Network, totals: FloatArray, water_mol: FloatArray, vessel: Vessel, start: Solved | None
    ) -> None:
        self.network = network
        self.sealed = vessel.headspace_L is not None
        self.lanes, self.scale = make_lanes(network, totals, water_mol, vessel)
        self.absent = self.lanes.absent  # [L, components]
        count = totals.shape[0]
        self.column = np.arange(totals.shape[1])
        if start is None and count > 1 and totals.shape[1] > _FEW:
            self.column = shared_columns(~self.absent)
        if self.column.max() + 1 < totals.shape[1]:
            self.terms = Terms.over(network, self.sealed, self.column)
            self.lanes = self.lanes.in_columns(self.column)
        else:
            self.column = np.arange(totals.shape[1])
            self.terms = Terms.of(network, self.sealed)
        self.state = first_state(self.lanes)
        self.on_floor = np.zeros(count, dtype=bool)
        self.reasons = ["not attempted"] * count
        self.iterations = np.zeros(count, dtype=np.intp)
        anions = np.flatnonzero(network.acid_interaction)
        self.acid = (
            np.concatenate([[0], anions]) if anions.size else anions
        )  # H+, the first species, and what it interacts with
        self.bare = self.lanes.ln_beta[:, self.acid].copy()  # constants without that
        self.taken = np.zeros(self.bare.shape)  # of the interaction, what is in the constants

    def attempt(self, which: IntArray, pace: Pace) -> None:
        """All three stages for some lanes; the second only where a phase seems to form."""
        lanes = self.lanes if which.size == len(self.reasons) else self.lanes.take(which)
        state = first_state(lanes)
        state.x[:, 0] += pace.shift
        rough_start(self.terms, lanes, state, pace.passes)
        rough_solids(self.terms, lanes, state, pace.rounds)
        if pace.direct:
            none, below = (state.phases == 0.0).all(axis=1), (self._excess(lanes, state) < 0.0).all(axis=1)
            clear: BoolArray = np.asarray(none & below)
            if clear.any():
                some = which[clear]
                self._finish(some, lanes.take(clear), state.take(clear), lanes.allowed[clear] & False, pace.direct)
                left = ~clear
                left[clear] = [self.reasons[lane] != "" for lane in some]
                if not left.any():
                    return
                which, lanes, state = which[left], lanes.take(left), state.take(left)
        self.iterations[which] += interior_point(self.terms, lanes, state, pace)
        # Of a phase and its undersaturation the larger, each in its own measure, says whether it is there.
        present = lanes.allowed & (state.phases / lanes.most > np.maximum(-self._excess(lanes, state), 0.0))
        self._finish(which, lanes, state, present)

    def _excess(self, lanes: Lanes, state: State) -> FloatArray:
        medium = Medium.at(self.terms, state.strength, state.molality)
        return Constraints.at(self.terms, lanes, state, medium).excess

    def _finish(self, which: IntArray, lanes: Lanes, state: State, present: BoolArray, most_turns: int = 40) -> None:
        ended, turns = finish(self.terms, lanes, state, present, most_turns=most_turns)
        self.iterations[which] += turns
        self._keep(which, state, self._judged(lanes, state, ended))

    def from_neighbour(self, start: Solved) -> None:
        """Finish from a solution nearby; lanes for which that fails are left to the full way."""
        count = self.lanes.number.size
        if count == 0 or start.converged.size not in (1, count):
            return
        pick = np.zeros(count, dtype=np.intp) if start.converged.size == 1 else np.arange(count)
        same = ((start.log_activity[pick] == -np.inf) == self.lanes.absent).all(axis=1) & start.converged[pick]
        which = np.flatnonzero(same)
        if which.size == 0:
            return
        pick = pick[which]
        if self.acid.size:
            molality = start.amounts[pick][:, self.acid] / start.water_kg[pick, None]
            self._take_in(which, self._interaction(which, molality, start.ionic_strength[pick]))
        lanes = self.lanes.take(which)
        state = first_state(lanes)
        state.x = LN10 * np.where(lanes.absent, 0.0, start.log_activity[pick])
        state.strength = start.ionic_strength[pick].copy()
        state.molality = start.amounts[pick].sum(axis=1) / start.water_kg[pick]
        state.ln_water = np.clip(np.log(start.water_kg[pick] / self.scale[which]), -0.5, 0.5)
        bubbled = np.where(start.bubbling[pick], start.gas[pick].sum(axis=1), 0.0)
        phases = np.column_stack([start.solids[pick], bubbled]) / self.scale[which, None]
        state.phases = np.where(lanes.allowed, phases, 0.0)
        self._finish(which, lanes, state, state.phases > 0.0, most_turns=25)

    def follow_acid(self) -> None:
        """Take the interaction of H+ with the anions of strong acid into the constants, and solve again until both agree.

        The rounds are sped up by the secant through the last two (Anderson 1965, depth 1). A lane that does not settle keeps what
        the last sound round gave.
        """
        if self.acid.size == 0:
            return
        last_taken, last_off = self.taken.copy(), np.full(self.taken.shape, np.nan)
        live = np.flatnonzero([reason == "" for reason in self.reasons])
        for _ in range(_ACID_ROUNDS):
            lanes, state = self.lanes.take(live), self.state.take(live)
            medium = Medium.at(self.terms, state.strength, state.molality)
            molality = term_amounts(self.terms, lanes, state, medium)[:, self.acid] / np.exp(state.ln_water)[:, None]
            off = self._interaction(live, molality, state.strength) - self.taken[live]
            moving = np.abs(off).max(axis=1) > _ACID_CLOSE
            live, off = live[moving], off[moving]
            if live.size == 0:
                return
            held = self.taken[live]
            turned = off - last_off[live]
            share = (off * turned).sum(axis=1) / np.maximum((turned * turned).sum(axis=1), 1e-300)
            share = np.clip(np.where(np.isfinite(share), share, 0.0), -2.0, 0.95)[:, None]
            secant = np.where(np.isfinite(turned), held - last_taken[live] + turned, 0.0)
            last_taken[live], last_off[live] = held, off
            self._take_in(live, np.maximum(held + off - share * secant, 0.0))
            lanes, state = self.lanes.take(live), state.take(moving)
            ended, turns = finish(self.terms, lanes, state, state.phases > 0.0)
            self.iterations[live] += turns
            judged = self._judged(lanes, state, ended)
            sound = np.array([reason == "" for reason in judged.reasons], dtype=bool)
            self._take_in(live[~sound], held[~sound])
            live = live[sound]
            self._keep(live, state.take(sound), judged.take(sound))

    def _interaction(self, which: IntArray, molality: FloatArray, strength: FloatArray) -> FloatArray:
        """What the interaction adds to ln gamma of H+ and of the anions, [lanes, acid], from their molalities."""
        coefficients = self.network.acid_interaction[self.acid[1:]]
        proton, anions = activity.ln_acid_interaction(molality[:, 0], molality[:, 1:], coefficients, strength)
        return np.where(self.bare[which] > 0.5 * ABSENT, np.column_stack([proton, anions]), 0.0)

    def _take_in(self, which: IntArray, interaction: FloatArray) -> None:
        self.taken[which] = interaction
        self.lanes.ln_beta[which[:, None], self.acid] = self.bare[which] - interaction

    def _keep(self, which: IntArray, state: State, judged: _Judged) -> None:
        """Take over the state of some lanes and what it was found to be."""
        self.state.put(which, state)
        self.on_floor[which] = judged.on_floor
        for lane, reason in zip(which, judged.reasons, strict=True):
            self.reasons[lane] = reason

    def _judged(self, lanes: Lanes, state: State, ended: BoolArray) -> _Judged:
        """The state of some lanes judged afresh by its residuals."""
        relative, excess, medium_error, left_kg = residuals(self.terms, lanes, state)
        balance = np.abs(relative).max(axis=1)
        over = np.where(lanes.allowed, excess, -1.0).max(axis=1)
        held = lanes.allowed & (np.abs(state.phases) > 1e-9 * lanes.most)
        under = np.where(held, np.where(state.phases < 0.0, np.inf, -excess), -1.0).max(axis=1)
        measured = zip(ended, balance, over, under, medium_error, strict=True)
        reasons = [_reason(bool(done), *(float(number) for number in numbers)) for done, *numbers in measured]
        return _Judged(reasons, left_kg < lanes.least_water * (1.0 + 1e-9))

    def outcome(self) -> Solved:
        """The answer in the caller's units."""
        network, terms, lanes, state = self.network, self.terms, self.lanes, self.state
        scale = self.scale[:, None]
        species, solids = len(network.species), len(network.solids)
        medium = Medium.at(terms, state.strength, state.molality)
        amounts = term_amounts(terms, lanes, state, medium) * scale
        phases = np.maximum(state.phases, 0.0)
        pressures = np.exp(ln_pressures(terms, lanes, state, medium))
        if self.sealed:
            gas = amounts[:, species:]
        else:
            total = np.maximum(pressures.sum(axis=1, keepdims=True), 1e-300)
            gas = pressures / total * phases[:, solids:] * scale
        return Solved(
            network=network,
            amounts=amounts[:, :species],
            solids=phases[:, :solids] * scale,
            gas=gas,
            pressures=pressures,
            pH=-state.x[:, 0] / LN10,
            ionic_strength=state.strength,
            water_kg=np.exp(state.ln_water) * self.scale,
            log_activity=np.where(self.absent, -np.inf, state.x[:, self.column] / LN10),
            saturation=np.where(lanes.allowed[:, :solids], ln_saturation(terms, lanes, state, medium) / LN10, -np.inf),
            bubbling=phases[:, solids] > 0.0,
            converged=np.array([reason == "" for reason in self.reasons], dtype=bool),
            reasons=self.reasons,
            iterations=self.iterations,
            outside_activity_range=(state.strength > TRUSTED_IONIC_STRENGTH) | self.on_floor,
        )


def _check(
    network: Network, totals: FloatArray, water_mol: FloatArray, headspace_L: FloatArray | None, ambient_atm: float
) -> None:
    if totals.ndim != 2 or totals.shape[1] != len(network.components):
        raise ValueError(f"totals must have {len(network.components)} columns, one per component")
    if not (np.isfinite(totals).all() and np.isfinite(water_mol).all()):
        raise ValueError("totals and water must be finite numbers")
    if (water_mol < 0.0).any():
        raise ValueError("the amount of water must not be negative")
    if (totals[:, 1:] < 0.0).any():
        column = 1 + int(np.argmax((totals[:, 1:] < 0.0).any(axis=0)))
        raise ValueError(f"the total of {network.components[column]} must not be negative")
    if headspace_L is not None and not ((headspace_L >= 0.0) & np.isfinite(headspace_L)).all():
        raise ValueError("the headspace must be a volume of zero or more")
    if not ambient_atm > 0.0:
        raise ValueError("the ambient pressure must be above zero")


def _reason(ended: bool, balance: float, over: float, under: float, medium_error: float) -> str:
    """Why a lane is not a solution, or nothing."""
    if not np.isfinite(balance + over + medium_error):
        return "the iteration went beyond the range of numbers"
    if balance > BALANCE:
        return f"a mass balance is open by {balance:.1e} of its terms"
    if over > SUPERSATURATION:
        return f"a solid or gas remains above saturation (log ratio {over / LN10:.1e})"
    if under > SUPERSATURATION:
        return "a solid or gas is held that would go back into solution"
    if not ended:
        return "the last stage did not settle"
    if medium_error > 1e-7:
        return f"the activity coefficients did not settle ({medium_error:.1e})"
    return ""
