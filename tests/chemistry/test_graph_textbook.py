"""Standards and handbook values by the solver with the constants of the shipped graph.

Tolerances are those of the data and of the activity model, not of the solver.
"""

from __future__ import annotations

from math import log10

import pytest

from tests.chemistry.graph_mixtures import Draw, components, stock

# Primary and secondary pH standards of the National Bureau of Standards at 25 degC, molal (R. G. Bates, Determination of
# pH, 2nd ed. 1973; values from memory).
STANDARDS: dict[str, tuple[dict[str, float], float]] = {
    "0.025 KH2PO4 + 0.025 Na2HPO4": ({"K+": 0.025, "Na+": 0.05, "PO4-3": 0.05, "H+": 0.075}, 6.865),
    "0.008695 KH2PO4 + 0.03043 Na2HPO4": ({"K+": 0.008695, "Na+": 0.06086, "PO4-3": 0.039125, "H+": 0.04782}, 7.413),
    "0.05 KH phthalate": ({"K+": 0.05, "Phthalate-2": 0.05, "H+": 0.05}, 4.008),
    "0.05 KH2 citrate": ({"K+": 0.05, "Citrate-3": 0.05, "H+": 0.1}, 3.776),
    "0.05 KH3 tetroxalate": ({"K+": 0.05, "Oxalate-2": 0.1, "H+": 0.15}, 1.679),
    "saturated (0.0341) KH tartrate": ({"K+": 0.0341, "Tartrate-2": 0.0341, "H+": 0.0341}, 3.557),
    "0.025 NaHCO3 + 0.025 Na2CO3": ({"Na+": 0.075, "CO3-2": 0.05, "H+": 0.025}, 10.012),
    "0.01 borax": ({"Na+": 0.02, "H3BO3": 0.04, "H+": -0.02}, 9.180),
    "0.01667 tris + 0.05 tris hydrochloride": ({"Tris": 0.06667, "Cl-": 0.05, "H+": 0.05}, 7.699),
    "saturated lime": ({"Ca+2": 0.05, "H+": -0.1, "H2O": 0.1}, 12.454),
    "0.1 HCl": ({"H+": 0.1, "Cl-": 0.1}, 1.094),
}


@pytest.mark.parametrize("name", STANDARDS)
def test_ph_standards(name: str) -> None:
    mixture, expected = STANDARDS[name]
    answer = Draw("standard", "retained", mixture).solve()
    assert answer.converged[0]
    assert answer.pH[0] == pytest.approx(expected, abs=0.05 if "tartrate" not in name else 0.1)


# g of the solid as written on 1 kg of water at 25 degC (20 where marked), CRC Handbook of Chemistry and Physics, "Aqueous
# solubility of inorganic compounds", from memory.
SOLUBILITIES = {
    "silver-chloride": 1.9e-3,
    "silver-bromide": 1.4e-4,
    "silver-sulfate": 8.4,
    "silver-chromate": 0.025,
    "lead-sulfate": 0.044,
    "lead-chloride": 10.8,
    "lead-bromide": 9.75,
    "lead-iodide": 0.76,
    "lead-fluoride": 0.67,
    "lead-chromate": 1.7e-4,  # 20
    "barium-sulfate": 3.1e-3,  # 20
    "barium-fluoride": 1.61,
    "strontium-sulfate": 0.135,
    "gypsum": 2.59,  # 2.05 as CaSO4
    "calcium-fluoride": 0.016,
    "calcium-hydroxide": 1.60,  # 20
    "calcium-oxalate": 6.9e-3,  # 6.1e-3 without its water, 20
    "magnesium-fluoride": 0.13,
    "thallium-i-chloride": 3.3,
}
SOLUBILITY_ALLOWED = 0.12  # log units, a third


def _dissolved(solid: str) -> float:
    """g of the solid that 1 kg of water takes up from an excess."""
    made = stock().components_of(solid)
    metal = next(token for token in made if token.endswith(("+", "+2", "+3")) and token != "H+")
    amount = 30.0 * max(SOLUBILITIES.get(solid, 0.01), 1e-3) / stock().molar_mass(solid)
    answer = Draw("solubility", "retained", {solid: amount}).solve()
    assert answer.converged[0]
    network = answer.network
    assert answer.solids[0, network.solids.index(solid)] > 0.0
    taken = float(answer.amounts[0] @ network.nu[:, network.component_index[metal]])
    return taken / made[metal] * stock().molar_mass(solid)


@pytest.mark.parametrize("solid", SOLUBILITIES)
def test_solubilities(solid: str) -> None:
    assert log10(_dissolved(solid)) == pytest.approx(log10(SOLUBILITIES[solid]), abs=SOLUBILITY_ALLOWED)


def test_fresh_magnesium_hydroxide_is_more_soluble_than_brucite() -> None:
    """Brucite: 6.9 mg/kg at 20 degC (CRC, from memory); what has just come down is a hundred times its ion product."""
    assert 6.9e-3 < _dissolved("magnesium-hydroxide") < 0.07


# Henry constants in mol/kg/atm at 25 degC as in general chemistry texts and the compilation of Sander (from memory), and a
# mixture in which the gas is the molecule itself.
HEADSPACES = {
    "H2S(g)": ({"sodium-sulfide": 0.01, "hydrochloric-acid": 0.05}, 0.01, 0.10),
    "HCN(g)": ({"sodium-cyanide": 0.01, "hydrochloric-acid": 0.05}, 0.01, 7.5),
    "HN3(g)": ({"sodium-azide": 0.01, "hydrochloric-acid": 0.5}, 0.01, 12.0),
    "CO2(g)": ({"sodium-carbonate": 0.01, "hydrochloric-acid": 0.05}, 0.01, 0.034),
    "NH3(g)": ({"ammonium-chloride": 0.01, "sodium-hydroxide": 0.5}, 0.01, 60.0),
}


@pytest.mark.parametrize("gas", HEADSPACES)
@pytest.mark.parametrize("headspace_L", [0.1, 1.0, 5.0])
def test_sealed_headspaces_by_hand(gas: str, headspace_L: float) -> None:
    """p = n / (V / RT + k w / g), g the coefficient of a neutral molecule, log10 g = 0.1 I."""
    portions, amount, henry = HEADSPACES[gas]
    answer = Draw("headspace", "sealed", dict(portions), headspace_L=headspace_L).solve()
    salted = henry * answer.water_kg[0] / 10.0 ** (0.1 * answer.ionic_strength[0])
    by_hand = amount / (headspace_L / (0.082057 * 298.15) + salted)
    ours = answer.pressures[0, answer.network.gases.index(gas)]
    assert log10(ours) == pytest.approx(log10(by_hand), abs=0.04)


def test_portions_are_read_as_components() -> None:
    assert components({"sodium-hydroxide": 2.0}) == {"Na+": 2.0, "H+": -2.0, "H2O": 2.0}
