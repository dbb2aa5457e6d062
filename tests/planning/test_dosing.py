"""Doses against published worked figures, and against the engine asked a second time about each end of the window."""

from __future__ import annotations

import json

import pytest
from typer.testing import CliRunner

import carboy
from carboy.cli.main import application
from carboy.errors import InputError
from carboy.knowledge.index import load_index
from carboy.model.dosing import DoseReport
from carboy.text.formulas import molar_mass, parse_formula

MERCURY = "4 L of (0.02 M mercury(II) nitrate + 0.5 M sodium bicarbonate)"
SULFIDE = "0.5 M sodium sulfide"
MERCURY_AIM = "dissolved mercury below 0.2 mg/L"


def grams(formula: str) -> float:
    return molar_mass(parse_formula(formula).atoms)


@pytest.fixture(scope="module")
def mercury() -> DoseReport:
    return carboy.dose(MERCURY, SULFIDE, MERCURY_AIM)


def least_mol(report: DoseReport, substance: str) -> float:
    """mol of a substance in the least dose, nominal."""
    assert report.dose is not None
    assert report.window is not None
    low, high = report.dose.holds_mol[substance]
    return 0.5 * (low + high) * report.window.least / report.dose.amount


# --- published figures -----------------------------------------------------------------------------------------------


def test_mercury_needs_one_sulfide_and_gives_its_weight_in_sulfide(mercury: DoseReport) -> None:
    # Hg2+ + S2- -> HgS, 1:1; 232.66 / 200.59 = 1.160 g of HgS per g of mercury (IUPAC atomic weights)
    assert least_mol(mercury, "sodium sulfide") == pytest.approx(4 * 0.02, rel=0.01)
    solid = mercury.steps[-1].solids_mol["HgS"]
    assert solid == pytest.approx((0.08, 0.08), rel=1e-3)
    assert solid[0] * grams("HgS") / (0.08 * grams("Hg")) == pytest.approx(1.160, abs=0.001)


def test_bicarbonate_for_an_acid() -> None:
    # HCl + NaHCO3 -> NaCl + H2O + CO2: 84.007 g/mol, so 0.084 g for each mmol of acid; at pH 4 a carbonic acid
    # of pKa 6.35 keeps less than half a per cent of its carbonate as bicarbonate
    report = carboy.dose("2 L of 0.25 M hydrochloric acid", "sodium bicarbonate", "pH above 4")
    assert report.window is not None
    assert report.unit == "g"
    assert report.window.least / 500 == pytest.approx(0.084, rel=0.01)


def test_bisulfite_for_chromate() -> None:
    # Cr2O7-2 + 3 HSO3- + 5 H+ -> 2 Cr+3 + 3 SO4-2 + 4 H2O (Patterson, Industrial Wastewater Treatment Technology, from
    # memory): 3 bisulfite to 2 chromium(VI). 2 L x 0.005 M x 2 = 0.020 mol of chromium, 0.030 mol of bisulfite
    report = carboy.dose(
        "2 L of (0.005 M potassium dichromate + 0.05 M sulfuric acid)",
        "0.5 M sodium bisulfite",
        "dissolved chromium(VI) below 0.1 mg/L",
    )
    assert least_mol(report, "sodium hydrogensulfite") == pytest.approx(0.030, rel=0.01)


def test_chlorine_for_cyanide_to_cyanate() -> None:
    # CN- + OCl- -> OCN- + Cl-: 70.90 / 26.02 = 2.73 g of chlorine to a gram of cyanide (EPA, Managing Cyanide in Metal
    # Finishing, 2000, from memory). 5 L x 0.02 M = 0.1 mol, 2.602 g of cyanide
    report = carboy.dose(
        "5 L of (0.02 M sodium cyanide + 0.1 M sodium hydroxide)",
        "6 % sodium hypochlorite",
        "dissolved cyanide below 0.2 mg/L",
    )
    chlorine = least_mol(report, "sodium hypochlorite") * grams("Cl2")
    assert chlorine / (0.1 * grams("CN")) == pytest.approx(2.73, rel=0.01)


def test_chlorine_for_cyanide_to_nitrogen() -> None:
    # 2 OCN- + 3 OCl- + 2 OH- -> N2 + 2 CO3-2 + 3 Cl- + H2O: 1.5 x 70.90 / 26.02 = 4.09 g of chlorine to a gram of what was
    # cyanide, 6.82 g with the first stage (EPA, Managing Cyanide in Metal Finishing, 2000, from memory)
    report = carboy.dose(
        "1 L of (0.1 M sodium cyanate + 1 M sodium bicarbonate)",
        "6 % sodium hypochlorite",
        "dissolved cyanate below 10 mg/L",
    )
    chlorine = least_mol(report, "sodium hypochlorite") * grams("Cl2")
    assert chlorine / (0.1 * grams("CN")) + 2.73 == pytest.approx(6.82, rel=0.01)


def test_zinc_by_hydroxide_has_a_window_and_by_sulfide_stays_far_lower() -> None:
    # Zinc hydroxide is amphoteric. Theoretical solubilities of EPA 625/8-80-003, sulfide precipitation (from memory):
    # hydroxide about 1 mg/L in water and some tenths at its best pH of 9 to 10, sulfide 2e-7 mg/L
    hydroxide = carboy.dose("1 L of 0.02 M zinc sulfate", "1 M sodium hydroxide", "dissolved zinc below 2.61 mg/L")
    assert hydroxide.window is not None
    assert hydroxide.window.upper_end == "aim"
    assert "Zn(OH)" in hydroxide.window.upper_words
    # Zn2+ + 2 OH-: at least 0.04 mol less what a basic salt or the last tenths may spare; 1 mol/L
    assert 0.028 <= hydroxide.window.least <= 0.0402
    best = min(value for value in hydroxide.curve.aim if value is not None)
    assert 0.01 < best < 2.6
    places = [place for place, value in enumerate(hydroxide.curve.aim) if value == best]
    assert 8.5 < (hydroxide.curve.pH[places[0]] or 0) < 10.5
    sulfide = carboy.dose("1 L of 0.02 M zinc sulfate", "0.1 M sodium sulfide", "dissolved zinc below 2.61 mg/L")
    # fresh zinc sulfide is far more soluble than the aged one of the table, and still two powers of ten below the hydroxide
    assert min(value for value in sulfide.curve.aim if value is not None) < 1e-2 * best


# --- the window, asked a second time ---------------------------------------------------------------------------------


def dissolved_mercury(litres: float) -> float:
    """mg/L by a call of its own."""
    report = carboy.combine(MERCURY, f"{litres:.6f} L of {SULFIDE}")
    volume = report.steps[1].volume_L
    assert isinstance(volume, tuple)
    return report.steps[1].dissolved_mol["Hg"][1] * grams("Hg") * 1000 / volume[0]


def test_both_ends_of_the_window_hold_by_themselves(mercury: DoseReport) -> None:
    window, dose = mercury.window, mercury.dose
    assert window is not None
    assert window.most is not None
    assert dose is not None
    assert window.least < dose.amount < window.most
    assert dissolved_mercury(window.least * 0.98) > 0.2
    assert dissolved_mercury(window.least * 1.01) < 0.2
    assert dissolved_mercury(dose.amount) < 0.2
    assert dissolved_mercury(window.most * 0.99) < 0.2
    assert dissolved_mercury(window.most * 1.03) > 0.2
    assert window.upper_end == "aim"
    assert "HgS2-2" in window.upper_words


def test_curve_is_that_of_the_engine(mercury: DoseReport) -> None:
    curve = mercury.curve
    lengths = {len(curve.dose), len(curve.aim), len(curve.pH), len(curve.danger), len(curve.dissolved_mg_L["Hg"])}
    assert lengths == {len(curve.dose)}
    assert curve.dose == sorted(curve.dose)
    assert curve.aim_unit == "mg/L"
    assert set(curve.gas_mol) >= {"H2S", "CO2"}
    assert all(len(amounts) == len(curve.dose) for amounts in curve.gas_mol.values())
    for place in range(0, len(curve.dose), 20):
        assert curve.aim[place] == pytest.approx(dissolved_mercury(curve.dose[place]), rel=0.02, abs=1e-9)


def test_danger_ends_the_window() -> None:
    # nothing takes the acid up: each mol of sulfide beyond the mercury is a mol of hydrogen sulfide
    report = carboy.dose("1 L of (0.02 M mercury(II) nitrate + 0.5 M nitric acid)", SULFIDE, MERCURY_AIM)
    assert report.window is not None
    assert report.window.upper_end == "danger"
    assert report.window.most is not None
    assert "ydrogen sulfide" in report.window.upper_words
    more = carboy.combine(
        "1 L of (0.02 M mercury(II) nitrate + 0.5 M nitric acid)", f"{report.window.most * 1.1:.5f} L of {SULFIDE}"
    )
    assert any(one.kind == "toxic-gas" and one.signal == "danger" for one in more.findings)
    assert report.verdict == "conditional"
    assert "bleach on the filtrate" not in [test.name for test in report.spot_tests]
    assert any("bleach on the filtrate" in line for line in report.assumptions)


def test_no_safe_dose_is_refused_with_the_danger_named() -> None:
    report = carboy.dose(
        "1 L of (0.05 M lead nitrate + 1 M nitric acid)", "0.5 M sodium sulfide", "dissolved lead below 0.01 mg/L"
    )
    assert report.verdict == "refuse"
    assert report.window is None
    assert "ydrogen sulfide" in report.summary or "No dose" in report.summary


def test_dose_that_foams_over_is_refused_with_the_danger_named() -> None:
    # 0.5 mol of acid gives 0.5 mol of carbon dioxide, 12 L, against one litre of free space
    report = carboy.dose("1 L of 0.5 M hydrochloric acid", "sodium bicarbonate", "pH between 6 and 9")
    assert report.window is not None
    assert report.verdict == "refuse"
    assert "refused" in report.summary
    assert "arbon dioxide" in report.summary


def test_window_narrower_than_a_measuring_cylinder_is_said() -> None:
    report = carboy.dose("1 L of 0.5 M hydrochloric acid", "1 M sodium hydroxide", "pH between 6 and 9")
    assert report.window is not None
    assert report.window.least == pytest.approx(0.5, rel=1e-3)  # 0.5 mol of acid, 1 mol/L
    assert report.verdict == "conditional"
    assert "narrower" in report.summary


# --- ranges ----------------------------------------------------------------------------------------------------------


def test_one_dose_for_a_range() -> None:
    # the stronger end needs 1 L x 0.02 M of sulfide; at the weaker end that is twice as much as needed, which is well
    # within the window
    report = carboy.dose("1 L of (0.01-0.02 M mercury(II) nitrate + 0.5 M sodium bicarbonate)", SULFIDE, MERCURY_AIM)
    assert report.tolerance.throughout
    assert report.window is not None
    assert report.window.least == pytest.approx(0.04, rel=0.01)
    assert report.tolerance.least == pytest.approx((0.02, 0.04), rel=0.01)
    assert len(report.tolerance.ranges) == 1


def test_no_one_dose_for_a_wide_range() -> None:
    report = carboy.dose("1 L of 10-50 g/L copper sulfate", "1 M sodium hydroxide", "dissolved copper below 2 mg/L")
    assert report.window is None
    assert report.nominal_window is not None
    assert not report.tolerance.throughout
    assert report.verdict in ("conditional", "refuse")
    assert report.tolerance.least is not None
    assert report.tolerance.least[1] == pytest.approx(5 * report.tolerance.least[0], rel=0.02)
    assert "measure first" in report.tolerance.words


# --- what there is nothing to dose for -------------------------------------------------------------------------------


def test_aim_that_is_met_needs_nothing() -> None:
    report = carboy.dose("1 L of 0.1 M sodium chloride", SULFIDE, "pH between 5 and 9")
    assert report.dose is None
    assert report.verdict == "no objection"


def test_aim_that_no_dose_meets() -> None:
    report = carboy.dose("1 L of 0.1 M sodium nitrate", SULFIDE, "dissolved nitrate below 0.001 mg/L")
    assert report.dose is None
    assert report.verdict == "refuse"
    assert "No dose" in report.summary


def test_most_at_hand_limits_the_search() -> None:
    report = carboy.dose(MERCURY, f"100 mL of {SULFIDE}", MERCURY_AIM)
    assert report.dose is None
    assert report.curve.dose[-1] <= 0.1 * (1 + 1e-9)


# --- tests at the bench ----------------------------------------------------------------------------------------------


def test_spot_tests_of_the_sulfide_treatment(mercury: DoseReport) -> None:
    names = [test.name for test in mercury.spot_tests]
    assert {"drop into fresh sulfide", "bleach on the filtrate", "lead acetate paper"} <= set(names)
    sources = load_index().sources
    for test in mercury.spot_tests:
        assert test.basis == "common practice"
        assert test.sources
        assert set(test.sources) <= set(sources)


def test_every_spot_test_says_how_it_is_read() -> None:
    index = load_index()
    assert len(index.spot_tests) >= 12
    for test in index.spot_tests:
        assert test.procedure.endswith(".")
        assert test.reading.endswith(".")
        assert set(test.sources) <= set(index.sources)


# --- wrong input, command line ---------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("waste", "reagent", "aim"),
    [
        ("4 L of", SULFIDE, MERCURY_AIM),
        (MERCURY, "", MERCURY_AIM),
        (MERCURY, "0.5 Q sodium sulfide", MERCURY_AIM),
        (MERCURY, "2 mol of sodium sulfide", MERCURY_AIM),
        (MERCURY, SULFIDE, "mercury gone"),
        (MERCURY, SULFIDE, "dissolved mercury in jug below 0.2 mg/L"),
    ],
)
def test_wrong_input_is_an_error_with_a_sentence(waste: str, reagent: str, aim: str) -> None:
    with pytest.raises(InputError) as caught:
        carboy.dose(waste, reagent, aim)
    assert len(caught.value.message) > 10


def test_error_in_a_reagent_is_shown_in_its_own_text() -> None:
    with pytest.raises(InputError) as caught:
        carboy.dose(MERCURY, "0.5 M sodium sulfide pH twelve", MERCURY_AIM)
    assert caught.value.span is not None
    assert caught.value.span.text == "0.5 M sodium sulfide pH twelve"


def test_command_line() -> None:
    runner = CliRunner()
    done = runner.invoke(application(), ["dose", MERCURY, "--with", SULFIDE, "--aim", MERCURY_AIM, "--json"])
    assert done.exit_code == 1  # hydrogen sulfide is a warning at pH 8
    told = json.loads(done.stdout)
    assert told["format"] == "carboy-dose/1"
    assert told["window"]["least"] == pytest.approx(0.16, rel=0.01)
    plain = runner.invoke(application(), ["dose", MERCURY, "--with", SULFIDE, "--aim", MERCURY_AIM, "--plain"])
    assert plain.stdout.isascii()
    assert max(map(len, plain.stdout.splitlines())) <= 100
    assert "When to stop" in plain.stdout


def test_exit_status_of_a_dose_without_objection_and_of_one_that_cannot_be_told() -> None:
    runner = CliRunner()
    clean = ["1 L of 0.02 M zinc sulfate", "--with", "1 M sodium hydroxide", "--aim", "dissolved zinc below 2.61 mg/L"]
    assert runner.invoke(application(), ["dose", *clean]).exit_code == 0
    unknown = ["1 L of 0.02 M flurbium nitrate", "--with", "1 M sodium hydroxide", "--aim", "pH above 9"]
    assert runner.invoke(application(), ["dose", *unknown]).exit_code == 3
