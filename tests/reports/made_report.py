"""A report made by hand, with one of everything that a renderer must show."""

from __future__ import annotations

from carboy.model.knowledge import Source
from carboy.model.report import Finding, GoalReport, Measure, PathStep, Report, StepReport

SOURCES = {
    "mendel-2001": Source("mendel-2001", "Mendel F. Gases over waste. Tarn, 2001."),
    "long-one": Source(
        "long-one", "A title that goes on and on about the gases over waste and what is known of them, " * 3
    ),
}


def step(rule: str, equation: str, start: list[str], end: list[str], number: int) -> PathStep:
    return PathStep(rule=rule, equation=equation, from_=start, to=end, step=number)


ACID = step("label", "HCl -> H+ + Cl-", ["1 L of 0.5 M HCl"], ["H+", "Cl-"], 2)
SULFIDE = step("label", "Na2S + H2O -> 2 Na+ + HS- + OH-", ["20 g of sodium sulfide"], ["Na+", "HS-", "OH-"], 1)
MEETING = step("acid-frees-sulfide", "HS- + H+ -> H2S", ["HS-", "H+"], ["H2S"], 2)


def finding(**given: object) -> Finding:
    """A danger of hydrogen sulfide; ``given`` replaces its fields."""
    fields: dict[str, object] = {
        "rule": "acid-frees-sulfide",
        "kind": "toxic-gas",
        "signal": "danger",
        "step": 2,
        "moment": "during",
        "fractions": (0.25, 1.0),
        "holds": "throughout",
        "species": ["H2S"],
        "amount_mol": (0.1, 0.1),
        "summary": "Hydrogen sulfide is set free: 0.1 mol.",
        "says": "Acid turns HS- into a gas that dulls the sense of smell.",
        "path": [SULFIDE, ACID, MEETING],
        "measures": [Measure(quantity="air brought to the IDLH", value=24.5, unit="m3", basis="IDLH 100 ppm")],
        "controls": ["Keep the sulfide above pH 10."],
        "sources": ["mendel-2001"],
        "rules": ["acid-frees-sulfide"],
        "order": "either order",
    }
    return Finding.model_validate({**fields, **given})


def report(**given: object) -> Report:
    """A refused combination of two bottles; ``given`` replaces its fields."""
    fields: dict[str, object] = {
        "title": "20 g of sodium sulfide + 1 L of 0.5 M HCl",
        "verdict": "refuse",
        "findings": [finding()],
        "steps": [
            StepReport(
                step=1, action="add 20 g of sodium sulfide", vessel="vessel", pH=None, temperature_C=(25, 25), gauge_kPa=(0, 0), volume_L=0.02
            ),
            StepReport(
                step=2, action="add 1 L of 0.5 M HCl", vessel="vessel", pH=(0.951, 0.951), temperature_C=(26.04, 26.04), gauge_kPa=(0, 0),
                volume_L=(1.02, 1.02), dissolved_mol={"S": (0.1, 0.1), "S(-II)": (0.1, 0.1), "Na": (0.2, 0.2)}, gas_mol={"H2S": (0.05, 0.06)},
            ),
        ],
        "assumptions": ["The chemistry is that of 25 degC."],
        "cautions": ["This is a screening aid, not a permit."],
    }  # fmt: skip
    return Report.model_validate({**fields, **given})


def goal(met: bool | None) -> GoalReport:
    return GoalReport(
        goal="dissolved mercury in jug below 0.2 mg/L", met=met, value=None if met is None else (0.01, 0.5), unit="mg/L"
    )
