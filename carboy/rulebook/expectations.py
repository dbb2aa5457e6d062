"""The ``expect`` block of a case held against its report."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

from carboy.model.plan import Case, Expectation
from carboy.model.report import Finding, Pair, Report, StepReport

_OTHER_ORDER = "other order"
_FINDING_FIELDS = ("kind", "species", "signal", "moment", "rule")


@dataclass(frozen=True, slots=True)
class Failure:
    """An expectation that does not hold, and why, in one sentence."""

    expectation: Expectation
    reason: str

    @property
    def text(self) -> str:
        """The expectation in words."""
        return expectation_text(self.expectation)


def check_expectations(report: Report, case: Case) -> list[Failure]:
    """What of ``case.expect`` the report does not bear out, in the order of the file.

    A finding matches if every field that is given fits (``rule``: any rule that supports it); ``absent`` asks that none
    does, whatever its signal unless one is given. A number must lie within its window over the whole of the stated
    ranges; without ``step`` it is that of the last step. An expectation with ``known_failure`` must fail: that it
    passes is a failure too.
    """
    failures = []
    for one in case.expect:
        reason = next(_reasons(report, one), "")
        if one.known_failure:
            if not reason:
                failures.append(
                    Failure(
                        one, f"it is marked as a known failure ({one.known_failure}) but holds now; take the mark away"
                    )
                )
        elif reason:
            failures.append(Failure(one, reason))
    return failures


def expectation_text(one: Expectation) -> str:
    """``step 4, toxic-gas, absent``."""
    parts = [f"step {one.step}"] if one.step is not None else []
    parts += [value for value in (one.kind, one.species, one.signal, one.moment, one.rule) if value]
    parts += [f"verdict {one.verdict}"] if one.verdict else []
    parts += [f"{one.quantity} {_window(one)}"] if one.quantity else []
    parts += [f"'{one.goal}' {'met' if one.met else 'not met'}"] if one.goal else []
    parts += [f"the words '{one.words}'"] if one.words else []
    return ", ".join(parts) + (" absent" if one.absent else "")


def _reasons(report: Report, one: Expectation) -> Iterator[str]:
    """Why it does not hold, the first reason first."""
    if one.verdict and report.verdict != one.verdict:
        yield f"the verdict is {report.verdict}"
    if one.goal:
        yield from _goal(report, one)
    about_findings = any(getattr(one, field) for field in _FINDING_FIELDS)
    matching = [finding for finding in report.findings if _fits(finding, one)]
    if about_findings:
        if one.absent and matching and not one.words:
            yield f"there is '{matching[0].summary}'"
        elif not one.absent and not matching:
            yield _what_there_is(report, one)
    if one.words:
        yield from _words(report, one, matching if about_findings else None)
    if one.quantity == "amount_mol":
        amounts = [finding.amount_mol for finding in matching if finding.amount_mol is not None]
        if not amounts:
            yield "no such finding has an amount"
        for amount in amounts[:1]:
            yield from _outside(amount, one)
    elif one.quantity:
        yield from _number(report, one)


def _fits(finding: Finding, one: Expectation) -> bool:
    return (
        finding.order != _OTHER_ORDER
        and (one.step is None or finding.step == one.step)
        and (not one.kind or finding.kind == one.kind)
        and (not one.species or one.species in finding.species)
        and (not one.signal or finding.signal == one.signal)
        and (not one.moment or finding.moment == one.moment)
        and (not one.rule or one.rule == finding.rule or one.rule in finding.rules)
    )


def _what_there_is(report: Report, one: Expectation) -> str:
    """What comes nearest to a finding that is missing."""
    same = [f for f in report.findings if (not one.kind or f.kind == one.kind) and f.order != _OTHER_ORDER]
    at_step = [f for f in report.findings if one.step is not None and f.step == one.step and f.order != _OTHER_ORDER]
    for label, found in (("of that kind there is", same), (f"in step {one.step} there is", at_step)):
        if found:
            listed = "; ".join(
                f"step {f.step} {f.signal} {f.kind} {', '.join(f.species)} {f.moment}".strip() for f in found[:3]
            )
            return f"there is no such finding; {label} {listed}"
    return "there is no such finding"


def _goal(report: Report, one: Expectation) -> Iterator[str]:
    goals = [goal for goal in report.goals if goal.goal == one.goal]
    if not goals:
        yield "the report has no such goal"
    for goal in goals:
        if goal.met is not one.met:
            state = {True: "met", False: "not met", None: "open"}[goal.met]
            figures = f" ({_figures(goal.value)} {goal.unit})" if goal.value is not None else ""
            yield f"the goal is {state}{figures}"


def _words(report: Report, one: Expectation, findings: list[Finding] | None) -> Iterator[str]:
    """Words are looked for in what a person reads: of the findings that fit, or of the whole report."""
    judged = report.findings if findings is None else findings
    texts = [text for finding in judged for text in (finding.summary, finding.says, *finding.controls)]
    if findings is None:
        texts += [*report.assumptions, *report.questions, *report.unrecognised]
    there = any(one.words.lower() in text.lower() for text in texts)
    if there == one.absent:
        yield "the words are there" if there else "the words are nowhere in it"


def _number(report: Report, one: Expectation) -> Iterator[str]:
    if not report.steps:
        yield "the report has no steps"
        return
    steps = [step for step in report.steps if one.step is None or step.step == one.step]
    if not steps:
        yield f"the report has no step {one.step}"
        return
    values = _of_step(steps[-1], one.quantity)
    if values is None:
        yield f"step {steps[-1].step} has no {one.quantity}"
    else:
        yield from _outside(values, one)


def _of_step(step: StepReport, quantity: str) -> Pair | None:
    """The range of a number of a step; an amount that is not listed is 0."""
    name, _, key = quantity.partition(" ")
    value = getattr(step, name)
    if isinstance(value, dict):
        return value.get(key, (0.0, 0.0))
    return (value, value) if isinstance(value, float | int) else value


def _outside(values: Pair, one: Expectation) -> Iterator[str]:
    low = -math.inf if one.low is None else one.low
    high = math.inf if one.high is None else one.high
    if not (low <= values[0] and values[1] <= high):
        yield f"{one.quantity} is {_figures(values)}"


def _window(one: Expectation) -> str:
    if one.low is not None and one.high is not None:
        return f"between {one.low:g} and {one.high:g}"
    return f"above {one.low:g}" if one.low is not None else f"below {one.high:g}"


def _figures(values: Pair) -> str:
    return f"{values[0]:.4g}" if values[0] == values[1] else f"{values[0]:.4g} to {values[1]:.4g}"
