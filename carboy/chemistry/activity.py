"""Activity coefficients of dissolved species and the activity of water.

Ions: the Davies equation, ``log10 g = -A z^2 (sqrt(I)/(1 + sqrt(I)) - 0.3 I)`` (C. W. Davies, Ion Association, 1962;
form and coefficient from memory). It is sound to I = 0.1 and usable to 0.5 mol/kg for charges 1 and 2. Its bracket
has a maximum near I = 0.395 mol/kg; from there on it is **held at that maximum**, so that the coefficient stays
bounded (0.73 for z = 1) at any strength and its slope stays continuous. Held so, it is nearer to the measured
coefficients of sodium chloride at 1 to 4 mol/kg (0.65 to 0.78, from memory) than the untruncated equation.

Error of log10 of the mean stoichiometric coefficient, ours less the tables of Robinson and Stokes (Electrolyte
Solutions, 1959, as in the CRC Handbook; from memory), without ion pairs but with HSO4-; tested in
tests/chemistry/test_activity_model.py:

========== ====== ====== ====== ====== ====== ====== ======
mol/kg        0.1    0.5      1      2      3      4      6
========== ====== ====== ====== ====== ====== ====== ======
NaCl        +0.00  +0.03  +0.05  +0.04  +0.01  -0.03  -0.13
HCl         -0.01  +0.00  +0.03  +0.05  +0.06  +0.05  +0.03
HNO3        -0.01  +0.01  +0.05  +0.08  +0.09  +0.10  +0.13
HClO4       -0.01  -0.01  +0.03  +0.07  +0.07  +0.05  -0.03
NaOH        +0.01  +0.03  +0.03  +0.01  -0.03  -0.09  -0.25
CaCl2       +0.02  +0.08  +0.03  -0.17  -0.44  -0.74  -1.32
H2SO4       -0.04  -0.03  -0.01  +0.02  +0.02  +0.01  -0.02
========== ====== ====== ====== ====== ====== ====== ======

Strong acid: beyond I = 0.395 mol/kg what H+ and an anion X do to one another is added by specific ion interaction (Bronsted,
Guggenheim and Scatchard), ``log10 g(H+) += (1 - 0.395/I) sum(e m(X))`` and ``log10 g(X) += (1 - 0.395/I) e m(H+)``, with
the coefficients e of the graph; it comes in between 0.1 and 0.5 mol/kg of H+, and molalities above 20 mol/kg count as 20.
It brings the vapour of HCl over 37 % acid (16 mol/kg) to 0.37 atm, where handbooks have 0.2 to 0.3 (from memory); without it,
0.0001. Other brines have no such term. Whatever is above I = 0.5 is reported as outside the range of the model.

Neutral species: ``log10 g = 0.1 I``, held from I = 5 mol/kg. It salts gases out, which errs to more gas.

Water: ``a = 1 - 0.017 sum(m)`` (Garrels and Christ 1965, from memory) up to sum(m) = 20 mol/kg, continued from there
with the same slope of its logarithm to 60 mol/kg and held, so that it stays above 0.2.

A: 0.509 at 25 degC (from memory), carried to other temperatures with (eps T)^-1.5 and the permittivity of water of
Malmberg and Maryott, J. Res. Natl. Bur. Stand. 56, 1 (1956) (coefficients from memory).
"""

from __future__ import annotations

import numpy as np

from carboy.chemistry.network import REFERENCE_KELVIN, ZERO_CELSIUS, FloatArray

TRUSTED_IONIC_STRENGTH = 0.5  # mol/kg; results above it are outside the range of the model
DAVIES_LINEAR = 0.3
DAVIES_HELD_FROM = 0.39497933858960194  # mol/kg, where 0.6 s (1 + s)^2 = 1 with s = sqrt(I): maximum of the bracket
ACID_FROM, ACID_WHOLE = 0.1, 0.5  # mol/kg of H+ between which the interaction with anions comes in
ACID_HELD_FROM = 20.0  # mol/kg of an ion, beyond which the interaction grows no further
NEUTRAL_SLOPE = 0.1
NEUTRAL_HELD_FROM = 5.0  # mol/kg
WATER_SLOPE = 0.017  # kg/mol
WATER_LINEAR_TO = 20.0  # mol/kg
WATER_HELD_FROM = 60.0  # mol/kg

_LN10 = np.log(10.0)


def permittivity(temperature_C: float) -> float:
    """Relative permittivity of water, 0 to 100 degC."""
    t = temperature_C
    return 87.740 - 0.40008 * t + 9.398e-4 * t**2 - 1.410e-6 * t**3


def debye_hueckel_slope(temperature_C: float) -> float:
    """The A of the Davies equation, (kg/mol)^0.5, for log10."""
    reference = permittivity(REFERENCE_KELVIN - ZERO_CELSIUS) * REFERENCE_KELVIN
    return float(0.509 * (reference / (permittivity(temperature_C) * (temperature_C + ZERO_CELSIUS))) ** 1.5)


def ln_gamma_unit_charge(ionic_strength: FloatArray, slope: float) -> tuple[FloatArray, FloatArray]:
    """ln of the activity coefficient for z^2 = 1, and its derivative by I. Shapes as ``ionic_strength`` (mol/kg)."""
    strength = np.minimum(ionic_strength, DAVIES_HELD_FROM)  # where the slope is zero by itself
    root = np.sqrt(strength)
    above = 1.0 + root
    factor = -_LN10 * slope
    value = factor * (root / above - DAVIES_LINEAR * strength)
    derivative = factor * (0.5 / (np.maximum(root, 1e-6) * above * above) - DAVIES_LINEAR)
    return value, derivative


def ln_acid_interaction(
    proton: FloatArray, anions: FloatArray, coefficients: FloatArray, ionic_strength: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """What the interaction of H+ with anions adds to ln gamma of H+ [L] and of each anion [L, A].

    ``proton`` [L] and ``anions`` [L, A] are mol/kg, ``coefficients`` [A] kg/mol for log10.
    """
    beyond = np.maximum(1.0 - DAVIES_HELD_FROM / np.maximum(ionic_strength, DAVIES_HELD_FROM), 0.0)
    comes_in = np.clip((proton - ACID_FROM) / (ACID_WHOLE - ACID_FROM), 0.0, 1.0)
    factor = _LN10 * beyond * comes_in
    of_proton = factor * (np.minimum(anions, ACID_HELD_FROM) @ coefficients)
    of_anions = (factor * np.minimum(proton, ACID_HELD_FROM))[:, None] * coefficients
    return of_proton, of_anions


def ln_gamma_neutral(ionic_strength: FloatArray) -> tuple[FloatArray, FloatArray]:
    """ln of the activity coefficient of a neutral species, and its derivative by I (mol/kg)."""
    slope = _LN10 * NEUTRAL_SLOPE
    return slope * np.minimum(ionic_strength, NEUTRAL_HELD_FROM), slope * (ionic_strength < NEUTRAL_HELD_FROM)


def ln_water_activity(sum_molality: FloatArray) -> tuple[FloatArray, FloatArray]:
    """ln of the activity of water, and its derivative by the sum of molalities (mol/kg)."""
    linear = 1.0 - WATER_SLOPE * np.minimum(sum_molality, WATER_LINEAR_TO)
    derivative = -WATER_SLOPE / linear
    value = np.log(linear)
    beyond = sum_molality > WATER_LINEAR_TO
    if beyond.any():
        past = np.minimum(sum_molality, WATER_HELD_FROM) - WATER_LINEAR_TO
        value = np.where(beyond, value + derivative * past, value)
        derivative = np.where(sum_molality >= WATER_HELD_FROM, 0.0, derivative)
    return value, derivative
