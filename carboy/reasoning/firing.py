"""Rules that change the state: bound, limited by what is there, applied, and the equilibria solved again after each."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from msgspec import Struct
from msgspec.structs import replace

from carboy.chemistry.balance import balance, imbalance
from carboy.chemistry.mixture import TRACE, Array, Mixture
from carboy.chemistry.relations import part_of
from carboy.chemistry.roots import bracketed_root
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.errors import RuleError
from carboy.model.rule import Bound, Condition, Measured, Reaction, ReactionTerm, Rule
from carboy.reasoning.at_hand import RulesAtHand
from carboy.reasoning.binding import Binding, Mask, Surroundings, View

SPEEDS = ("at once", "minutes", "hours", "days")
_FREE = (PROTON, WATER, "OH-")  # terms that never run out by count: the equilibria and the pH conditions limit them
_ROUNDS = 8
_PH_TOLERANCE = 0.03
_EXTENT_PRECISION = 1e-4  # of the extent that the reactants would allow
_LEAST_CHANGE = 1e-7  # of the amount at hand: smaller extents are not worth another round


class BoundReaction(Struct, frozen=True):
    """A reaction with its variables bound: mol per unit of extent of each token, as written and in components."""

    reactants: tuple[tuple[str, float], ...]
    products: tuple[tuple[str, float], ...]
    change: dict[str, float]  # component -> mol gained per unit extent


class Firing(Struct, frozen=True):
    """One rule at work in one mixture: extent ``[L]`` in mol of reaction."""

    rule: Rule
    reaction: BoundReaction
    bound: dict[str, str]
    extent: Array
    pH: Array
    share: tuple[float, float]

    def formed(self, token: str) -> Array:
        """mol of ``token`` that it made, ``[L]``."""
        return sum((count for name, count in self.reaction.products if name == token), 0.0) * self.extent


def bind_reaction(reaction: Reaction, binding: dict[str, str], stock: ChemicalStock) -> BoundReaction:
    """Put species in the place of variables, and find coefficients by balance where the rule leaves them out.

    Raises RuleError when no balanced equation exists.
    """
    left = [(species_of(term, binding, stock), term.coefficient) for term in reaction.reactants]
    right = [(species_of(term, binding, stock), term.coefficient) for term in reaction.products]
    make_up = [[_make_up(token, stock) for token, _ in side] for side in (left, right)]
    if reaction.balance:
        fixed = {place: count for place, (_, count) in enumerate([*left, *right]) if count is not None}
        counts = [float(value) for value in balance(*make_up, fixed=fixed)]
    else:
        counts = [1.0 if count is None else count for _, count in [*left, *right]]
        amounts = [
            list(zip(part, side, strict=True))
            for part, side in zip((counts[: len(left)], counts[len(left) :]), make_up, strict=True)
        ]
        if imbalance(*amounts):
            raise RuleError(f"'{reaction.text}' does not balance with {', '.join(binding.values())}")
    reactants = tuple((token, count) for (token, _), count in zip(left, counts[: len(left)], strict=True))
    products = tuple((token, count) for (token, _), count in zip(right, counts[len(left) :], strict=True))
    change: dict[str, float] = {}
    for sign, side in ((-1.0, reactants), (1.0, products)):
        for token, count in side:
            for component, inner in stock.components_of(token).items():
                change[component] = change.get(component, 0.0) + sign * count * inner
    return BoundReaction(reactants, products, {token: count for token, count in change.items() if abs(count) > 1e-12})


def species_of(term: ReactionTerm, binding: dict[str, str], stock: ChemicalStock) -> str:
    """The species that a term stands for once its variable is bound. Raises RuleError where the graph lacks the relation asked for."""
    token = binding.get(term.term, term.term)
    related = part_of(token, term.part, stock)
    if related is None:
        raise RuleError(f"the graph gives no '{term.part}' of '{token}'")
    return related


def _make_up(token: str, stock: ChemicalStock) -> tuple[dict[str, float], int]:
    if token == WATER:
        return {"H": 2.0, "O": 1.0}, 0
    if token == PROTON:
        return {"H": 1.0}, 1
    record = stock.index.species.get(token)
    if record is not None:
        return dict(record.atoms), record.charge
    return dict(stock.index.substances[token].atoms), 0


def _depends_on_pH(conditions: tuple[Condition, ...]) -> list[Measured]:
    return [one for one in conditions if isinstance(one, Measured) and one.quantity == "pH"]


class Reactor:
    """Runs the changing rules on a mixture to a fixed point, in order of speed.

    Where a rule leaves the share of conversion open, the most is taken, or the least with ``least``: what is left over then is there
    for the steps that follow.
    """

    def __init__(self, rules: tuple[Rule, ...], stock: ChemicalStock, *, least: bool = False) -> None:
        self.stock = stock
        self.least = least
        self.rules = tuple(rule for rule in rules if rule.does and not rule.off)
        self._places = {rule.id: place for place, rule in enumerate(self.rules)}
        self._at_hand = {
            speed: RulesAtHand(tuple(rule for rule in self.rules if rule.speed in SPEEDS[: place + 1]), stock)
            for place, speed in enumerate(SPEEDS)
        }
        self._bound: dict[tuple[str, int, tuple[tuple[str, str], ...]], BoundReaction | None] = {}

    def run(
        self, mixture: Mixture, surroundings: Surroundings, *, slowest: str = "minutes", already: Sequence[Firing] = ()
    ) -> tuple[Mixture, list[Firing]]:
        """Fire all rules not slower than ``slowest`` until nothing changes; returns the end state and the record of firings.

        ``already``: firings of the same lanes that went before, whose shares of conversion are used up.
        """
        record: list[Firing] = list(already)
        for speed in SPEEDS[: SPEEDS.index(slowest) + 1]:
            view = View(mixture, surroundings)
            for _ in range(_ROUNDS):
                before = len(record)
                view = self._round(self._at_hand[speed], view, record)
                if len(record) == before:
                    break
            mixture = view.mixture
        return mixture, record[len(already) :]

    def _round(self, body: RulesAtHand, view: View, record: list[Firing]) -> View:
        """Every rule once, in order; what an earlier one makes is there for the later ones."""
        tried = -1
        while True:
            for rule in body.of(view):
                place = self._places[rule.id]
                if place > tried:
                    tried = place
                    after = self._try(rule, view, record)
                    if after is not view:
                        view = after
                        break
            else:
                return view

    def _try(self, rule: Rule, view: View, record: list[Firing]) -> View:
        """One rule in one vessel; the view after it."""
        for binding in view.bindings(rule):
            names = {variable: carrier.token for variable, carrier in binding.items()}
            for number, reaction in enumerate(rule.does):
                now = self._rebound(view, rule, names)
                if now is None:
                    break
                conditions = (*rule.needs, *reaction.when)
                mask = np.ones(view.mixture.lanes, dtype=bool)
                for condition in conditions:
                    mask &= view.holds(condition, now)
                    if not mask.any():
                        break
                if not mask.any():
                    continue
                bound = self._bind(rule, number, names)
                if bound is None:
                    continue
                changed = self._react(rule, reaction, bound, conditions, names, view, mask, record)
                if changed is not None:
                    view = View(changed, view.surroundings)
        return view

    def _rebound(self, view: View, rule: Rule, names: dict[str, str]) -> Binding | None:
        now: Binding = {}
        for one in rule.needs:
            if isinstance(one, Bound):
                found = [
                    c for c in view.having((names[one.variable],), where=one.where) if c.token == names[one.variable]
                ]
                if not found:
                    return None
                now[one.variable] = found[0]
        return now

    def _bind(self, rule: Rule, number: int, names: dict[str, str]) -> BoundReaction | None:
        key = (rule.id, number, tuple(sorted(names.items())))
        if key not in self._bound:
            try:
                self._bound[key] = bind_reaction(rule.does[number], names, self.stock)
            except RuleError:
                self._bound[key] = (
                    None  # the linter lists the members of a class for which an equation does not balance
                )
        return self._bound[key]

    def _react(
        self,
        rule: Rule,
        reaction: Reaction,
        bound: BoundReaction,
        conditions: tuple[Condition, ...],
        names: dict[str, str],
        view: View,
        mask: Mask,
        record: list[Firing],
    ) -> Mixture | None:
        mixture = view.mixture
        extent = np.full(mixture.lanes, np.inf)
        scale = mixture.zeros()
        for token, count in bound.reactants:
            if token in _FREE:
                continue
            there = mixture.amount_of(token)
            extent = np.minimum(extent, there / count)
            scale = np.maximum(scale, there)
        earlier = sum(
            (one.extent for one in record if one.rule is rule and one.reaction.change == bound.change), mixture.zeros()
        )
        share = reaction.share[0 if self.least else 1]
        extent = np.where(mask & np.isfinite(extent), extent, 0.0)
        if share < 1.0:  # of all that was there before this rule began, not of what is left in each round
            extent = np.maximum(share * (extent + earlier) - earlier, 0.0)
        extent = np.where(extent > np.maximum(TRACE, _LEAST_CHANGE * scale), extent, 0.0)
        if not extent.any():
            return None
        limits = _depends_on_pH(conditions)
        uses_protons = abs(bound.change.get(PROTON, 0.0)) > 0
        if limits and uses_protons:
            extent = self._held_by_pH(mixture, bound, limits, extent)
            extent = np.where(extent > np.maximum(TRACE, _LEAST_CHANGE * scale), extent, 0.0)
            if not extent.any():
                return None
        changed = applied(mixture, bound, extent)
        record.append(Firing(rule, bound, names, extent, mixture.pH, reaction.share))
        return changed

    def _held_by_pH(self, mixture: Mixture, bound: BoundReaction, limits: list[Measured], extent: Array) -> Array:
        """The largest extent, found on the equilibrium, at which the pH conditions of the rule still hold."""
        active = np.flatnonzero(extent > 0)
        part = mixture.take(active)
        trial = applied(part, bound, extent[active])
        result = extent.copy()
        stopped = np.flatnonzero(_beyond(limits, trial.pH) > 0)
        if not len(stopped):
            return result
        part, full = part.take(stopped), extent[active][stopped]
        state = part

        def excess(share: Array) -> Array:
            nonlocal state
            state = applied(state.with_amounts(part.amounts), bound, share * full)
            return _beyond(limits, state.pH)

        # a strong acid or base is used up when its excess is; a buffer makes the search go on from there
        free = np.abs(part.total(PROTON)) / abs(bound.change[PROTON]) / full
        none, whole = np.zeros(len(full)), np.ones(len(full))
        share = bracketed_root(excess, none, whole, tolerance=_PH_TOLERANCE, precision=_EXTENT_PRECISION, guess=free)
        result[active[stopped]] = share * full
        return result


def _beyond(limits: list[Measured], pH: Array) -> Array:
    """By how much, in pH units, the nearest pH condition is overstepped ``[L]``; negative while all hold."""
    over = np.full(len(pH), -np.inf)
    for limit in limits:
        if np.isfinite(limit.high):
            over = np.maximum(over, pH - limit.high)
        if np.isfinite(limit.low):
            over = np.maximum(over, limit.low - pH)
    return over


def applied(mixture: Mixture, bound: BoundReaction, extent: Array) -> Mixture:
    """The mixture after a reaction of ``extent`` mol ``[L]``."""
    amounts = dict(mixture.amounts)
    for token, count in bound.change.items():
        value = amounts.get(token, mixture.zeros()) + count * extent
        amounts[token] = value if token == PROTON else np.where(np.abs(value) < 1e-13, 0.0, np.maximum(value, 0.0))
    return mixture.with_amounts(amounts)


def scaled_firing(firing: Firing, lanes: slice) -> Firing:
    """The firing seen in some of the lanes only."""
    return replace(firing, extent=firing.extent[lanes], pH=firing.pH[lanes])
