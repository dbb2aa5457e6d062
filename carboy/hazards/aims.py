"""Findings on aims that are missed and checks that fail, with the reasons."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from carboy.bench.trace import StepTrace
from carboy.bench.walk import Walk
from carboy.chemistry.mixture import Mixture
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.hazards.draft import NOTE, WARNING, Draft, Scale, graded
from carboy.hazards.flagged import name_of
from carboy.hazards.goals import Judged, goal_value, leached_value, within
from carboy.hazards.judge import Judge
from carboy.hazards.numbers import figures
from carboy.hazards.shortfall import Cause, causes_of
from carboy.model.plan import Check, Goal
from carboy.model.report import Finding, Measure
from carboy.reasoning.equation import formation_equation
from carboy.reasoning.firing import Firing
from carboy.text.formulas import elements

_SPENT = 0.02  # of what is left over: a reagent of which there is less than this is used up


def with_missed_aims(findings: list[Finding], judged: list[Judged], walk: Walk, judge: Judge) -> list[Finding]:
    """The findings, with one more for each aim that is missed and each check that fails; what is found already is given the reasons."""
    result = list(findings)
    for one in judged:
        if one.met is not None and not one.met.all():
            _missed(one, walk, judge, result)
    result += _failed_checks(walk, judge)
    return result


def _missed(one: Judged, walk: Walk, judge: Judge, findings: list[Finding]) -> None:
    assert one.values is not None
    assert one.met is not None
    assert one.content is not None
    assert one.vessel is not None
    trace = _last_trace(walk, one.vessel.spec.name)
    if trace is None:
        return
    stock = judge.stock
    lane = int(np.argmax(np.where(one.met, -np.inf, np.abs(one.values))))
    content = one.content.take(np.array([lane]))
    tokens = _tokens(one.goal, content, stock)
    reasons = list(_reasons(one, content, float(one.values[lane]), tokens, walk, stock))
    draft = _draft(one, lane, content, tokens, trace, stock, Scale(stock.index))
    words = " ".join(cause.words for cause in reasons)
    finding = judge.finding_of(draft, walk.record)
    finding.says = words
    finding.controls = [cause.control for cause in reasons if cause.control]
    same = [
        other
        for other in findings
        if (other.kind, other.step, other.vessel, other.species)
        == (finding.kind, finding.step, finding.vessel, finding.species)
    ]
    if not same:
        findings.append(finding)
        return
    twin = same[0]
    if words and words not in twin.says:
        twin.says = f"{twin.says} {words}".strip()
    twin.controls += [control for control in finding.controls if control not in twin.controls]
    twin.measures += [
        measure for measure in finding.measures if measure.quantity not in {m.quantity for m in twin.measures}
    ]
    graver = {"note": 0, "warning": 1, "danger": 2}
    if graver[finding.signal] > graver[twin.signal]:
        twin.signal, twin.summary, twin.holds = finding.signal, finding.summary, finding.holds


def _last_trace(walk: Walk, vessel: str) -> StepTrace | None:
    """The last step that touched a vessel, or that filled it as the cake of a filter."""
    own = [trace for trace in walk.steps if trace.vessel == vessel and _changes(trace)]
    if own:
        return own[-1]
    filtered = next((trace for trace in reversed(walk.steps) if trace.sludge is not None), None)
    return None if filtered is None else replace(filtered, vessel=vessel)


def _changes(trace: StepTrace) -> bool:
    return trace.path is not None or trace.storage is not None or trace.sludge is not None


def _tokens(goal: Goal, content: Mixture, stock: ChemicalStock) -> tuple[str, ...]:
    """What in the vessel the goal speaks of, the most of it first."""
    found = []
    for token in content.amounts:
        record = stock.index.species.get(token)
        if record is None or token in (PROTON, WATER):
            continue
        if goal.subject.startswith("class:"):
            belongs = goal.subject.removeprefix("class:") in stock.classes.get(token, ())
        elif goal.subject:
            belongs = goal.subject in (record.report_key, record.report_key.split("(")[0])
        else:
            belongs = any(
                limit.kind == goal.limit and limit.subject in (record.report_key, record.report_key.split("(")[0])
                for limit in stock.index.limits
            )
        if belongs and float(content.total(token)[0]) > 0:
            found.append(token)
    return tuple(sorted(found, key=lambda token: -float(content.dissolved(token)[0])))


def _draft(
    one: Judged,
    lane: int,
    content: Mixture,
    tokens: tuple[str, ...],
    trace: StepTrace,
    stock: ChemicalStock,
    scale: Scale,
) -> Draft:
    assert one.values is not None
    assert one.met is not None
    goal, value = one.goal, float(one.values[lane])
    levels = np.where(one.met, 0, WARNING)
    if goal.high is not None and goal.quantity != "pH":
        factor = scale["remobilised-danger-factor"]
        levels = np.where(one.met, 0, np.maximum(graded(one.values, goal.high, goal.high, factor * goal.high), WARNING))
    if goal.quantity in ("residual", "leached"):
        # what a rest may do is told by the findings of the steps that meet it; a cake that leaches goes as hazardous waste
        levels = np.minimum(levels, WARNING)
    unit = "" if one.unit == "pH" else f" {one.unit}"
    wanted = _window_words(goal, unit)
    measures = [
        Measure(quantity=goal.text, value=value, unit=one.unit, basis="equilibrium at the end of the procedure")
    ]
    if goal.limit:
        measures.append(
            Measure(
                quantity="limit",
                value=goal.high if goal.high is not None else goal.low,
                unit=one.unit,
                basis=goal.limit.replace("-", " "),
            )
        )
    equations = []
    main = ""
    if tokens and goal.quantity != "pH":
        forms = [
            (float(amount[0]), name)
            for name, amount in content.aqueous.items()
            if stock.components_of(name).get(tokens[0], 0.0) > 0
        ]
        main = max(forms)[1] if forms and max(forms)[0] > 0 else tokens[0]
        if main in stock.index.species:
            equation, left, right = formation_equation(stock, main)
            equations = [("equilibrium", equation, left, right)]
    return Draft(
        "incomplete",
        (tokens[0],) if tokens and goal.quantity != "pH" else (),
        levels[:, None],
        np.ones(1),
        "path",
        trace,
        f"The aim '{goal.text}' is missed: it comes to {figures(value)}{unit}, and {wanted} is wanted.",
        None,
        measures,
        sources=sorted({limit.value.source for limit in stock.index.limits if limit.kind == goal.limit}),
        equations=equations,
        lane=lane,
    )


def _window_words(goal: Goal, unit: str) -> str:
    if goal.low is not None and goal.high is not None:
        return f"{figures(goal.low)} to {figures(goal.high)}{unit}"
    if goal.low is not None:
        return f"at least {figures(goal.low)}{unit}"
    return f"at most {figures(goal.high or 0.0)}{unit}"


# --- reasons


def _reasons(
    one: Judged, content: Mixture, value: float, tokens: tuple[str, ...], walk: Walk, stock: ChemicalStock
) -> Iterator[Cause]:
    goal = one.goal
    if goal.quantity == "pH":
        yield _pH_reason(goal, value)
        return
    if goal.high is None or not tokens:
        return
    if goal.quantity == "residual" or _is_destroyed(tokens[0], stock):
        yield from _left_over(tokens[0], content, walk, stock)
        return
    if goal.quantity == "leached":
        yield Cause(
            f"The extract has a pH of {figures(float(content.pH[0]))} and takes up what such a pH dissolves of the cake.",
            "A sulfide holds most metals against this extract where a hydroxide or carbonate does not; or have the cake stabilised.",
        )
        return
    if goal.quantity == "total":
        dissolved = goal.model_copy(update={"quantity": "dissolved"})
        if bool(within(dissolved, goal_value(dissolved, content, stock)[0]).all()):
            yield Cause(
                "What is dissolved is below the limit: the rest is solid and still in the vessel.",
                "Let it settle and filter it off.",
            )
            return
    yield from causes_of(content, tokens, goal.high, lambda trial: _value(goal, trial, stock), stock)


def _value(goal: Goal, trial: Mixture, stock: ChemicalStock) -> np.ndarray:
    dissolved = goal.model_copy(update={"quantity": "dissolved"})
    return (leached_value(dissolved, trial, stock) if not goal.subject else goal_value(dissolved, trial, stock))[0]


def _pH_reason(goal: Goal, value: float) -> Cause:
    if goal.high is not None and value > goal.high:
        return Cause(f"Too much base, or too little acid: the pH of {figures(value)} is above the window.")
    return Cause(f"Too little base, or too much acid: the pH of {figures(value)} is below the window.")


def _is_destroyed(token: str, stock: ChemicalStock) -> bool:
    """Whether a thing is to be destroyed (cyanide, sulfide, an oxidiser) and not to come down: no element of which limits are set."""
    record = stock.species(token)
    element = record.report_key.split("(")[0]
    return record.charge <= 0 and not any(
        limit.subject == element for limit in stock.index.limits if element in elements()
    )


def _firings(walk: Walk) -> Iterator[Firing]:
    for trace in walk.steps:
        for course in (trace.path, trace.storage):
            if course is not None:
                yield from course.firings


def _used_up_by(token: str, walk: Walk) -> list[Firing]:
    """The firings that took a component, or a species made of it, away."""
    return [
        firing
        for firing in _firings(walk)
        if any(name == token for name, _ in firing.reaction.reactants) and float(firing.extent.max()) > 0
    ]


def _left_over(token: str, content: Mixture, walk: Walk, stock: ChemicalStock) -> Iterator[Cause]:
    """Why something is not destroyed."""
    name = name_of(token, stock)
    left = float(content.dissolved(token)[0])
    shown = f"{figures(1000 * left)} mmol of {name} is left"
    for firing in reversed(_used_up_by(token, walk)):
        for partner, _ in firing.reaction.reactants:
            if partner in (token, PROTON, WATER) or partner not in stock.index.species:
                continue
            if float(content.amount_of(partner)[0]) < _SPENT * left:
                yield Cause(
                    f"Too little reagent: {shown}, and the {name_of(partner, stock)} that takes it away is used up.",
                    f"Add more {name_of(partner, stock)} in small portions, under the same conditions, and test for what is left.",
                )
                return
        yield Cause(
            f"{shown}, beside what would take it away: the conditions for it (pH, time, warmth) do not hold to the end.",
            "Bring the pH and the time to what the treatment asks for, and test for what is left.",
        )
        return
    pH = float(content.pH[0])
    where = f" at pH {figures(pH)}" if np.isfinite(pH) else ""
    yield Cause(f"{shown}: nothing that takes it away was added, or it does not act{where}.")


# --- checks


def _failed_checks(walk: Walk, judge: Judge) -> Iterator[Finding]:
    for number, step in enumerate(walk.case.steps, start=1):
        if isinstance(step, Check) and (draft := _failed_check(number, step, walk, judge.stock)) is not None:
            yield judge.finding_of(draft, walk.record)


def _failed_check(number: int, step: Check, walk: Walk, stock: ChemicalStock) -> Draft | None:
    trace = walk.trace_of(number)
    content = trace.after
    if not content.amounts or not np.all(content.converged):
        return None
    word, _, subject = step.quantity.partition(" ")
    if word == "temperature":
        values, unit = content.temperature_C, "degC"
    else:
        goal = Goal(
            text=step.text,
            quantity=word,  # type: ignore[arg-type]
            subject=subject,
            low=step.low,
            high=step.high,
            unit=step.unit,
        )
        values, unit = goal_value(goal, content, stock)
        unit = "" if unit == "pH" else unit
    inside = np.ones(len(values), dtype=bool)
    if step.low is not None:
        inside &= values >= step.low
    if step.high is not None:
        inside &= values <= step.high
    if inside.all() or not np.isfinite(values).all():
        return None
    lane = int(np.argmin(inside))
    never = not inside.any()
    how = "fails" if never else "may fail, within the stated ranges"
    text = step.text or step.quantity
    return Draft(
        "incomplete",
        (),
        np.where(inside, 0, WARNING if never else NOTE)[:, None],
        np.ones(1),
        "path",
        trace,
        f"The check '{text}' {how}: it comes to {figures(float(values[lane]))} {unit}".rstrip()
        + (". The procedure cannot go on from here as written." if never else "."),
        None,
        [Measure(quantity=text, value=float(values[lane]), unit=unit, basis="computed for this step")],
        controls=["Do not go on before the check holds; find out why it does not."],
        lane=lane,
    )
