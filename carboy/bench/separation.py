"""Filtering, decanting and washing: a clear liquid, a sludge, and what goes astray, with nothing lost between them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from carboy.chemistry.mixture import Array, Mixture, poured_together
from carboy.chemistry.stock import PROTON, ChemicalStock

# mL of liquid per g, where the case does not say: common practice, all of them
LIQUID_IN_CAKE = 2.0  # a drained filter cake
LIQUID_OVER_SLUDGE = (
    20.0  # a settled precipitate under a decanted liquid: about 5 % of solids, and hydroxides hardly settle further
)
LIQUID_IN_AID = 2.5  # drained filter aid: some 0.3 g of it in each mL of bed, of which four fifths are liquid
LIQUID_IN_PAPER = 2.0  # paper or cloth, wet but not dripping
_MOST_KEPT = 0.5  # share of the liquid that solids can hold back at the most
_DENSITY = 2000.0  # g/L of a precipitate, for the room that it takes; common practice


@dataclass(frozen=True)
class Separated:
    """The streams of a separation: ``clear`` liquid, ``sludge``, solids that have passed, and what is held by something thrown away."""

    clear: Mixture
    sludge: Mixture
    passed: Mixture
    thrown_away: Mixture

    @property
    def filtrate(self) -> Mixture:
        """The liquid with what has passed into it."""
        return poured_together(self.clear, self.passed) if self.passed.amounts else self.clear


def solid_parts(content: Mixture) -> tuple[dict[str, Array], Array]:
    """mol by component of what lies there as a solid or a metal, and its g: equilibrium solids and things that stand aside."""
    stock = content.stock
    solid: dict[str, Array] = {}
    grams = content.zeros()
    for token, amount in content.solids.items():
        grams = grams + amount * stock.molar_mass(token)
        for component, count in stock.components_of(token).items():
            solid[component] = solid.get(component, content.zeros()) + count * amount
    for token, amount in content.aside.items():
        if _lies_apart(token, stock):
            grams = grams + amount * stock.molar_mass(token)
            solid[token] = amount
    return solid, grams


def _lies_apart(token: str, stock: ChemicalStock) -> bool:
    return stock.species(token).phase == "s" or "metal" in stock.classes.get(token, ())


def separated(
    content: Mixture,
    *,
    retained_mL_per_g: float | None = None,
    passes: float = 0.0,
    carried_mL: float = 0.0,
    thrown_away_mL: float = 0.0,
    evenly: bool = False,
) -> Separated:
    """The streams that ``content`` parts into. Every component's amounts in them add up to those in ``content``.

    The sludge holds the equilibrium solids, what lies there as a solid or a metal, ``retained_mL_per_g`` of liquid, and ``carried_mL`` more
    where filter aid lies in it. ``passes``: share of the solids that runs through. ``thrown_away_mL``: liquid that paper takes along.
    ``evenly``: the solids float in the liquid and go where it goes.
    """
    solid, grams = solid_parts(content)
    volume_mL = np.maximum(1000 * content.volume_L, 1e-6)
    per_gram = LIQUID_IN_CAKE if retained_mL_per_g is None else retained_mL_per_g
    kept = np.clip(per_gram * grams / volume_mL, 0.0, _MOST_KEPT)
    kept = np.minimum(kept + carried_mL / volume_mL, 1.0)
    away = np.minimum(thrown_away_mL / volume_mL, 1.0 - kept)
    through = 1.0 - kept - away if evenly else np.full(content.lanes, passes)
    # a component may be in the solids alone: protons that a hydroxide has given up count even where the liquid's own total is nil
    liquid = {token: content.total(token) - solid.get(token, 0.0) for token in {**content.amounts, **solid}}
    # rounding of the equilibrium must not make more of a solid than there is of what it is made of
    for token, value in liquid.items():
        if token != PROTON and np.any(value < 0):
            solid[token] = solid[token] + np.minimum(value, 0.0)
            liquid[token] = np.maximum(value, 0.0)
    loose = np.maximum(content.mass_g - grams, 0.0)
    clear_share = 1.0 - kept - away
    sludge = {token: value * kept + (1 - through) * solid.get(token, 0.0) for token, value in liquid.items()}
    has_passed = bool(np.any(through > 0)) and bool(solid)
    return Separated(
        _part(content, _share(liquid, clear_share), content.volume_L * clear_share, loose * clear_share, clear_share),
        _part(
            content,
            sludge,
            np.maximum(content.volume_L * kept, (1 - through) * grams / _DENSITY),
            (1 - through) * grams + loose * kept,
            kept,
        ),
        _part(
            content,
            _share(solid, through) if has_passed else {},
            through * grams / _DENSITY,
            through * grams,
            content.zeros(),
        ),
        _part(
            content,
            _share(liquid, away) if thrown_away_mL > 0 else {},
            content.volume_L * away,
            loose * away,
            away,
        ),
    )


def _share(amounts: dict[str, Array], share: Array) -> dict[str, Array]:
    return {token: value * share for token, value in amounts.items()}


def _part(content: Mixture, amounts: dict[str, Array], volume: Array, mass: Array, share: Array) -> Mixture:
    return Mixture(
        content.stock,
        amounts,
        {name: value * share for name, value in content.labelled.items()},
        volume,
        mass,
        content.temperature_C.copy(),
        network_temperature_C=content.network_temperature_C,
    )
