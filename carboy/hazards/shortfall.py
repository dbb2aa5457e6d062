"""Why a metal stays dissolved: the vessel is tried again at other pH values, with more of what brings it down, without what holds it, and
in its other oxidation states. A cause is what clears the shortfall when it is changed."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from carboy.chemistry.mixture import Array, Mixture
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.hazards.flagged import name_of
from carboy.hazards.numbers import figures

Value = Callable[[Mixture], Array]  # what is aimed at in a content, [lanes]

_ADDED = np.geomspace(1e-4, 3.0, 24)  # mol of strong acid or base to a litre, by which other pH values are reached
_ROUNDS = 2  # of looking more closely where the pH jumps
_SAME_PH = 0.35  # a content within this of the pH as it is counts as having the same pH
_REACH = (1.5, 13.5)  # pH values that are worth naming
_MORE = 3.0  # times what the metal needs: the trial of more reagent
_HELD = 0.2  # share of the dissolved metal that a ligand must hold to be named
_OF_A_LITRE = 1e-6  # mol/L: a ligand that is weaker holds nothing that matters


@dataclass(frozen=True)
class Cause:
    """Why the aim is missed, in a sentence, and what would clear it."""

    words: str
    control: str = ""


def causes_of(
    content: Mixture, tokens: tuple[str, ...], limit: float, value: Value, stock: ChemicalStock
) -> list[Cause]:
    """The causes found, the one that explains most first; one that says that none was where nothing that is tried clears it.

    ``content``: one lane. ``tokens``: components of the metal. ``limit``: what ``value`` must not exceed.
    """
    if content.solved is None or not tokens:
        return []
    trial = _Trial(content, tokens, limit, value, stock)
    found = [*trial.overdose(), *trial.ligands()] or [*trial.pH(), *trial.reagent()] or list(trial.oxidation_state())
    if not found:
        found = [
            Cause(
                "No other pH, no more of the reagents that are in the vessel, and nothing taken away brings it below: "
                "it needs another treatment."
            )
        ]
    return found[:2]


class _Trial:
    """A vessel that misses its aim, and what it would be if one thing were otherwise."""

    def __init__(
        self, content: Mixture, tokens: tuple[str, ...], limit: float, value: Value, stock: ChemicalStock
    ) -> None:
        self.content, self.tokens, self.limit, self.value, self.stock = content, tokens, limit, value, stock
        self.anion, self.cation = (
            next(token for token, one in stock.index.species.items() if key in one.classes)
            for key in ("unspecified-anion", "unspecified-cation")
        )
        self.now = float(content.pH[0])
        self.metal = self._main_component()
        self.forms = self._forms()
        self.overdosed: set[str] = set()

    def _main_component(self) -> str:
        return max(self.tokens, key=lambda token: float(self.content.dissolved(token)[0]))

    def _forms(self) -> list[tuple[float, str]]:
        """The shares of the dissolved metal by form, the largest first."""
        found = []
        for name, amount in self.content.aqueous.items():
            count = sum(self.stock.components_of(name).get(token, 0.0) for token in self.tokens)
            if count > 0:
                found.append((float(amount[0]) * count, name))
        whole = sum(amount for amount, _ in found) or 1.0
        return sorted(((amount / whole, name) for amount, name in found), reverse=True)

    # --- what would be

    def _at_other_pH(self, content: Mixture) -> tuple[Mixture, NDArray[np.intp], Array]:
        """A content as it is and with strong acid or base in it, its pH and value, by rising pH; lanes that did not converge are left out."""
        moved = np.concatenate([-_ADDED[::-1], [0.0], _ADDED]) * float(content.volume_L[0])
        many = self._with_protons(content, moved)
        for _ in range(_ROUNDS):
            far = np.abs(np.diff(many.pH)) > 2 * _SAME_PH
            if not far.any():
                break
            between = [np.linspace(moved[at], moved[at + 1], 6)[1:-1] for at in np.flatnonzero(far)]
            moved = np.sort(np.concatenate([moved, *between]))
            many = self._with_protons(content, moved)
        pH = many.pH
        good = np.flatnonzero(many.converged & np.isfinite(pH) & (pH > _REACH[0]) & (pH < _REACH[1]))
        order = good[np.argsort(pH[good])]
        return many, order, pH

    def _with_protons(self, content: Mixture, protons: Array) -> Mixture:
        many = content.repeated(len(protons))
        added = {
            PROTON: many.total(PROTON) + protons,
            self.anion: many.total(self.anion) + np.maximum(protons, 0.0),
            self.cation: many.total(self.cation) + np.maximum(-protons, 0.0),
        }
        return many.with_amounts({**many.amounts, **added})

    def _changed(self, changes: dict[str, float]) -> Mixture:
        """The content with other amounts of some components; a counter-ion that does nothing keeps it neutral."""
        amounts = {token: amount.copy() for token, amount in self.content.amounts.items()}
        charge = 0.0
        for token, amount in changes.items():
            before = float(self.content.total(token)[0])
            amounts[token] = np.array([amount])
            charge += (amount - before) * self.stock.species(token).charge
        for token, size in ((self.anion, max(charge, 0.0)), (self.cation, max(-charge, 0.0))):
            amounts[token] = amounts.get(token, self.content.zeros()) + size
        changed = self.content.with_amounts(amounts)
        changed.hint = None
        return changed

    def _met_at_this_pH(self, content: Mixture, with_solid_of: str = "") -> bool:
        """Whether the aim is met at the pH as it is; ``with_solid_of``: while a solid of the metal with this component is there."""
        many, order, pH = self._at_other_pH(content)
        near = order[np.abs(pH[order] - self.now) <= _SAME_PH]
        met = near[self.value(many)[near] <= self.limit]
        if not with_solid_of:
            return bool(met.size)
        return any(
            float(amount[met].max(initial=0.0)) > 0
            for solid, amount in many.solids.items()
            if self.metal in (parts := self.stock.components_of(solid)) and parts.get(with_solid_of, 0.0) > 0
        )

    def _window(self, content: Mixture) -> tuple[float, float] | None:
        """The pH values between which the aim would be met, as far as they were tried."""
        many, order, pH = self._at_other_pH(content)
        met = pH[order][self.value(many)[order] <= self.limit]
        return (float(met[0]), float(met[-1])) if met.size else None

    # --- causes

    def _solids_with(self) -> list[str]:
        """Solids that can hold the metal, there or not."""
        assert self.content.solved is not None
        return [
            one for one in self.content.solved.network.solids if self.stock.components_of(one).get(self.metal, 0.0) > 0
        ]

    def _partners(self) -> list[str]:
        """Components that bring the metal down with them and are in the vessel."""
        partners: dict[str, None] = {}
        for solid in self._solids_with():
            for token, count in self.stock.components_of(solid).items():
                if count > 0 and token not in (*self.tokens, PROTON, WATER) and token in self.content.amounts:
                    partners[token] = None
        return list(partners)

    def _holders(self) -> Iterator[tuple[str, float, str]]:
        """Components that hold the metal in solution: component, share of the metal that they hold, the main such form."""
        shares: dict[str, float] = {}
        main: dict[str, str] = {}
        for share, form in self.forms:
            for token, count in self.stock.components_of(form).items():
                if token not in (*self.tokens, PROTON, WATER) and count > 0:
                    shares[token] = shares.get(token, 0.0) + share
                    main.setdefault(token, form)
        for token, share in sorted(shares.items(), key=lambda one: -one[1]):
            strong = float(self.content.dissolved(token)[0]) > _OF_A_LITRE * float(self.content.volume_L[0])
            if share >= _HELD and strong:
                yield token, share, main[token]

    def _bound_in_solids(self, token: str) -> float:
        return sum(
            float(amount[0]) * self.stock.components_of(solid).get(token, 0.0)
            for solid, amount in self.content.solids.items()
        )

    def _wanted(self, token: str) -> float:
        """mol of a component that all of the metal takes, in the solid that takes most."""
        ratios = [
            parts.get(token, 0.0) / parts[self.metal]
            for parts in map(self.stock.components_of, self._solids_with())
            if parts.get(token, 0.0) > 0
        ]
        return max(ratios, default=0.0) * float(self.content.total(self.metal)[0])

    def overdose(self) -> Iterator[Cause]:
        """What brought the metal down is in such excess that it takes it back."""
        partners = self._partners()
        for token, share, form in self._holders():
            enough = max(self._wanted(token), self._bound_in_solids(token))
            if token not in partners or enough >= float(self.content.total(token)[0]):
                continue
            if self._met_at_this_pH(self._changed({token: enough}), with_solid_of=token):
                self.overdosed.add(token)
                name = name_of(token, self.stock)
                yield Cause(
                    f"Overdose: the excess of {name} takes it back into solution ({self._held(share, form)}).",
                    f"Dose less {name}, or take the excess away before filtering.",
                )
        window = self._window(self.content)
        if window and self.now > window[1] + _SAME_PH and self._is_hydroxo():
            yield Cause(
                f"Overdose of base: at pH {figures(self.now)} it goes back into solution as {self.forms[0][1]}; "
                f"it would be below the limit {_pH_words(window)}.",
                f"Correct the pH: it comes down {_pH_words(window)}.",
            )

    def _is_hydroxo(self) -> bool:
        """Whether the main dissolved form is the metal with hydroxide alone, and an anion."""
        form = self.forms[0][1] if self.forms else ""
        parts = self.stock.components_of(form) if form else {}
        own = {token for token, count in parts.items() if count > 0 and token not in (PROTON, WATER)}
        return (
            bool(form)
            and own <= set(self.tokens)
            and parts.get(PROTON, 0.0) < 0
            and self.stock.species(form).charge < 0
        )

    def ligands(self) -> Iterator[Cause]:
        """Something else in the vessel holds the metal in solution."""
        for token, share, form in self._holders():
            if token in self.overdosed:
                continue
            if self._met_at_this_pH(self._changed({token: 0.0})):
                name = name_of(token, self.stock)
                yield Cause(
                    f"Complexing: {name} holds it in solution ({self._held(share, form)}).",
                    f"Take the {name} out or destroy it first, or use a precipitant that is stronger than it.",
                )

    def oxidation_state(self) -> Iterator[Cause]:
        """In another oxidation state it would come down."""
        record = self.stock.species(self.metal)
        element = record.report_key.split("(")[0]
        others = [
            one
            for token, one in self.stock.index.species.items()
            if one.component and token not in self.tokens and one.report_key.split("(")[0] == element
        ]
        others += [self.stock.species(token) for token in self.tokens if token != self.metal]
        for other in sorted(others, key=lambda one: -self._ways_down(one.token)):
            if other.report_key == record.report_key or not other.atoms.get(element):
                continue
            atoms = float(self.content.dissolved(self.metal)[0]) * record.atoms.get(element, 1.0)
            kept = float(self.content.total(self.metal)[0]) - float(self.content.dissolved(self.metal)[0])
            already = float(self.content.total(other.token)[0])
            turned = self._changed({self.metal: kept, other.token: already + atoms / other.atoms[element]})
            if self._met_at_this_pH(turned):
                yield Cause(
                    f"Wrong oxidation state: it is there as {record.report_key}; as {other.report_key} it would come down at this pH.",
                    f"Bring {record.report_key} to {other.report_key} first, and test that none is left.",
                )
                return

    def _ways_down(self, token: str) -> int:
        """Solids that a component is known to make: the state that comes down readily has more of them."""
        solids = (one for one in self.stock.formation if self.stock.kind(one) == "solid")
        return sum(self.stock.components_of(one).get(token, 0.0) > 0 for one in solids)

    def pH(self) -> Iterator[Cause]:
        """At another pH it would come down."""
        window = self._window(self.content)
        if window is None or window[0] - _SAME_PH <= self.now <= window[1] + _SAME_PH:
            return
        if self.now > window[1] and self._is_hydroxo():
            return  # told as an overdose
        side = "too low" if self.now < window[0] else "too high"
        yield Cause(
            f"The pH is outside the window: {figures(self.now)} is {side}; it would be below the limit {_pH_words(window)}.",
            f"Correct the pH: it comes down {_pH_words(window)}.",
        )

    def reagent(self) -> Iterator[Cause]:
        """With more of what is in the vessel and brings it down it would be below."""
        dissolved = float(self.content.dissolved(self.metal)[0])
        needed = _MORE * dissolved
        for token in self._partners():
            if float(self.content.dissolved(token)[0]) > dissolved:
                continue  # there is more of it than the metal could take
            more = self._changed({token: float(self.content.total(token)[0]) + needed})
            if self._met_at_this_pH(more):
                name = name_of(token, self.stock)
                yield Cause(
                    f"Too little reagent: with more {name} at the same pH it would come down.",
                    f"Add more {name} in small portions, and test a filtered drop for what is left.",
                )
                return

    def _held(self, share: float, form: str) -> str:
        return f"{figures(100 * share)} % of what is dissolved, mostly as {form}"


def _pH_words(window: tuple[float, float]) -> str:
    low, high = window
    return (
        f"near pH {figures((low + high) / 2)}"
        if high - low < 2 * _SAME_PH
        else f"between pH {figures(low)} and {figures(high)}"
    )
