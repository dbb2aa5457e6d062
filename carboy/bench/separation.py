"""Filtering and decanting: a clear liquid and a sludge, with nothing lost between them."""

from __future__ import annotations

import numpy as np

from carboy.chemistry.mixture import Array, Mixture
from carboy.chemistry.stock import PROTON

LIQUID_IN_CAKE = 2.0  # mL of liquid that a drained filter cake keeps per g of solid; common practice
_MOST_KEPT = 0.5  # share of the liquid that a cake can hold back at the most


def separated(
    content: Mixture, *, retained_mL_per_g: float | None = None, passes: float = 0.0
) -> tuple[Mixture, Mixture]:
    """The clear liquid and the sludge of ``content``.

    The sludge holds the equilibrium solids, what lies there as a solid or a metal, and ``retained_mL_per_g`` of liquid; ``passes`` is the
    share of the solids that runs through. Every component's amounts in the two add up to those in ``content``.
    """
    stock = content.stock
    solid: dict[str, Array] = {}
    grams = content.zeros()
    for token, amount in content.solids.items():
        grams = grams + amount * stock.molar_mass(token)
        for component, count in stock.components_of(token).items():
            solid[component] = solid.get(component, content.zeros()) + count * amount
    for token, amount in content.aside.items():
        if stock.species(token).phase == "s" or "metal" in stock.classes.get(token, ()):
            grams = grams + amount * stock.molar_mass(token)
            solid[token] = amount
    retained = (LIQUID_IN_CAKE if retained_mL_per_g is None else retained_mL_per_g) * grams
    kept = np.clip(retained / 1000 / np.maximum(content.volume_L, 1e-9), 0.0, _MOST_KEPT)
    # a component may be in the solids alone: protons that a hydroxide has given up count even where the liquid's own total is nil
    liquid = {token: content.total(token) - solid.get(token, 0.0) for token in {**content.amounts, **solid}}
    liquid = {token: value if token == PROTON else np.maximum(value, 0.0) for token, value in liquid.items()}
    loose = np.maximum(content.mass_g - grams, 0.0)
    clear = {token: value * (1 - kept) + passes * solid.get(token, 0.0) for token, value in liquid.items()}
    sludge = {token: value * kept + (1 - passes) * solid.get(token, 0.0) for token, value in liquid.items()}
    return (
        _part(content, clear, content.volume_L * (1 - kept), loose * (1 - kept), 1 - kept),
        _part(content, sludge, np.maximum(content.volume_L * kept, grams / 2000), grams + loose * kept, kept),
    )


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
