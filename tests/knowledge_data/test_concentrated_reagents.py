"""What "concentrated" means: molarity from mass per cent and density against the printed molarity."""

from __future__ import annotations

import pytest

from carboy.knowledge.index import load_index

# Reprinted reagent table ("Composition of concentrated reagent-grade acids and ammonium hydroxide"): mol/L;
# molar masses from IUPAC atomic weights, g/mol.
MOLARITY = {
    "hydrochloric-acid": (12.1, 36.46),
    "nitric-acid": (15.8, 63.01),
    "sulfuric-acid": (18.0, 98.07),
    "ammonia": (14.8, 17.03),
    "acetic-acid": (17.4, 60.05),
    "phosphoric-acid": (14.8, 97.99),
    "hydrofluoric-acid": (28.9, 20.01),
    "perchloric-acid": (11.7, 100.45),
    "sodium-hydroxide": (19.4, 40.00),
}


@pytest.mark.parametrize(("substance", "printed", "molar_mass"), [(k, *v) for k, v in MOLARITY.items()])
def test_molarity_of_the_concentrated_reagent(substance: str, printed: float, molar_mass: float) -> None:
    (material,) = (item for item in load_index().materials.values() if item.strength_of == substance)
    (part,) = (item for item in material.parts if item.substance == substance)
    assert material.density is not None
    molarity = part.typical / 100 * material.density.magnitude * 1000 / molar_mass
    assert molarity == pytest.approx(printed, rel=0.03)


def test_parts_stay_within_a_hundred_per_cent() -> None:
    for material in load_index().materials.values():
        assert sum(part.typical for part in material.parts) <= 100.0, material.id
        assert sum(part.low for part in material.parts) <= 100.0, material.id
        for part in material.parts:
            assert part.low <= part.typical <= part.high, (material.id, part.substance)


def test_one_strength_for_each_substance() -> None:
    strengths = [item.strength_of for item in load_index().materials.values() if item.strength_of]
    assert len(strengths) == len(set(strengths))


def test_liquids_have_a_density() -> None:
    """A volume on a label needs it; two pastes and solutions of unknown density are named here."""
    without = {item.id for item in load_index().materials.values() if item.state == "l" and item.density is None}
    assert without == {"brady-reagent", "glass-etching-cream"}
