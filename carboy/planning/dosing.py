"""How much of a reagent an aim needs, and how much is too much. Everything said of a dose comes from the engine that vets."""

from __future__ import annotations

from typing import Protocol

import numpy as np

from carboy.bench.walk import Walk
from carboy.chemistry.mixture import TRACE, Array, Mixture
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.errors import InputError
from carboy.hazards.draft import Scale
from carboy.hazards.gas import load
from carboy.hazards.goals import goal_value
from carboy.hazards.judge import Judge
from carboy.hazards.numbers import figures
from carboy.hazards.steps import dissolved_by_key
from carboy.model.dosing import Dose, DoseCurve, DoseReport, DoseUnit, DoseWindow, Tolerance
from carboy.model.knowledge import Index
from carboy.model.plan import Add, Case, Goal, Interval, Portion, Setting, VesselSpec
from carboy.model.report import Pair, Report, Verdict
from carboy.model.rule import Rule
from carboy.planning.dose_search import Danger, DoseSearch, Look, Run, longest_run
from carboy.planning.spot_tests import stop_tests
from carboy.reasoning.firing import Reactor
from carboy.text.formulas import elements
from carboy.text.goals import parse_goal
from carboy.text.portions import NameLookup, parse_portion
from carboy.text.reagents import dosed, read_reagent

_VESSEL = "vessel"
_CURVE_POINTS = 90
_LEAST_GAS = 1e-6  # mol that can leave: less is no curve
_GAS_WITHOUT_LIMIT = 1e-5  # atm down to which a gas without a published limit is taken to leave
_DANGER_WORDS = "from here on a danger stands: "


class Engine(Protocol):
    """What vets: the laboratory."""

    index: Index
    rules: tuple[Rule, ...]

    @property
    def names(self) -> NameLookup: ...
    @property
    def stock(self) -> ChemicalStock: ...
    @property
    def reactor(self) -> Reactor: ...
    @property
    def least_reactor(self) -> Reactor: ...
    @property
    def judge(self) -> Judge: ...
    def walk(self, case: Case) -> Walk: ...
    def vet(self, case: Case) -> Report: ...
    def prepared(self, case: Case) -> tuple[Engine, Case, tuple[str, ...]]: ...


def dose_report(
    engine: Engine,
    waste: str,
    reagent: str,
    aim: str,
    setting: Setting | None = None,
    vessel: VesselSpec | None = None,
    over: Interval | None = None,
) -> DoseReport:
    """How much of ``reagent`` (as on its label, without an amount; with one, that is the most at hand) brings ``waste`` to ``aim``.
    ``over``: s that the addition takes; all at once if None.

    Raises InputError where one of the three cannot be read, or the aim names a vessel.
    """
    held = parse_portion(waste, engine.names)
    agent, at_hand = read_reagent(reagent, engine.names, engine.index)
    goal = parse_goal(aim, engine.names)
    if goal.vessel:
        raise InputError(f"a dose has one vessel; write the aim without 'in {goal.vessel}'")
    case = _case(held, agent, goal, setting, vessel, over)
    lab, ready, notes = engine.prepared(case)
    return _Dosing(lab, ready, goal, at_hand, notes).report()


def _case(
    held: Portion, agent: Portion, goal: Goal, setting: Setting | None, vessel: VesselSpec | None, over: Interval | None
) -> Case:
    spec = vessel or VesselSpec(name=_VESSEL)
    return Case(
        title=f"{held.text} with {agent.text}",
        setting=setting or Setting(),
        vessels=(spec,),
        steps=(Add(portion=held, to=spec.name), Add(portion=agent, to=spec.name, over=over)),
        goals=(goal,),
    )


class _Dosing:
    """One question about a dose."""

    def __init__(self, lab: Engine, case: Case, goal: Goal, at_hand: float | None, notes: tuple[str, ...]) -> None:
        self.lab, self.case, self.goal, self.at_hand, self.notes = lab, case, goal, at_hand, notes
        first, second = case.steps
        assert isinstance(first, Add)
        assert isinstance(second, Add)
        assert first.portion is not None
        assert second.portion is not None
        self.held, self.agent = first.portion, second.portion
        self.unit: DoseUnit = "L" if self.agent.unit == "L" else "g"
        self.walk = lab.walk(case)
        self.search = DoseSearch(
            self.walk.steps[1], self.agent.amount.high, goal, (lab.reactor, lab.least_reactor), lab.stock
        )
        self.scale = Scale(lab.index)

    def report(self) -> DoseReport:
        """The whole answer."""
        least, most = self.search.scale(self.scale["dose-most-volume"], self._room())
        found = self.search.search(least, most)
        needless = self.search.without()
        whole = None if needless else longest_run(found.doses, np.asarray(found.met.all(axis=0)))
        nominal = None if needless else longest_run(found.doses, found.met[0])
        chosen_run = whole or nominal
        upto = self._upto(found, chosen_run)
        danger = self.search.danger(self.lab.judge, found, upto)
        windows = [self._window(run, danger, most) for run in (whole, nominal)]
        amount = self._chosen(windows[0] or windows[1], chosen_run)
        vetted = self._vetted(amount)
        if self.walk.unrecognised:
            verdict: Verdict = "cannot say"
        elif needless:
            verdict = "no objection"
        elif vetted is None or (windows[0] is None and windows[1] is None):
            verdict = "refuse"
        elif vetted.verdict == "no objection" and (windows[0] is None or self._narrow(windows[0])):
            verdict = "conditional"
        else:
            verdict = vetted.verdict
        tests, forbidden = stop_tests(
            self._subject_keys(), self._reagent_keys(), self._least_pH(vetted), self.lab.index
        )
        return DoseReport(
            title=self.case.title,
            verdict=verdict,
            waste=self.held.text,
            reagent=self.agent.text,
            aim=self.goal.text,
            unit=self.unit,
            summary=self._summary(needless, whole, nominal, windows, danger, amount, most, vetted),
            dose=None if amount is None else self._dose(amount),
            window=windows[0],
            nominal_window=windows[1],
            tolerance=self._tolerance(found, whole, windows[0] or windows[1], amount, needless),
            curve=self._curve(found, upto, danger, amount),
            spot_tests=tests,
            findings=[] if vetted is None else [one for one in vetted.findings if one.step == 2],
            steps=[] if vetted is None else vetted.steps,
            unrecognised=self.walk.unrecognised,
            assumptions=list(
                dict.fromkeys(
                    [*self.notes, *forbidden, *(self.walk.assumptions if vetted is None else vetted.assumptions)]
                )
            ),
            questions=list(dict.fromkeys(self.walk.questions if vetted is None else vetted.questions)),
            cautions=[] if vetted is None else vetted.cautions,
        )

    # --- the window

    def _room(self) -> float | None:
        """The most that there is, or that the stated vessel takes, in the reagent's unit."""
        limits = [] if self.at_hand is None else [self.at_hand]
        volume = self.case.vessels[0].volume
        if volume is not None:
            free = volume.low - float(self.search.before.volume_L.max())
            if free <= 0:
                raise InputError(f"the vessel of {figures(volume.low, 3)} L does not hold the waste and leave room")
            per_unit = float(self.search.added.volume_L.max()) / self.search.unit
            if per_unit > 0:
                limits.append(free / per_unit)
        return min(limits, default=None)

    def _upto(self, found: Look, run: Run | None) -> float:
        """Up to which dose the curve goes: some way beyond the window."""
        last = float(found.doses[-1])
        if run is None:
            return last
        return min(last, max(3.0 * run.first, 1.5 * run.last if run.ends else 10.0 * run.first))

    def _window(self, run: Run | None, danger: Danger | None, most: float) -> DoseWindow | None:
        """The window of a run, cut off where a danger begins; None where the danger comes first."""
        if run is None:
            return None
        if danger is not None and danger.begins <= run.last:
            if danger.before < run.first:
                return None
            return DoseWindow(
                least=run.first,
                most=danger.before,
                upper_end="danger",
                upper_words=_DANGER_WORDS + danger.draft.summary.rstrip("."),
            )
        if run.ends:
            return DoseWindow(least=run.first, most=run.last, upper_end="aim", upper_words=self._beyond(run.last))
        if self.case.vessels[0].volume is not None and self._room() == most:
            return DoseWindow(least=run.first, most=most, upper_end="vessel", upper_words="the vessel takes no more")
        if self.at_hand is not None and most == self.at_hand:
            return DoseWindow(least=run.first, most=most, upper_end="vessel", upper_words="there is no more at hand")
        return DoseWindow(
            least=run.first, most=None, upper_end="not found", upper_words=f"nothing ends it up to {self._words(most)}"
        )

    def _beyond(self, last: float) -> str:
        """What happens just beyond the last dose that meets the aim."""
        course = self.search.course(np.array([last, last * 1.05]))
        values, unit = goal_value(self.goal, course.mixture, self.lab.stock)
        value = float(course.table(values)[:, 1].max())
        if self.goal.quantity == "pH":
            return f"beyond it the pH leaves the window ({value:.1f} a little further on)"
        forms = self._main_form(course.mixture, 1)
        held = f", as {forms}" if forms else ""
        return (
            f"beyond it more of it is dissolved than the aim allows ({figures(value)} {unit} a little further on{held})"
        )

    def _main_form(self, mixture: Mixture, lane: int) -> str:
        """The dissolved species that holds most of what the aim speaks of."""
        stock = self.lab.stock
        wanted = [token for token in mixture.dissolvable if self.search.is_subject(token)]
        best, most = "", 0.0
        for token, amount in mixture.aqueous.items():
            held = sum(stock.components_of(token).get(part, 0.0) for part in wanted) * float(amount[lane])
            if held > most:
                best, most = stock.label(token), held
        return best

    def _narrow(self, window: DoseWindow) -> bool:
        """Whether a window is narrower than can be measured out."""
        return window.most is not None and window.most < window.least * (1.0 + self.scale["dose-narrowest"])

    def _chosen(self, window: DoseWindow | None, run: Run | None) -> float | None:
        """A tenth over the least dose, or the middle of a narrower window, in figures that can be measured out."""
        if run is None:
            return None
        least = run.first if window is None else window.least
        most = run.last if window is None or window.most is None else window.most
        wanted = least * (1.0 + self.scale["dose-surplus"])
        if wanted > np.sqrt(least * most):
            wanted = float(np.sqrt(least * most))
        for digits in (2, 3, 4, 5):
            rounded = _rounded_up(wanted, digits)
            if least <= rounded <= max(most, wanted):
                return rounded
        return wanted

    def _vetted(self, amount: float | None) -> Report | None:
        if amount is None:
            return None
        portion = dosed(self.agent, amount, self._words(amount))
        first, second = self.case.steps
        assert isinstance(second, Add)
        steps = (first, second.model_copy(update={"portion": portion}))
        return self.lab.vet(self.case.model_copy(update={"steps": steps}))

    # --- words and figures

    def _words(self, amount: float) -> str:
        if self.unit == "L":
            return f"{figures(amount, 4)} L" if amount >= 1 else f"{figures(1000 * amount, 4)} mL"
        return f"{figures(amount / 1000, 4)} kg" if amount >= 1000 else f"{figures(amount, 4)} g"

    def _dose(self, amount: float) -> Dose:
        added = self.search.added.scaled(amount / self.search.unit)
        names = self.lab.index.substances
        holds = {names[one].name: _pair(moles) for one, moles in added.labelled.items()}
        return Dose(amount=amount, words=f"{self._words(amount)} of {self.agent.text}", holds_mol=holds)

    def _summary(
        self,
        needless: bool,
        whole: Run | None,
        nominal: Run | None,
        windows: list[DoseWindow | None],
        danger: Danger | None,
        amount: float | None,
        most: float,
        vetted: Report | None,
    ) -> str:
        if needless:
            return "The aim is met without any of the reagent."
        if nominal is None and whole is None:
            return f"No dose up to {self._words(most)} meets the aim: another reagent, or another step before this one, is needed."
        window = windows[0] or windows[1]
        run = whole or nominal
        assert run is not None
        assert amount is not None
        if window is None:
            assert danger is not None
            return f"The aim needs {self._words(run.first)}, but a danger begins at {self._words(danger.begins)}: {danger.draft.summary}"
        narrow = self._narrow(window)
        upper = (
            "on"
            if window.most is None
            else f"to {self._words(window.most if narrow else _rounded_down(window.most, 3))}"
        )
        least = self._words(window.least if narrow else _rounded_up(window.least, 3))
        text = f"{self._said(amount, vetted)} The window is from {least} {upper}; {window.upper_words}."
        if narrow:
            text += " That is narrower than can be measured out: take a weaker or a buffering reagent, or go in drops with a meter."
        if whole is None:
            text += " This holds for the figures as stated, not over the whole of the stated ranges: no one dose does."
        return text

    def _said(self, amount: float, vetted: Report | None) -> str:
        """What to do with the chosen dose; where it is refused as written, by which dangers."""
        dangers = [] if vetted is None else [one for one in vetted.findings if one.signal == "danger"]
        if not dangers:
            return f"Add {self._words(amount)}."
        why = " ".join(dict.fromkeys(one.summary for one in dangers[:2]))
        return f"The aim asks for {self._words(amount)}, but added as written it is refused: {why}"

    def _tolerance(
        self, found: Look, whole: Run | None, window: DoseWindow | None, amount: float | None, needless: bool
    ) -> Tolerance:
        ranges: dict[str, Pair] = {key: (low, high) for key, (low, _, high) in self.walk.ranges.variables.items()}
        runs = [longest_run(found.doses, row) for row in found.met]
        reached = [run for run in runs if run is not None]
        least: Pair | None = None
        most: tuple[float | None, float | None] | None = None
        if reached and len(reached) == len(runs):
            least = min(run.first for run in reached), max(run.first for run in reached)
            ends = [run.last for run in reached if run.ends]
            most = min(ends, default=None), max(ends) if len(ends) == len(reached) else None
        factor: tuple[float | None, float] | None = None
        if amount is not None and window is not None:
            factor = None if window.most is None else amount / window.most, amount / window.least
        if needless:
            words = "Nothing is to be added."
        elif not ranges:
            words = "The figures are taken as stated; no range was given."
        elif whole is not None and least is not None:
            words = (
                f"Over the stated ranges the least dose runs from {self._words(least[0])} to {self._words(least[1])}; "
                "one dose serves them all."
            )
        elif least is not None:
            words = (
                f"Over the stated ranges the least dose runs from {self._words(least[0])} to {self._words(least[1])}, and what is "
                "enough for one end is too much for the other: measure first, or add in portions and test."
            )
        else:
            words = "In part of the stated ranges no dose meets the aim."
        if factor is not None:
            low = "any smaller amount" if factor[0] is None else f"{figures(factor[0])} times"
            words += (
                f" The chosen dose serves from {low} up to {figures(factor[1])} times the stated amount of the waste."
            )
        return Tolerance(
            ranges=ranges,
            throughout=needless or whole is not None,
            least=least,
            most=most,
            waste_factor=factor,
            words=words,
        )

    def _curve(self, found: Look, upto: float, danger: Danger | None, amount: float | None) -> DoseCurve:
        """Doses evenly over the logarithm, more where the aim changes, and the chosen one."""
        doses = found.doses[found.doses <= upto * (1 + 1e-9)]
        if doses.size > _CURVE_POINTS:
            doses = doses[np.unique(np.linspace(0, doses.size - 1, _CURVE_POINTS).astype(int))]
        if amount is not None:
            doses = np.unique(np.append(doses, amount))
        look = self.search.look(doses)
        course = self.search.course(doses)
        _, unit = goal_value(self.goal, course.mixture, self.lab.stock)
        nominal = course.mixture.take(np.arange(course.points))
        litres = np.maximum(nominal.volume_L, 1e-9)
        dissolved = {
            key: [float(one) for one in 1000 * amount * weight / litres]
            for key, amount in dissolved_by_key(nominal, self.lab.stock).items()
            if (weight := self._weight_of_metal(key)) is not None
        }
        return DoseCurve(
            dose=[float(one) for one in doses],
            aim=_figures(look.value[0]),
            aim_low=_figures(look.value.min(axis=0)),
            aim_high=_figures(look.value.max(axis=0)),
            aim_unit=unit,
            aim_from=self.goal.low,
            aim_to=self.goal.high,
            dissolved_mg_L=dissolved,
            pH=_figures(nominal.pH),
            gas_mol=self._gas(nominal),
            danger=[danger is not None and bool(one >= danger.begins * (1 - 1e-9)) for one in doses],
        )

    def _weight_of_metal(self, key: str) -> float | None:
        """g/mol of an element on whose amount in liquids there is a limit, or that the aim names; None for anything else."""
        element = elements().get(key)
        limited = {limit.subject for limit in self.lab.index.limits} | {self.goal.subject.split("(")[0]}
        return element.weight if element is not None and key in limited else None

    def _gas(self, mixture: Mixture) -> dict[str, list[float]]:
        found = {}
        for token in mixture.gases:
            gas = self.lab.index.gases.get(token)
            if gas is None:
                continue
            limit = _GAS_WITHOUT_LIMIT if gas.idlh is None else 1e-6 * gas.idlh.magnitude
            leaving = load(mixture, token, self.scale["swept-air"]).leaving(limit)
            if np.any(leaving > _LEAST_GAS):
                found[gas.formula] = [float(one) for one in leaving]
        return found

    # --- keys for the tests

    def _subject_keys(self) -> set[str]:
        if self.goal.quantity == "pH":
            return {"pH"}
        return {
            self.lab.stock.species(token).report_key
            for token in self.search.before.amounts
            if token not in (WATER, PROTON) and self.search.is_subject(token)
        }

    def _reagent_keys(self) -> set[str]:
        """Report keys of what the reagent brings; ``pH`` too where it brings acid or base."""
        added = self.search.added
        tokens = [token for token in added.amounts if token not in (WATER, PROTON)]
        moved = np.any(np.abs(added.total(PROTON)) > TRACE)
        return {self.lab.stock.species(token).report_key for token in tokens} - {""} | ({"pH"} if moved else set())

    def _least_pH(self, vetted: Report | None) -> float | None:
        if vetted is not None and vetted.steps and vetted.steps[-1].pH is not None:
            return vetted.steps[-1].pH[0]
        pH = float(self.search.before.pH.min())
        return pH if np.isfinite(pH) else None


def _rounded_up(value: float, digits: int) -> float:
    size = 10.0 ** (np.floor(np.log10(value)) - digits + 1)
    return float(f"{np.ceil(value / size - 1e-9) * size:.12g}")


def _rounded_down(value: float, digits: int) -> float:
    size = 10.0 ** (np.floor(np.log10(value)) - digits + 1)
    return float(f"{np.floor(value / size + 1e-9) * size:.12g}")


def _pair(values: Array) -> Pair:
    return float(values.min()), float(values.max())


def _figures(values: Array) -> list[float | None]:
    return [float(one) if np.isfinite(one) else None for one in values]
