"""The reduction of a body of equilibria to the components at hand."""

from __future__ import annotations

import numpy as np
import pytest

from carboy.chemistry.network import NetworkFactory, reduce_network, van_t_hoff
from carboy.errors import KnowledgeError
from tests.chemistry.aqueous_records import EQUILIBRIA, SPECIES, equilibrium, species_of
from tests.chemistry.mixtures import FACTORY


def test_only_what_can_form() -> None:
    network = reduce_network(EQUILIBRIA, SPECIES, ["Na+", "Acetate-"])
    assert network.components == ("H+", "Acetate-", "Na+")
    assert network.species[:3] == network.components
    assert set(network.species) == {"H+", "Acetate-", "Na+", "OH-", "H(Acetate)", "Na(Acetate)"}
    assert network.solids == ()
    assert network.gases == ()


def test_hydroxide_is_minus_one_proton_and_one_water() -> None:
    network = FACTORY.network({"Na+"})
    row = network.species_index["OH-"]
    assert network.nu[row].tolist() == [-1.0, 0.0]
    assert network.nu_water[row] == 1.0
    assert network.log_beta[row] == -13.997
    assert network.charge[row] == -1.0


def test_slow_solids_are_left_out_unless_asked_for() -> None:
    assert "Cinnabar" not in FACTORY.network({"Hg+2", "HS-"}).solids
    assert "Metacinnabar" in FACTORY.network({"Hg+2", "HS-"}).solids
    assert "Cinnabar" in FACTORY.network({"Hg+2", "HS-"}, slow_solids=True).solids


def test_charge_of_each_species_follows_from_its_components() -> None:
    network = FACTORY.network({"Hg+2", "HS-", "Cl-", "CO3-2", "Cu+2", "Edta-4"})
    assert np.allclose(network.nu @ network.component_charge, network.charge)
    assert np.allclose(network.solid_nu @ network.component_charge, 0.0)
    assert np.allclose(network.gas_nu @ network.component_charge, 0.0)


def test_constants_move_with_temperature() -> None:
    """55.81 kJ/mol: pKw falls by 0.76 from 25 to 50 degC."""
    cold, warm = FACTORY.network({"Na+"}), FACTORY.network({"Na+"}, 50.0)
    row = cold.species_index["OH-"]
    by_hand = 55.81e3 / (8.31446 * np.log(10.0)) * (1.0 / 298.15 - 1.0 / 323.15)
    assert warm.log_beta[row] - cold.log_beta[row] == pytest.approx(by_hand, rel=1e-6)
    assert warm.temperature_C == 50.0
    assert van_t_hoff(3.0, None, 80.0) == 3.0
    assert "Cu(OH)2" not in FACTORY.network({"Cu+2"}).uncorrected


def test_products_without_enthalpy_are_named() -> None:
    assert "H2S(g)" in FACTORY.network({"HS-"}, 60.0).uncorrected
    assert FACTORY.network({"HS-"}).uncorrected == ()


def test_networks_are_kept_and_read_only() -> None:
    factory = NetworkFactory(EQUILIBRIA, SPECIES, keep=2)
    one = factory.network(["Na+", "Cl-"])
    assert factory.network(["Cl-", "Na+", "H+", "H2O"]) is one
    factory.network(["K+"])
    factory.network(["Ca+2"])
    assert factory.network(["Na+", "Cl-"]) is not one
    with pytest.raises(ValueError, match="read-only"):
        one.log_beta[0] = 1.0


def test_unknown_and_formed_components_are_refused() -> None:
    with pytest.raises(KnowledgeError, match="not described"):
        FACTORY.network(["Unobtainium+2"])
    with pytest.raises(KnowledgeError, match="cannot be a component"):
        FACTORY.network(["Na+", "HCO3-"])


def test_a_charge_that_does_not_balance_is_refused() -> None:
    rows = [equilibrium("CuCl2", "aqueous", "Cu+2 + 2 Cl- = CuCl2", 1.0)]
    wrong = species_of(rows)
    wrong["CuCl2"] = SPECIES["OH-"]
    with pytest.raises(KnowledgeError, match="charge"):
        reduce_network(rows, wrong, ["Cu+2", "Cl-"])
    solid = [equilibrium("Odd", "solid", "Odd(s) = Cu+2 + Cl-", -1.0)]
    with pytest.raises(KnowledgeError, match="charge"):
        reduce_network(solid, species_of(solid), ["Cu+2", "Cl-"])


def test_a_species_formed_twice_is_refused() -> None:
    rows = [equilibrium("CuCl+", "aqueous", "Cu+2 + Cl- = CuCl+", value) for value in (0.2, 0.3)]
    with pytest.raises(KnowledgeError, match="more than one"):
        reduce_network(rows, species_of(rows), ["Cu+2", "Cl-"])
