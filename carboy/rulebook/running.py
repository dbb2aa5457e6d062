"""Runs the ``fires`` and ``silent`` lines of rules on the engine."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor

from carboy.bench.walk import Walk
from carboy.errors import CarboyError
from carboy.model.knowledge import Index
from carboy.model.plan import Case, Wait
from carboy.model.rule import Example, Rule
from carboy.rulebook.examples import Found, run_examples
from carboy.rulebook.problems import Problem
from carboy.text.cases import combine_case, setting_from_mapping, vessel_from_mapping
from carboy.text.quantities import parse_quantity
from carboy.vetting import Laboratory

VESSEL = "vessel"
Progress = Callable[[int, int], None]
_WORTH_A_PROCESS = 30  # examples that repay starting a process


class EngineFault(CarboyError):
    """An example brought the engine down. It is reported in its place, so that the others still run."""


class ExampleRunner:
    """Pours the portions of an example together and tells which rules fired.

    A rule counts as fired if it supports a finding of any signal, or if it changed the state (also where nothing comes
    of it that would be a finding).
    """

    def __init__(self, laboratory: Laboratory, progress: Progress | None = None, total: int = 0) -> None:
        self._laboratory = laboratory
        self._progress = progress
        self._total = total
        self._count = 0

    def __call__(self, example: Example) -> list[Found]:
        """What was found: (rule id, kinds of hazard, species as plain formulas), one for each rule and finding."""
        self._count += 1
        if self._progress is not None:
            self._progress(self._count, self._total)
        return self.run(self.case(example))

    def run(self, case: Case) -> list[Found]:
        """What was found in a case, in the same form. Raises EngineFault, or InputError for a structure that is none."""
        laboratory, ready, _ = self._laboratory.prepared(case)
        try:
            walk = laboratory.walk(ready)
            findings = laboratory.judge.findings(walk)
        except (
            ArithmeticError,
            LookupError,
            TypeError,
            ValueError,
        ) as error:  # a fault of the engine: one line of the list
            raise EngineFault(f"the engine broke ({type(error).__name__}: {error})") from error
        found: list[Found] = [(rule, (one.kind,), tuple(one.species)) for one in findings for rule in one.rules]
        return [*found, *self._fired(walk)]

    def case(self, example: Example) -> Case:
        """The example as a case. Raises InputError."""
        names = self._laboratory.names
        given = example.setting
        setting = setting_from_mapping({"temperature": given["temperature"]} if "temperature" in given else {})
        described = {"cover": given.get("cover"), "material": given.get("container"), "volume": given.get("volume")}
        vessel = vessel_from_mapping(VESSEL, {key: value for key, value in described.items() if value}, names)
        case = combine_case(example.portions, names, setting, vessel)
        if "wait" not in given:
            return case
        wait = Wait(kind="wait", vessel=VESSEL, duration=parse_quantity(given["wait"], "time"))
        return case.model_copy(update={"steps": (*case.steps, wait)})

    def _fired(self, walk: Walk) -> Iterator[Found]:
        judge = self._laboratory.judge
        made: dict[str, set[str]] = {}
        for trace in walk.steps:
            for course in (trace.path, trace.contact, trace.storage):
                for firing in course.firings if course is not None else ():
                    products = {judge.plain_formula(token) for token, _ in firing.reaction.products}
                    made.setdefault(firing.rule.id, set()).update(products)
            for rule in self._laboratory.rules:
                if rule.does and walk.record.events_of(rule.id, trace.number):
                    made.setdefault(rule.id, set())
        yield from ((rule, (), tuple(sorted(products))) for rule, products in made.items())


def check_examples(
    laboratory: Laboratory, rules: Iterable[Rule], progress: Progress | None = None, workers: int | None = None
) -> list[Problem]:
    """The examples of ``rules`` that the engine does not bear out.

    ``workers`` processes share the work (None: as many as there are processors); few examples are run in this one.
    """
    wanted: Sequence[Rule] = [rule for rule in rules if not rule.off]
    examples = [example for rule in wanted for example in (*rule.fires, *rule.silent)]
    count = min(workers or os.cpu_count() or 1, len(examples) // _WORTH_A_PROCESS)
    if count < 2:
        return run_examples(wanted, ExampleRunner(laboratory, progress, len(examples)))
    outcomes: dict[int, list[Found] | str] = {}
    with ProcessPoolExecutor(count, initializer=_begin, initargs=(laboratory.index, laboratory.rules)) as pool:
        for number, outcome in enumerate(pool.map(_run, examples, chunksize=4)):
            outcomes[id(examples[number])] = outcome
            if progress is not None:
                progress(number + 1, len(examples))

    def known(example: Example) -> list[Found]:
        outcome = outcomes[id(example)]
        if isinstance(outcome, str):
            raise EngineFault(outcome)
        return outcome

    return run_examples(wanted, known)


_runner: ExampleRunner | None = None  # of a worker process


def _begin(index: Index, rules: tuple[Rule, ...]) -> None:
    global _runner  # noqa: PLW0603 - a worker has one laboratory for all its examples
    _runner = ExampleRunner(Laboratory(index, rules))


def _run(example: Example) -> list[Found] | str:
    """What was found, or why the example could not be run."""
    assert _runner is not None
    try:
        return _runner(example)
    except CarboyError as error:
        return error.message
