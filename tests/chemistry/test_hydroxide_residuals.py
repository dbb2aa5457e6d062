"""What hydroxide leaves of a metal: the pH of least solubility and the residual there, against figures of the trade.

The pH values and residuals are those of the usual curves for metal finishing wastes (US EPA, Development Document for Effluent
Limitations, Metal Finishing, 1983; Patterson, Industrial Wastewater Treatment Technology, 2nd ed. 1985; both from memory). Such curves
part by a factor of several from one another, so an order of magnitude is asked.
"""

from __future__ import annotations

import numpy as np
import pytest

from carboy.chemistry.equilibrium import solve
from carboy.vetting import laboratory

METAL_MOL = 0.01


@pytest.mark.parametrize(
    ("metal", "charge", "grams", "pH", "within", "mg_L"),
    [
        ("Cu+2", 2, 63.55, 9.2, 0.8, 0.01),
        ("Zn+2", 2, 65.38, 9.6, 0.5, 0.2),
        ("Ni+2", 2, 58.69, 10.4, 0.5, 0.1),
        ("Cd+2", 2, 112.41, 11.2, 0.5, 0.05),
        ("Cr+3", 3, 52.00, 8.3, 0.8, 0.03),
    ],
)
def test_least_solubility(metal: str, charge: int, grams: float, pH: float, within: float, mg_L: float) -> None:
    network = laboratory().stock.networks.network((metal, "Na+", "NO3-"))
    base = METAL_MOL * charge + np.concatenate([-np.linspace(0.01, 0.0, 100) * METAL_MOL, np.logspace(-7, -1, 300)])
    totals = np.zeros((len(base), len(network.components)))
    for token, amount in (("H+", -base), (metal, METAL_MOL), ("Na+", base), ("NO3-", METAL_MOL * charge)):
        totals[:, network.component_index[token]] = amount
    answer = solve(network, totals, 55.51 + base)
    assert answer.converged.all()
    left = METAL_MOL - answer.solids @ network.solid_nu[:, network.component_index[metal]]
    least = int(np.argmin(left))
    assert answer.pH[least] == pytest.approx(pH, abs=within)
    assert abs(np.log10(left[least] * grams * 1000 / mg_L)) < 1.0
