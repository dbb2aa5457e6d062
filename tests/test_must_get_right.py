"""What a new user tries first, with the figures worked out by hand beside each.

Molar masses: IUPAC 2021 standard atomic weights. Gas: 24.465 L/mol at 25 degC and 1 atm. IDLH (NIOSH: H2S 100 ppm or
50 ppm by the year, Cl2 10 ppm, HCN 50 ppm) are read from the graph, so that a test does not fail over a revised limit.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from carboy.errors import InputError
from carboy.vetting import combine, laboratory
from tests.bench.reports import combined, labels, measure, only, outline, select, step_value, walked, words_of

LITRES_PER_MOL = 24.465  # 25 degC, 1 atm
ROOT = Path(__file__).parents[1]


def idlh(token: str) -> float:
    value = laboratory().index.gases[token].idlh
    assert value is not None
    return value.magnitude


def command(*words: str) -> subprocess.CompletedProcess[str]:
    """The command line in a process of its own, as a user starts it."""
    environment = {**os.environ, "PYTHONPATH": str(ROOT), "PYTHONUTF8": "1", "COLUMNS": "100"}
    return subprocess.run(
        [sys.executable, "-m", "carboy", *words],
        capture_output=True,
        text=True,
        env=environment,
        timeout=60,
        check=False,
    )


# --- bleach and muriatic acid ----------------------------------------------------------------------------------

BLEACH, MURIATIC = "500 mL of 6 % sodium hypochlorite", "100 mL of 31 % hydrochloric acid"


def test_chlorine_by_the_limiting_reagent() -> None:
    # 6 % w/w NaOCl beside as much NaCl: 1.08 g/mL (White, Handbook of Chlorination), 500 mL = 540 g, 32.4 g
    # NaOCl / 74.44 = 0.435 mol.
    # 31 % HCl: 1.154 g/mL, 115.4 g, 35.8 g / 36.46 = 0.981 mol. HOCl + HCl -> Cl2 + H2O needs 2 H+ an OCl-:
    # 0.435 x 2 = 0.87 < 0.981,
    # and chloride 0.435 + 0.981 > 0.435: hypochlorite limits, 0.435 mol of Cl2.
    report = combined(BLEACH, MURIATIC)
    chlorine = only(report, "toxic-gas", "Cl2")
    assert report.verdict == "refuse"
    assert chlorine.signal == "danger"
    assert chlorine.amount_mol == pytest.approx((0.435, 0.435), rel=0.10)
    # air brought to IDLH: 0.435 mol x 24.465 L / 10e-6 = 1060 m3
    assert measure(chlorine, "air brought") == pytest.approx(
        0.435 * LITRES_PER_MOL / 1000 / (idlh("Cl2(g)") * 1e-6), rel=0.10
    )


def test_chlorine_path_from_both_labels() -> None:
    chlorine = only(combined(BLEACH, MURIATIC), "toxic-gas", "Cl2")
    assert any("hypochlorite" in word for word in labels(chlorine))
    assert any("hydrochloric acid" in word for word in labels(chlorine))
    assert "Cl2" in chlorine.path[-1].to
    assert chlorine.sources


def test_the_other_order_of_bleach_and_acid_is_judged() -> None:
    # acid first: there is enough acid (0.98 mol against 0.87 needed) for chlorine from the first drop of bleach on
    # bleach first: the first acid is taken up by hydroxide and hypochlorite; chlorine begins later
    written, turned = combined(BLEACH, MURIATIC), combined(MURIATIC, BLEACH)
    late, early = (
        only(written, "toxic-gas", "Cl2", order="either order"),
        only(turned, "toxic-gas", "Cl2", order="either order"),
    )
    assert early.fractions[0] < 0.1 < late.fractions[0]
    assert turned.verdict == "refuse"
    assert early.amount_mol == pytest.approx(late.amount_mol, rel=0.02)


def test_where_the_orders_differ_the_finding_of_the_other_order_is_there() -> None:
    # water into concentrated acid boils at the first drops; acid into water does not (see below): both orders
    # report it
    assert select(combined("200 mL of water", "20 mL of 96 % sulfuric acid"), "heat", order="other order")
    assert select(combined("20 mL of 96 % sulfuric acid", "200 mL of water"), "heat", order="as written")


# --- sulfide ---------------------------------------------------------------------------------------------------


def test_sulfide_and_acid() -> None:
    # S 1 L x 0.1 M = 0.1 mol; acid 0.5 mol against 2 x 0.1 needed: all of it H2S. 0.1 x 24.465 / 50e-6 (or
    # 100e-6) L of air
    report = combined("1 L of 0.1 M sodium sulfide", "1 L of 0.5 M hydrochloric acid")
    gas = only(report, "toxic-gas", "H2S")
    assert report.verdict == "refuse"
    assert gas.signal == "danger"
    assert gas.amount_mol == pytest.approx((0.1, 0.1), rel=1e-3)
    assert measure(gas, "air brought") == pytest.approx(0.1 * LITRES_PER_MOL / 1000 / (idlh("H2S(g)") * 1e-6), rel=0.01)
    assert any("sodium sulfide" in word for word in labels(gas))
    assert any("hydrochloric acid" in word for word in labels(gas))
    # 0.3 mol of acid left in 2 L: -log(0.15 x 0.75 (activity coefficient)) = 0.95
    assert report.steps[1].pH == pytest.approx((0.95, 0.95), abs=0.05)


def test_sulfide_and_base() -> None:
    report = combined("1 L of 0.1 M sodium sulfide", "1 L of 0.5 M sodium hydroxide")
    assert report.verdict == "no objection", outline(report)
    assert not [one for one in report.findings if one.signal != "note"]
    assert not report.unrecognised


def test_little_sulfide_is_a_lesser_finding_with_its_small_amount() -> None:
    # 200 mL x 0.001 M = 0.0002 mol, acid 0.002 mol: 0.0002 mol H2S, 4.9 mL, which brings 0.0002 x 24.465 /
    # 100e-6 = 49 L to 100 ppm
    small = only(combined("200 mL of 0.001 M sodium sulfide", "200 mL of 0.01 M hydrochloric acid"), "toxic-gas", "H2S")
    large = only(combined("1 L of 0.1 M sodium sulfide", "1 L of 0.5 M hydrochloric acid"), "toxic-gas", "H2S")
    rank = {"note": 0, "warning": 1, "danger": 2}
    assert small.amount_mol == pytest.approx((2e-4, 2e-4), rel=0.01)
    assert rank[small.signal] < rank[large.signal]
    assert "H2S" in small.species
    assert "ydrogen sulfide" in small.summary
    assert combined("200 mL of 0.001 M sodium sulfide", "200 mL of 0.01 M hydrochloric acid").verdict == "conditional"


# --- bicarbonate -----------------------------------------------------------------------------------------------

SODA, ACID = "50 g of sodium bicarbonate", "1 L of 1 M hydrochloric acid"


def test_carbon_dioxide_and_foam() -> None:
    # 50 g / 84.007 = 0.5952 mol NaHCO3; acid 1 mol: CO2 0.5952 mol
    report = combined(SODA, ACID)
    foam = only(report, "foam", "CO2")
    assert report.verdict == "refuse"
    assert foam.signal == "danger"
    assert foam.amount_mol == pytest.approx((0.5952, 0.5952), rel=2e-3)
    # dissolved at 1 atm (33 mmol/kg in water, Henry; 26 mmol in this brine): 0.569 mol bubbles = 13.9 L against
    # 1 L of free space
    assert measure(foam, "gas") == pytest.approx((0.5952 - 0.026) * LITRES_PER_MOL, rel=0.02)
    low, high = step_value(report, 2, "gas_mol", "CO2")
    assert low == high == pytest.approx(0.5952 - 0.026, abs=0.006)


def test_pressure_in_a_sealed_bottle() -> None:
    # 2 L bottle, 1 L of acid and 50 g of salt (0.025 L): headspace 0.975 L. Henry constant of CO2 0.034 mol/(kg
    # atm) (Sander), lowered by
    # 10**(0.1 x 1) = 1.26 at I = 1 mol/kg: 0.027. P x 0.975 / 24.465 + P x 0.027 x 0.98 = 0.5952 -> P = 0.5952
    # / (0.03985 + 0.02646)
    # = 8.98 atm = 910 kPa of CO2 beyond the air shut in at one atmosphere (98.2 kPa of air and 3.2 kPa of water
    # vapour).
    report = combined(SODA, ACID, volume_L=2.0, cover="sealed")
    pressure = only(report, "pressure")
    assert report.verdict == "refuse"
    assert pressure.signal == "danger"
    assert measure(pressure, "gauge pressure") == pytest.approx(910, rel=0.03)
    assert report.steps[1].gauge_kPa == pytest.approx((910, 910), rel=0.03)
    assert "acid-on-carbonate" in words_of(pressure) + " ".join(pressure.rules)


def test_a_pressure_finding_states_what_forms() -> None:
    pressure = only(combined(SODA, ACID, volume_L=2.0, cover="sealed"), "pressure")
    assert pressure.amount_mol == pytest.approx((0.5952, 0.5952), rel=0.01)


def test_the_first_drops_of_acid_free_no_more_carbon_dioxide_than_they_can() -> None:
    # half a per cent of the acid: 5 mL, 0.005 mol, frees 0.005 mol of CO2; over saturated bicarbonate
    # solution CO2 stands at some 0.05 atm, in 2 L 0.004 mol more
    path = walked(SODA, ACID, volume_L=2.0, cover="sealed").steps[1].path
    assert path is not None
    first = path.mixture.gases["CO2(g)"][0]
    assert first <= 0.011


# --- mercury and sulfide ---------------------------------------------------------------------------------------

MERCURY = "1 L of (0.01 M mercury(II) nitrate + 0.5 M sodium bicarbonate)"


def test_mercury_comes_down_with_its_sulfide() -> None:
    # Hg 10 mmol, S 11 mmol: 10 mmol of HgS, 1 mmol of sulfide over
    report = combined(MERCURY, "100 mL of 0.11 M sodium sulfide")
    assert step_value(report, 2, "solids_mol", "HgS") == pytest.approx((0.01, 0.01), rel=1e-4)
    assert report.steps[1].pH == pytest.approx((8.0, 8.0), abs=0.3)
    # against the limit of 0.2 mg/L: 0.2e-3 / 200.59 x 1.1 = 1.1e-6 mol
    low, high = step_value(report, 2, "dissolved_mol", "Hg")
    assert 0 < low <= high < 1.1e-6
    assert report.verdict != "refuse"
    assert not [one for one in select(report, "remobilised") if one.fractions[1] == 1.0 and one.signal != "note"]


def test_a_great_excess_of_sulfide_puts_mercury_back() -> None:
    # HgS + S2- -> HgS2 2-; 0.5 mol of sulfide against 0.01 mol of mercury
    report = combined(MERCURY, "100 mL of 5 M sodium sulfide")
    back = only(report, "remobilised", "HgS2")
    assert back.signal == "danger"
    assert back.fractions[1] == 1.0
    assert measure(back, "dissolved Hg") > 10 * measure(back, "limit for Hg")
    assert step_value(report, 2, "dissolved_mol", "Hg")[0] > 1e-5
    assert any("mercury(II) nitrate" in word for word in labels(back))
    assert any("sodium sulfide" in word for word in labels(back))


# --- chloramines -----------------------------------------------------------------------------------------------


def test_household_ammonia_and_bleach() -> None:
    report = combined("100 mL of household ammonia", "100 mL of bleach")
    chloramine = only(report, "toxic-gas", "NH2Cl")
    assert report.verdict == "refuse"
    assert chloramine.signal == "danger"
    assert chloramine.amount_mol is not None
    # bleach of 3 to 8.25 % NaOCl: 0.042 to 0.12 mol in 100 mL; ammonia 2 to 10 %: 0.115 to 0.58 mol. OCl- + NH3
    # -> NH2Cl + OH-, 1:1
    assert chloramine.amount_mol[0] == pytest.approx(0.043, rel=0.1)
    assert 0.10 < chloramine.amount_mol[1] < 0.13
    assert any("ammonia" in word for word in labels(chloramine))
    assert any("hypochlorite" in word for word in labels(chloramine))


def test_bleach_and_sodium_hydroxide() -> None:
    report = combined("100 mL of bleach", "100 mL of 2 M sodium hydroxide")
    assert report.verdict == "no objection", outline(report)
    assert report.steps[1].pH is not None
    assert report.steps[1].pH[0] > 13  # 0.2 mol of NaOH in 0.2 L


# --- what is not known -----------------------------------------------------------------------------------------


def test_unknown_acid_of_pH_2_frees_hydrogen_cyanide() -> None:
    # free acid of pH 2: 0.01 mol/L over the activity coefficient (0.90 at I = 0.011) = 0.011 mol in 1 L,
    # against 0.1 mol of cyanide:
    # at least 0.011 mol of HCN from the pH alone; with a reserve, up to all of the cyanide
    report = combined("1 L of unknown, pH 2", "1 L of 0.1 M potassium cyanide")
    gas = only(report, "toxic-gas", "HCN")
    assert report.verdict == "refuse"
    assert gas.signal == "danger"
    assert gas.holds == "throughout"
    assert gas.amount_mol is not None
    assert gas.amount_mol[0] == pytest.approx(0.011, rel=0.05)
    assert 0.09 < gas.amount_mol[1] <= 0.1
    assert report.unrecognised == ["unknown"]
    assert any("unknown, pH 2" in line for line in report.questions)


def test_unknown_name_cannot_be_judged() -> None:
    report = combined("100 mL of flurbium nitrate", "10 mL of water")
    assert report.verdict == "cannot say"
    assert report.unrecognised == ["flurbium nitrate"]


def test_unknown_name_on_the_command_line() -> None:
    done = command("combine", "100 mL of flurbium nitrate", "10 mL of water", "--json")
    assert done.returncode == 3
    assert json.loads(done.stdout)["unrecognised"] == ["flurbium nitrate"]


def test_wrong_unit_on_the_command_line_is_marked() -> None:
    done = command("combine", "100 mm of acetone", "10 mL of water")
    assert done.returncode == 2
    assert done.stdout == ""
    lines = done.stderr.splitlines()
    shown = next(number for number, line in enumerate(lines) if "100 mm of acetone" in line)
    caret = lines[shown + 1]
    assert lines[shown][caret.index("^") : caret.rindex("^") + 1] == "mm"
    assert "Traceback" not in done.stderr


def test_wrong_unit_in_python() -> None:
    with pytest.raises(InputError) as caught:
        combine("100 mm of acetone", "10 mL of water")
    span = caught.value.span
    assert span is not None
    assert "mL" in caught.value.suggestions


def test_dangerous_and_harmless_exit_status() -> None:
    assert command("combine", BLEACH, MURIATIC, "--json").returncode == 1
    assert command("combine", "100 mL of bleach", "100 mL of 2 M sodium hydroxide", "--json").returncode == 0


# --- zinc ------------------------------------------------------------------------------------------------------

ZINC, DILUTE_ACID = "5 g of zinc powder", "200 mL of 2 M hydrochloric acid"


def test_hydrogen_from_zinc() -> None:
    # 5 g / 65.38 = 0.07648 mol; acid 0.4 mol against 0.153 needed: H2 0.07648 mol
    report = combined(ZINC, DILUTE_ACID)
    hydrogen = only(report, "flammable-gas", "H2")
    assert hydrogen.amount_mol == pytest.approx((0.07648, 0.07648), rel=2e-3)
    # 0.0765 x 24.465 L at 4 vol %: 46.8 L of air at the lower limit, so a warning (10 L to 1 m3)
    assert measure(hydrogen, "air brought") == pytest.approx(0.0468, rel=0.01)
    assert hydrogen.signal == "warning"
    assert report.verdict == "conditional"
    assert step_value(report, 2, "dissolved_mol", "Zn") == pytest.approx((0.07648, 0.07648), rel=2e-3)
    assert any("zinc" in word for word in labels(hydrogen))


def test_heat_of_zinc_in_acid() -> None:
    # Zn + 2 H+ -> Zn2+ + H2: formation enthalpy of Zn2+(aq) -153.9 kJ/mol (CRC). 0.0765 mol x 153.9 = 11.8 kJ
    # at infinite dilution;
    # in 2 M chloride about 10 kJ/mol less, since NBS gives ZnCl2 in 50 H2O some 10 kJ/mol above that in
    # infinitely much: 10.6 to 11.8 kJ.
    heat = only(combined(ZINC, DILUTE_ACID), "heat")
    assert measure(heat, "heat set free") == pytest.approx(11.0, rel=0.10)
    assert heat.signal in ("warning", "danger")


# --- sulfuric acid and water -----------------------------------------------------------------------------------

OIL_OF_VITRIOL, WATER = "20 mL of 96 % sulfuric acid", "200 mL of water"


def test_the_order_of_sulfuric_acid_and_water_matters() -> None:
    wrong, right = combined(OIL_OF_VITRIOL, WATER), combined(WATER, OIL_OF_VITRIOL)
    spatter = only(wrong, "heat", order="as written")
    calm = only(right, "heat", order="as written")
    assert spatter.signal == "danger"
    assert calm.signal == "warning"
    assert spatter.fractions[0] < 0.1  # at the first drops
    assert measure(spatter, "temperature reached") > 100
    assert "boils" in spatter.summary
    assert any("other order" in line for line in spatter.controls)
    # what the right order must not be told: that it is the dangerous one
    assert all(one.order == "other order" for one in right.findings if one.signal == "danger")
    assert right.verdict == "conditional"


def test_heat_of_diluting_sulfuric_acid() -> None:
    # 20 mL x 1.8355 g/mL x 0.96 / 98.08 = 0.3593 mol, with 0.227 H2O each; 11.06 mol of water more: 31.0 H2O each.
    # Integral heats of solution, NBS tables (J. Phys. Chem. Ref. Data 11 suppl. 2): 0.227 H2O about 7.6 kJ/mol,
    # 31 H2O about 72.2 kJ/mol:
    # 64.6 kJ/mol x 0.3593 mol = 23.2 kJ
    heat = only(combined(WATER, OIL_OF_VITRIOL), "heat", order="as written")
    assert measure(heat, "heat set free") == pytest.approx(23.2, rel=0.05)
    # 236 g of 15 % acid, 3.6 J/(g K): 850 J/K: 27.3 K
    assert measure(heat, "warming without loss") == pytest.approx(27.3, rel=0.06)
