"""A knowledge index of a handful of things, for the checks of the rule book.

Its constants are round stand-ins: no check reads them.
"""

from __future__ import annotations

from carboy.model.knowledge import (
    ChemicalClass,
    Container,
    Equilibrium,
    Gas,
    Index,
    Source,
    Species,
    Substance,
    Value,
)


def _value(number: float) -> Value:
    return Value(number, "", "round-numbers", "stand-in of the tests")


def _equilibrium(product: str, kind: str, coefficients: dict[str, float], log10_beta: float) -> Equilibrium:
    return Equilibrium(product, kind, coefficients, log10_beta, "", _value(log10_beta))  # type: ignore[arg-type]


_CLASSES = {
    "sulfide": (),
    "metal": (),
    "active-metal": ("metal",),
    "metal-sulfide": ("sulfide",),
    "oxidiser": (),
    "metal-ion": (),
    "nothing-at-all": (),
}

_SPECIES = [
    Species("H2O", "H2O", {"H": 2, "O": 1}, 0, "aq", component=True),
    Species("H+", "H", {"H": 1}, 1, "aq", component=True),
    Species("OH-", "OH", {"H": 1, "O": 1}, -1, "aq"),
    Species("HS-", "HS", {"H": 1, "S": 1}, -1, "aq", classes=("sulfide",), component=True),
    Species("H2S", "H2S", {"H": 2, "S": 1}, 0, "aq", classes=("sulfide",)),
    Species("H2S(g)", "H2S", {"H": 2, "S": 1}, 0, "g"),
    Species("H2", "H2", {"H": 2}, 0, "aq", component=True),
    Species("H2(g)", "H2", {"H": 2}, 0, "g"),
    Species("zinc", "Zn", {"Zn": 1}, 0, "s", classes=("active-metal",)),
    Species("aluminium", "Al", {"Al": 1}, 0, "s", classes=("active-metal",)),
    Species("copper", "Cu", {"Cu": 1}, 0, "s", classes=("metal",)),
    Species("Zn+2", "Zn", {"Zn": 1}, 2, "aq", classes=("metal-ion",), component=True),
    Species("Al+3", "Al", {"Al": 1}, 3, "aq", classes=("metal-ion",), component=True),
    Species("zinc-sulfide", "ZnS", {"Zn": 1, "S": 1}, 0, "s", classes=("metal-sulfide",)),
    Species("ClO-", "ClO", {"Cl": 1, "O": 1}, -1, "aq", classes=("oxidiser",), component=True),
    Species("Cl-", "Cl", {"Cl": 1}, -1, "aq", component=True),
    Species("SO4-2", "SO4", {"S": 1, "O": 4}, -2, "aq", component=True),
    Species("MnO4-", "MnO4", {"Mn": 1, "O": 4}, -1, "aq", classes=("oxidiser",), component=True),
    Species("Mn+2", "Mn", {"Mn": 1}, 2, "aq", component=True),
    Species("H2O2", "H2O2", {"H": 2, "O": 2}, 0, "aq", classes=("oxidiser",), component=True),
    Species("O2", "O2", {"O": 2}, 0, "aq", component=True),
]

_EQUILIBRIA = (
    _equilibrium("OH-", "aqueous", {"H2O": 1, "H+": -1}, -14.0),
    _equilibrium("H2S", "aqueous", {"HS-": 1, "H+": 1}, 7.0),
    _equilibrium("H2S(g)", "gas", {"HS-": 1, "H+": 1}, 8.0),
    _equilibrium("H2(g)", "gas", {"H2": 1}, 3.0),
    _equilibrium("zinc-sulfide", "solid", {"Zn+2": 1, "HS-": 1, "H+": -1}, 10.0),
)

_SUBSTANCES = [
    Substance("zinc", "zinc", "Zn", {"Zn": 1}, "s", classes=("active-metal",), ion="Zn+2"),
    Substance("aluminium", "aluminium", "Al", {"Al": 1}, "s", classes=("active-metal",), ion="Al+3"),
    Substance("copper", "copper", "Cu", {"Cu": 1}, "s", classes=("metal",)),
    Substance("hydrogen-peroxide", "hydrogen peroxide", "H2O2", {"H": 2, "O": 2}, "l", yields={"H2O2": 1}),
]


def small_index() -> Index:
    """The index."""
    classes = {key: ChemicalClass(key, key.replace("-", " "), broader) for key, broader in _CLASSES.items()}
    return Index(
        sources={"round-numbers": Source("round-numbers", "Stand-in of the tests.")},
        classes=classes,
        species={one.token: one for one in _SPECIES},
        equilibria=_EQUILIBRIA,
        substances={one.id: one for one in _SUBSTANCES},
        materials={},
        gases={token: Gas(token, token.removesuffix("(g)"), token) for token in ("H2S(g)", "H2(g)")},
        containers={"hdpe": Container("hdpe", "HDPE", ("polyethylene",)), "brass": Container("brass", "brass")},
        dilution=(),
        thresholds={},
        limits=(),
        names={"hydrogen peroxide": "substance:hydrogen-peroxide", "zinc": "substance:zinc"},
        ancestors={key: (key, *broader) for key, broader in _CLASSES.items()},
    )
