"""The two calls: ``combine`` bottles, ``vet`` a written procedure. Both return a :class:`~carboy.model.report.Report`."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from functools import cached_property, lru_cache
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from carboy.bench.walk import Walk, Walker
from carboy.chemistry.mixture import Mixture
from carboy.chemistry.stock import WATER, ChemicalStock
from carboy.errors import InputError
from carboy.hazards.aims import with_missed_aims
from carboy.hazards.goals import goal_reports, judged_goals
from carboy.hazards.judge import SIGNAL_ORDER, Judge, in_order
from carboy.hazards.merging import merge_findings, wider_goal, wider_step
from carboy.hazards.numbers import figures
from carboy.hazards.steps import step_report
from carboy.knowledge.index import load_index
from carboy.knowledge.names import Names
from carboy.knowledge.unlisted import admit
from carboy.model.knowledge import Index
from carboy.model.plan import Case, Interval, Setting, VesselSpec
from carboy.model.report import Finding, GoalReport, Report, StepReport, Verdict
from carboy.model.rule import Rule
from carboy.reasoning.firing import Reactor
from carboy.rulebook.book import load_rules
from carboy.text.cases import combine_case, read_case

if TYPE_CHECKING:  # planning is brought in by the calls that plan: a check of two bottles goes without it
    from carboy.model.dosing import DoseReport
    from carboy.model.treatment import TreatReport
    from carboy.planning.repair import Mending

CAUTIONS = (
    "This is a screening aid, not a permit. Labels can be wrong, and what the tool does not find is not proof of safety.",
    "The safety data sheets, the rules of the site, local codes and a qualified person decide.",
    "Treating waste may need a permit; much of it leaves only by a licensed contractor.",
)
OTHER_ORDER = "Pour in the other order: vetted the same way, that clears this danger."

Progress = Callable[[int, int], None]
_LEAST_LEVERAGE = 0.05  # grades of severity: a number that moves less settles nothing


@dataclass
class Outcome:
    """What came of a case, before it becomes a report."""

    walk: Walk
    findings: list[Finding]
    leverage: dict[str, float]
    steps: list[StepReport]
    goals: list[GoalReport] = field(default_factory=list)


class Laboratory:
    """The graph, the rules and the engine over them, loaded once."""

    def __init__(self, index: Index | None = None, rules: tuple[Rule, ...] | None = None) -> None:
        self.index = load_index() if index is None else index
        self.rules = load_rules() if rules is None else rules

    @cached_property
    def names(self) -> Names:
        return Names(self.index)

    @cached_property
    def stock(self) -> ChemicalStock:
        return ChemicalStock(self.index)

    @cached_property
    def reactor(self) -> Reactor:
        return Reactor(self.rules, self.stock)

    @cached_property
    def least_reactor(self) -> Reactor:
        """As the reactor, but with the least conversion where a rule leaves it open."""
        return Reactor(self.rules, self.stock, least=True)

    @cached_property
    def judge(self) -> Judge:
        return Judge(self.stock, self.rules)

    def walk(
        self, case: Case, progress: Progress | None = None, *, left_standing: bool = False, least: bool = False
    ) -> Walk:
        """Carry out a case on the bench model; ``left_standing``: and leave the result for days; ``least``: with the least conversion where a
        rule leaves it open."""
        walker = Walker(self.stock, self.least_reactor if least else self.reactor, progress)
        walk = walker.walk(case)
        if left_standing:
            walk.aims = False
            walker.leave(walk)
        return walk

    def prepared(self, case: Case) -> tuple[Laboratory, Case, tuple[str, ...]]:
        """A case whose structures and unlisted salts are substances, the laboratory that has them, and what is to be said of them.

        Both are the same as before where everything is listed. Raises InputError for a structure that is none.
        """
        admitted = admit(case, self.index)
        lab = self if admitted.index is self.index else Laboratory(admitted.index, self.rules)
        return lab, admitted.case, admitted.notes

    def vet(
        self,
        case: Case,
        progress: Progress | None = None,
        *,
        hold_points: bool = False,
        follow: Sequence[str] = (),
    ) -> Report:
        """The report on a case; with ``hold_points``, which take as long again, what must be true before each step; ``follow``: symbols of
        elements whose every gram is to be accounted for."""
        lab, ready, notes = self.prepared(case)
        outcome = lab._outcome(ready, progress)
        report = lab._report(outcome, notes)
        if hold_points:
            from carboy.planning.hold_points import HoldPoints

            report.hold_points = HoldPoints(lab.judge, lab.reactor, lab.stock).of(outcome.walk)
        if follow:
            from carboy.planning.accounting import account

            report.accounts = [account(outcome.walk, element, lab.stock) for element in dict.fromkeys(follow)]
        return report

    def combine(
        self, portions: tuple[str, ...], setting: Setting | None = None, vessel: VesselSpec | None = None
    ) -> Report:
        """The report on portions poured together one after the other, and on the other order where there are two."""
        lab, case, notes = self.prepared(combine_case(portions, self.names, setting, vessel))
        outcome = lab._outcome(case, left_standing=True)
        if len(portions) == 2:
            _, swapped, _ = self.prepared(combine_case(portions[::-1], self.names, setting, vessel))
            turned = lab._outcome(swapped, left_standing=True)
            outcome.findings = compare_orders(outcome.findings, turned.findings)
        return lab._report(outcome, notes)

    def mend(self, case: Case, progress: Progress | None = None) -> list[Mending]:
        """Changed procedures that clear what is found on a case, each vetted, the one that changes least first."""
        from carboy.planning.repair import Mender

        lab, _, _ = self.prepared(case)
        return Mender(lab, self.vet, self._walk_prepared, progress).mend(case)

    def mend_together(
        self,
        portions: tuple[str, ...],
        setting: Setting | None = None,
        vessel: VesselSpec | None = None,
        progress: Progress | None = None,
    ) -> list[Mending]:
        """As :meth:`mend`, for portions poured together in this order and left standing for days."""
        from carboy.planning.repair import Mender

        case = combine_case(portions, self.names, setting, vessel)
        lab, _, _ = self.prepared(case)
        return Mender(lab, self.vet_left_standing, self._walk_prepared, progress, ends_with_pour=True).mend(case)

    def _walk_prepared(self, case: Case) -> Walk:
        lab, ready, _ = self.prepared(case)
        return lab.walk(ready)

    def vet_left_standing(self, case: Case) -> Report:
        """The report on a case that ends with a pour, after which all is left for days; it aims at nothing."""
        lab, ready, notes = self.prepared(case)
        return lab._report(lab._outcome(ready, left_standing=True), notes)

    def _outcome(self, case: Case, progress: Progress | None = None, *, left_standing: bool = False) -> Outcome:
        """A case walked and judged: with the most conversion, and with the least too where a rule leaves the share open."""
        walk = self.walk(case, progress, left_standing=left_standing)
        judgement = self.judge.judge(walk)
        outcome = Outcome(
            walk, judgement.findings, judgement.leverage, [step_report(trace, self.stock) for trace in walk.steps]
        )
        judged = judged_goals(walk, self.stock)
        outcome.goals = [one.report() for one in judged]
        outcome.findings = in_order(with_missed_aims(outcome.findings, judged, walk, self.judge))
        if not walk.open_conversion:
            return outcome
        slack = self.walk(case, left_standing=left_standing, least=True)
        other = self.judge.judge(slack)
        outcome.findings = merge_findings(outcome.findings, other.findings)
        outcome.steps = [
            wider_step(one, step_report(trace, self.stock))
            for one, trace in zip(outcome.steps, slack.steps, strict=True)
        ]
        outcome.goals = [
            wider_goal(one, two) for one, two in zip(outcome.goals, goal_reports(slack, self.stock), strict=True)
        ]
        outcome.leverage = {key: max(value, other.leverage[key]) for key, value in outcome.leverage.items()}
        return outcome

    def _report(self, outcome: Outcome, notes: tuple[str, ...] = ()) -> Report:
        walk, findings = outcome.walk, outcome.findings
        unsettled = any(trace.unsettled for trace in walk.steps)
        assumptions = [
            *notes,
            *walk.assumptions,
            *self._range_words(walk),
            *(note for trace in walk.steps for note in trace.notes),
        ]
        assumptions += self._beyond(walk)
        questions = [*walk.questions, *_questions(outcome.leverage)]
        return Report(
            title=walk.case.title,
            verdict=verdict_of(findings, bool(walk.unrecognised) or unsettled),
            findings=findings,
            steps=outcome.steps,
            goals=outcome.goals,
            unrecognised=walk.unrecognised,
            assumptions=list(dict.fromkeys(assumptions)),
            questions=list(dict.fromkeys(questions)),
            cautions=list(CAUTIONS),
        )

    def _range_words(self, walk: Walk) -> list[str]:
        return [f"{key}: {low:.3g} to {high:.3g} is followed." for key, (low, _, high) in walk.ranges.variables.items()]

    def _beyond(self, walk: Walk) -> list[str]:
        """What the calculation cannot vouch for: strong brines, liquids with next to no water."""
        words = []
        for trace in walk.steps:
            mixture: Mixture = trace.after
            if mixture.solved is None and mixture.amounts:
                if mixture.total(WATER).max() <= 0 and mixture.dissolvable:
                    words.append(f"Step {trace.number}: no water, so rules and amounts speak alone.")
            elif mixture.solved is not None and np.any(mixture.solved.outside_activity_range):
                words.append(
                    f"Step {trace.number}: ionic strength {float(mixture.solved.ionic_strength.max()):.2g} mol/kg is beyond "
                    "the range of the activity model; directions hold, figures near a limit do not."
                )
        return words


def _questions(leverage: dict[str, float]) -> list[str]:
    """The uncertain numbers whose measuring would settle something, the one that moves the findings most first."""
    ranked = sorted(((value, key) for key, value in leverage.items() if value > _LEAST_LEVERAGE), reverse=True)
    return [
        f"Measure {'first' if place == 0 else 'next'}: {key}. It moves the gravity of the findings by up to {figures(value)} grades in all."
        for place, (value, key) in enumerate(ranked)
    ]


def compare_orders(written: list[Finding], turned: list[Finding]) -> list[Finding]:
    """Mark the findings of two bottles by the order of pouring that they belong to; what only the other order brings is added."""

    def key(finding: Finding) -> tuple[str, tuple[str, ...]]:
        return finding.kind, tuple(finding.species)

    here = {key(finding): finding for finding in written if finding.step == 2}
    there = {key(finding): finding for finding in turned if finding.step == 2}
    result: list[Finding] = []
    other_is_safe = not any(finding.signal == "danger" for finding in there.values())
    for finding in written:
        twin = there.get(key(finding))
        if finding.step == 2:
            same = twin is not None and twin.signal == finding.signal
            finding.order = "either order" if same else "as written"
            if finding.signal == "danger" and other_is_safe and passes_by(finding):
                finding.controls.insert(0, OTHER_ORDER)
        result.append(finding)
    for mark, finding in there.items():
        mine = here.get(mark)
        if mine is None or SIGNAL_ORDER[finding.signal] < SIGNAL_ORDER[mine.signal]:
            finding.order = "other order"
            result.append(finding)
    return result


def passes_by(finding: Finding) -> bool:
    """Whether a hazard belongs to the way of pouring: it stands at contact or along the path, and no longer at the end, which is the same
    in every order."""
    return finding.kind not in ("remobilised", "incomplete") and finding.fractions[1] < 1.0


def verdict_of(findings: list[Finding], cannot_say: bool) -> Verdict:
    """Refuse outranks cannot say, which outranks conditional. A danger that only one order of pouring brings is a condition."""
    standing = [
        f for f in findings if f.signal == "danger" and f.order != "other order" and OTHER_ORDER not in f.controls
    ]
    if standing:
        return "refuse"
    if cannot_say:
        return "cannot say"
    conditional = any(f.signal == "danger" or (f.signal == "warning" and f.order != "other order") for f in findings)
    return "conditional" if conditional else "no objection"


@lru_cache(maxsize=1)
def laboratory() -> Laboratory:
    """The laboratory over the graph and rules that ship with the package."""
    return Laboratory()


def combine(*portions: str, setting: Setting | None = None, vessel: VesselSpec | None = None) -> Report:
    """May these bottles go together? Each portion is text as read off a label.

    Raises InputError where a portion cannot be read.
    """
    if len(portions) < 2:
        raise InputError("combine needs at least two portions")
    return laboratory().combine(portions, setting, vessel)


def vet(case: str | Path | Case, *, progress: Progress | None = None, follow: Sequence[str] = ()) -> Report:
    """Is this procedure safe in this order, and does it reach its aim? ``case`` is a path to a case file or a Case. ``follow``: elements, by
    name or symbol, whose every gram is to be accounted for.

    Raises InputError where the file cannot be read, or for what is no element.
    """
    lab = laboratory()
    plan = case if isinstance(case, Case) else read_case(case, lab.names)
    symbols: list[str] = []
    if follow:
        from carboy.planning.accounting import element_symbol

        symbols = [element_symbol(word) for word in follow]
    return lab.vet(plan, progress, hold_points=True, follow=symbols)


def dose(
    waste: str,
    reagent: str,
    aim: str,
    *,
    setting: Setting | None = None,
    vessel: VesselSpec | None = None,
    over: Interval | None = None,
) -> DoseReport:
    """How much of ``reagent`` (as on its label, without an amount) does ``waste`` need for ``aim``, and how much is too much?
    ``over``: s that the addition takes.

    Raises InputError where one of them cannot be read.
    """
    from carboy.planning.dosing import dose_report

    return dose_report(laboratory(), waste, reagent, aim, setting, vessel, over)


def mend(case: str | Path | Case, *, progress: Progress | None = None) -> list[Mending]:
    """The nearest changes that clear what is found on a procedure, each vetted, the one that changes least first.

    Raises InputError where the file cannot be read.
    """
    lab = laboratory()
    plan = case if isinstance(case, Case) else read_case(case, lab.names)
    return lab.mend(plan, progress)


def treat(waste: str, aim: str | None = None) -> TreatReport:
    """How does this waste become safe? Routes from the treatments of the graph, each vetted. ``aim``: a further goal for the last
    liquid, ``dissolved mercury below 0.2 mg/L``.

    Raises InputError where the waste or the aim cannot be read.
    """
    from carboy.planning.routes import find_routes

    return find_routes(laboratory(), waste, aim)
