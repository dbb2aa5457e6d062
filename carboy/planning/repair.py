"""The nearest changes to a procedure that clear what was found on it, each vetted by the same engine before it is offered.

Changes are tried one at a time, those for the earliest danger first; where no single one clears everything, the ones that helped are
changed once more. A variant is offered only if it is written and read back as a case file, no vessel overflows, no danger is left,
every goal and check is met that was met before, and nobody is less able to say what will happen. If the mixing itself is what cannot be
mended, the last offer is to keep a bottle out of it.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from typing import Protocol

from carboy.bench.walk import Walk
from carboy.chemistry.stock import ChemicalStock
from carboy.errors import InputError
from carboy.knowledge.names import Names
from carboy.model.knowledge import Index
from carboy.model.plan import Add, Case, Check, Filter, Portion, Transfer
from carboy.model.report import Finding, Report, Verdict
from carboy.planning import edits
from carboy.planning.amounts import Doser
from carboy.planning.edits import Variant
from carboy.planning.proposals import Proposer
from carboy.text.case_writer import case_text
from carboy.text.cases import read_case

MOST_TRIED = 40
ENOUGH = 5
_FOR_KEEPING_APART = 3  # of the tries, held back for leaving a bottle out
_NOT_BY_HALVES = ("explosive", "fire", "pressure")  # what is a warning still is no way out
_FIRST_ELEMENT = re.compile(r"[A-Z][a-z]?")  # the metal stands first in the formula of what it dissolves as
_PATIENCE = 8  # tries without success, once something is found
_DEEPEST = 3  # changes on top of each other
_SURELY = {"no objection": 3, "conditional": 2, "cannot say": 1, "refuse": 0}

Progress = Callable[[int, int], None]


class Engine(Protocol):
    """What is known: the graph, its names and its chemistry."""

    @property
    def index(self) -> Index: ...

    @property
    def names(self) -> Names: ...

    @property
    def stock(self) -> ChemicalStock: ...


@dataclass(frozen=True)
class Mending:
    """A changed procedure that was vetted: what was changed in words, what the engine says of it, and the procedure itself.

    ``apart``: where a bottle goes that is kept out of it, "" if none is. ``conditions``: the warnings that stand on it.
    """

    changes: tuple[str, ...]
    report: Report
    case: Case
    size: float
    apart: str = ""
    conditions: tuple[str, ...] = ()

    @property
    def verdict(self) -> Verdict:
        """The verdict on the changed procedure."""
        return self.report.verdict

    def text(self) -> str:
        """The changed procedure as a case file, with the changes in its head."""
        lines = ["Mended; what was changed:", *(f"- {change}" for change in self.changes)]
        if self.apart:
            lines.append(self.apart)
        return case_text(self.case, [*lines, f"Vetted: {self.verdict}. Vet it again if anything is changed."])


@dataclass
class _Try:
    variant: Variant
    report: Report

    @property
    def rank(self) -> tuple[int, int, float]:
        """Fewest dangers first, then fewest changes, then the smaller ones."""
        return len(_at(self.report, "danger")), len(self.variant.changes), self.variant.size


@dataclass
class Mender:
    """Searches changes to cases. ``vet`` says what counts as the report on a case, ``walk`` what is in its vessels."""

    engine: Engine
    vet: Callable[[Case], Report]
    walk: Callable[[Case], Walk]
    progress: Progress | None = None
    most_tried: int = MOST_TRIED
    ends_with_pour: bool = False  # only what ends with a pour can be vetted (bottles poured together and left standing)
    _seen: set[str] = field(default_factory=set)
    _tried: int = 0

    def mend(self, case: Case) -> list[Mending]:
        """Up to five changed cases that clear it, the one that changes least first; [] where nothing is to be mended or nothing helps.

        Raises InputError where the case itself cannot be carried out.
        """
        base = _Try(Variant(case), self.vet(case))
        self._seen, self._tried = {case_text(case)}, 0
        signal = {"refuse": "danger", "conditional": "warning"}.get(base.report.verdict)
        if signal is None:
            return []
        found: list[_Try] = []
        helped: list[_Try] = [base]
        doser = Doser(self.engine.stock, self.engine.names)
        while helped and len(found) < ENOUGH and self._tried < self.most_tried - _FOR_KEEPING_APART:
            current = helped.pop(0)
            if found and current.variant.changes:
                break  # single changes clear it: no need of double ones
            if len(current.variant.changes) >= _DEEPEST:
                continue
            fruitless = 0
            for trial in self._tries(current, base, signal, doser):
                fruitless += 1
                if self._clears(trial.report, base.report, trial.variant.case, case):
                    found.append(trial)
                    fruitless = 0
                if len(found) >= ENOUGH or (found and fruitless >= _PATIENCE):
                    break
                if fruitless and signal == "danger" and self._helps(trial.report, current.report):
                    helped.append(trial)
            helped.sort(key=lambda one: one.rank)
        found.sort(key=lambda one: self._order(one, base.report))
        menders = [self._mending(one) for one in found]
        if len(menders) < ENOUGH and signal == "danger":
            menders += self._kept_apart(base)
        return menders

    # --- the search

    def _tries(self, current: _Try, base: _Try, signal: str, doser: Doser) -> Iterator[_Try]:
        """Variants of the current one, vetted."""
        first = current is base
        budget = self.most_tried - _FOR_KEEPING_APART
        if first:
            budget = max(1, int(0.75 * budget))
        walk = self.walk(current.variant.case)
        proposer = Proposer(current.variant, walk, self.engine.stock, self.engine.names, doser)
        leads = _leads(_at(current.report, signal) or _at(current.report, "danger"))
        for variant in _in_turn([proposer.against(lead) for lead in leads]):
            if self._tried >= budget:
                return
            trial = self._vetted(variant)
            if trial is not None:
                yield trial

    def _vetted(self, variant: Variant) -> _Try | None:
        """The variant as a case file would give it back, with its report; None if it is no case or was seen before."""
        try:
            text = case_text(variant.case)
            if text in self._seen:
                return None
            self._seen.add(text)
            case = read_case(text, self.engine.names, file="").model_copy(update={"file": ""})
            if self.ends_with_pour and not isinstance(case.steps[-1], Add):
                return None
            if case_text(read_case(case_text(case), self.engine.names, file="")) != case_text(case):
                return None
            self._tried += 1
            if self.progress is not None:
                self.progress(self._tried, self.most_tried)
            return _Try(Variant(case, variant.changes), self.vet(case))
        except InputError:
            return None  # takes from an empty bottle, names a vessel that is not there any more, and the like

    def _helps(self, report: Report, before: Report) -> bool:
        """Whether a variant is worth changing further: fewer dangers, or the first one gone."""
        left, had = _at(report, "danger"), _at(before, "danger")
        if not had or report.unrecognised != before.unrecognised:
            return False
        lead = had[0]
        gone = all((one.kind, one.species) != (lead.kind, lead.species) for one in left)
        return len(left) < len(had) or (gone and len(left) <= len(had))

    def _clears(self, report: Report, before: Report, case: Case, old: Case) -> bool:
        """Whether a variant may be offered."""
        if _at(report, "danger") or _SURELY[report.verdict] <= _SURELY[before.verdict]:
            return False
        if report.verdict == "cannot say" and report.unrecognised != before.unrecognised:
            return False
        if report.verdict == "cannot say" and not report.unrecognised:
            return False  # the calculation did not come to rest
        if not self._less_of_it(report, before) or not self._stays_down(report, case, before, old):
            return False
        return _goals_hold(report, before) and _checks_hold(report, case, before, old) and _all_goes_in(report, case)

    def _less_of_it(self, report: Report, before: Report) -> bool:
        """Whether what was a danger is gone in substance: where a gas or product is a warning still, or is only spread over more steps,
        there must be much less of it."""
        left = self.engine.index.thresholds["repair-amount-left"].value.magnitude
        for danger in _at(before, "danger"):
            if danger.kind in _NOT_BY_HALVES and any(one.kind == danger.kind for one in _at(report, "warning")):
                return False
            if danger.kind in ("heat", "foam", "pressure"):
                continue
            then, now = _alike(danger, before), _alike(danger, report)
            stands = any(one.signal == "warning" for one in now) or len(now) > len(then)
            if stands and _most(now) > left * _most(then):
                return False
        return True

    def _stays_down(self, report: Report, case: Case, before: Report, old: Case) -> bool:
        """Whether a metal that was put back into solution is out of it at the end, and has not merely never come down."""
        left = self.engine.index.thresholds["repair-metal-left"].value.magnitude
        for danger in _at(before, "danger"):
            metal = _FIRST_ELEMENT.match(danger.species[0]) if danger.kind == "remobilised" and danger.species else None
            if metal is not None and _dissolved_in_the_end(metal[0], report, case) > left * _dissolved_in_the_end(
                metal[0], before, old
            ):
                return False
        return True

    def _order(self, trial: _Try, before: Report) -> tuple[int, int, float]:
        known = {(one.kind, tuple(one.species)) for one in before.findings if one.signal != "note"}
        new = sum((one.kind, tuple(one.species)) not in known for one in _at(trial.report, "warning"))
        return len(trial.variant.changes), new, trial.variant.size

    def _mending(self, trial: _Try, apart: str = "") -> Mending:
        return Mending(
            changes=tuple(change.words for change in trial.variant.changes),
            report=trial.report,
            case=trial.variant.case,
            size=trial.variant.size,
            apart=apart,
            conditions=tuple(dict.fromkeys(one.summary for one in _at(trial.report, "warning"))),
        )

    # --- keeping apart

    def _kept_apart(self, base: _Try) -> list[Mending]:
        """The bottles that bring the dangers are left out one after the other, until none is left."""
        current, apart = base, []
        self._tried = min(self._tried, self.most_tried - _FOR_KEEPING_APART)
        for _ in range(_FOR_KEEPING_APART):
            pours = [
                one.step - 1
                for one in _at(current.report, "danger")
                if isinstance(current.variant.case.steps[one.step - 1], Add)
            ]
            if not pours:
                return []
            case, place = current.variant.case, pours[0]
            step = case.steps[place]
            assert isinstance(step, Add)
            if len(edits.pours_into(case, step.to)) < 2 or self._only_dilutes(step, case):
                return []
            words = f"Do not add {edits.spoken(step)} (step {place + 1}) to {step.to}."
            apart.append(self._destination(step, case))
            trial = self._vetted(edits.leave_out(current.variant, place, words))
            if trial is None:
                return []
            if self._clears(trial.report, base.report, trial.variant.case, base.variant.case):
                return [self._mending(trial, " ".join(apart))]
            current = trial
        return []

    def _only_dilutes(self, step: Add, case: Case) -> bool:
        portion = step.portion or case.bottles.get(step.source)
        diluents = {
            f"substance:{one.substance}" for one in self.engine.index.repair_reagents if one.serves == "diluent"
        }
        return portion is not None and all(item.reference in diluents for item in portion.ingredients)

    def _destination(self, step: Add, case: Case) -> str:
        portion = step.portion or case.bottles.get(step.source)
        kinds = self._kinds(portion) if portion is not None else []
        stream = f", as waste of its own kind ({', '.join(kinds)})" if kinds else ""
        what = edits.spoken(step)
        where = f"its own labelled bottle{stream}, for its own treatment or the licensed contractor"
        return f"{what[:1].upper()}{what[1:]} stays in {where}."

    def _kinds(self, portion: Portion) -> list[str]:
        kinds = []
        for item in portion.ingredients:
            kind, _, key = item.reference.partition(":")
            record = self.engine.index.substances.get(key) if kind == "substance" else None
            for name in record.classes[:1] if record is not None else ():
                kinds.append(self.engine.index.classes[name].label)
        return list(dict.fromkeys(kinds))


def _at(report: Report, signal: str) -> list[Finding]:
    return [one for one in report.findings if one.signal == signal]


def _alike(finding: Finding, report: Report) -> list[Finding]:
    """The findings of the same kind on the same thing."""
    return [one for one in report.findings if (one.kind, one.species) == (finding.kind, finding.species)]


def _most(findings: list[Finding]) -> float:
    """mol in all, at the most."""
    return sum(one.amount_mol[1] for one in findings if one.amount_mol is not None)


def _dissolved_in_the_end(metal: str, report: Report, case: Case) -> float:
    """mol of a metal dissolved in all vessels when the procedure is over, at the most."""
    last: dict[str, float] = {}
    for state in report.steps:
        step = case.steps[state.step - 1]
        emptied = {
            Filter: lambda one: one.vessel,
            Transfer: lambda one: one.vessel if one.part is None and one.heel is None else "",
            Add: lambda one: one.source if one.part is None else "",
        }.get(type(step))
        if emptied is not None:
            last.pop(emptied(step), None)
        last[state.vessel] = state.dissolved_mol.get(metal, (0.0, 0.0))[1]
    return sum(last.values())


def _leads(findings: Sequence[Finding]) -> list[Finding]:
    """The findings of the first step that has any, one of each kind, then those of later steps of kinds not met yet."""
    chosen: dict[str, Finding] = {}
    for one in sorted(findings, key=lambda one: one.step):
        chosen.setdefault(one.kind, one)
    return list(chosen.values())


def _in_turn(sources: list[Iterator[Variant]]) -> Iterator[Variant]:
    """From each in turn: two of the first for one of each other."""
    while sources:
        for place, source in enumerate(list(sources)):
            for _ in range(2 if place == 0 else 1):
                one = next(source, None)
                if one is None:
                    if source in sources:
                        sources.remove(source)
                    break
                yield one


def _goals_hold(report: Report, before: Report) -> bool:
    grade = {True: 2, None: 1, False: 0}
    return len(report.goals) == len(before.goals) and all(
        grade[new.met] >= grade[old.met] for new, old in zip(report.goals, before.goals, strict=True)
    )


def _checks_hold(report: Report, case: Case, before: Report, old: Case) -> bool:
    """Every check of the procedure that was met is met still."""
    now, then = _checks(report, case), _checks(before, old)
    return len(now) == len(then) and all(new >= earlier for new, earlier in zip(now, then, strict=True))


def _checks(report: Report, case: Case) -> list[bool]:
    met = []
    for state in report.steps:
        step = case.steps[state.step - 1]
        if not isinstance(step, Check):
            continue
        pair = {"pH": state.pH, "temperature": state.temperature_C}.get(step.quantity)
        inside = pair is not None
        if pair is not None:
            inside = (step.low is None or pair[0] >= step.low) and (step.high is None or pair[1] <= step.high)
        met.append(inside)
    return met


def _all_goes_in(report: Report, case: Case) -> bool:
    """Whether no vessel of a stated size overflows."""
    sizes = {spec.name: spec.volume.low for spec in case.vessels if spec.volume is not None}
    for state in report.steps:
        volume = state.volume_L if isinstance(state.volume_L, int | float) else max(state.volume_L)
        if volume > sizes.get(state.vessel, float("inf")) * (1 + 1e-6):
            return False
    return True
