"""What must be true before a step, and how one tests it at the bench.

The margins come from the engine: the step is followed again from a vessel brought to other pH values with a strong acid or base
that does nothing else, and from one in which what an earlier step took away is still there. Where a danger of the step begins is
where the hold point stands.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from carboy.bench.follow import along
from carboy.bench.trace import StepTrace
from carboy.bench.walk import Walk
from carboy.chemistry.mixture import Array, Mixture
from carboy.chemistry.stock import PROTON, WATER, ChemicalStock
from carboy.hazards.draft import DANGER, WARNING, Draft, Scale
from carboy.hazards.flagged import name_of
from carboy.hazards.judge import Judge
from carboy.hazards.numbers import figures
from carboy.model.plan import Filter, Step
from carboy.model.report import HoldPoint
from carboy.model.rule import Kind
from carboy.planning.spot_tests import tests_for
from carboy.reasoning.firing import Reactor

# what the pH of the vessel or a rest in it decides; heat, foam and pressure hang on amounts, and metals on what has come down before
_DECIDED: dict[Kind, str] = {
    "toxic-gas": "a toxic gas",
    "flammable-gas": "a flammable gas",
    "explosive": "an explosive",
    "fire": "fire",
    "toxic-product": "a toxic product",
}
_ADDED = np.geomspace(1e-5, 5.0, 14)  # mol of acid or base to a litre of the vessel, the first round
_SPACING = 1.0  # of pH, between the vessels that are tried
_FINER = 7  # amounts between two that lie further apart in pH
_ROUNDS = 3
_READABLE = (1.0, 13.0)  # pH that a strip can tell
_FRACTIONS = np.array([0.1, 0.5, 1.0])
_GONE = 0.05  # of what was there: less counts as taken away
_LEAST = 1e-4  # mol that must have been there
_BOILING_C = 100.0


@dataclass
class _Seen:
    """The most of each component that a vessel has held, in mol."""

    most: dict[str, float] = field(default_factory=dict)

    def note(self, content: Mixture, lane: int) -> None:
        for token, amount in content.amounts.items():
            if token not in (WATER, PROTON):
                self.most[token] = max(self.most.get(token, 0.0), float(amount[lane]))


@dataclass(frozen=True)
class _Variant:
    """One lane of the trial: a pH of the vessel, or a component that is put back; neither for the vessel as it is."""

    pH: float | None = None
    token: str = ""


class HoldPoints:
    """Finds the hold points of walks."""

    def __init__(self, judge: Judge, reactor: Reactor, stock: ChemicalStock) -> None:
        self.judge, self.reactor, self.stock = judge, reactor, stock
        self.scale = Scale(stock.index)
        self.anion, self.cation = (
            next(token for token, one in stock.index.species.items() if key in one.classes)
            for key in ("unspecified-anion", "unspecified-cation")
        )

    def of(self, walk: Walk) -> list[HoldPoint]:
        """The hold points of every step that pours into something, in the order of steps."""
        seen: dict[str, _Seen] = {}
        found: list[HoldPoint] = []
        for trace in walk.steps:
            step = walk.case.steps[trace.number - 1]
            held = seen.setdefault(trace.vessel, _Seen())
            if trace.before is not None and trace.added is not None and trace.path is not None:
                found += self._before(trace, held.most)
            self._remember(step, trace, seen)
        return found

    def _remember(self, step: Step, trace: StepTrace, seen: dict[str, _Seen]) -> None:
        held = seen[trace.vessel]
        if isinstance(step, Filter) and step.vessel in seen:
            for token, most in seen[step.vessel].most.items():
                held.most[token] = max(held.most.get(token, 0.0), most)
        if trace.path is not None:
            held.note(trace.path.unreacted, trace.path.points - 1)
        held.note(trace.after, 0)

    # --- one step

    def _before(self, trace: StepTrace, seen: Mapping[str, float]) -> list[HoldPoint]:
        assert trace.before is not None
        points = [*self._temperature(trace)]
        vessel = trace.before.take(np.array([0]))
        if vessel.neat or vessel.solved is None or trace.unknown:
            return points
        gone = [
            token
            for token, most in seen.items()
            if most > _LEAST
            and token in self.stock.index.species
            and float(vessel.total(token)[0]) < _GONE * most
            and tests_for({self.stock.species(token).report_key} - {""}, self.stock.index)
        ]
        variants, contents = self._varied(vessel, {token: seen[token] for token in gone})
        drafts = [one for one in self._tried(trace, contents) if one.kind in _DECIDED and one.level >= DANGER]
        levels = [one.levels.max(axis=1) for one in drafts]
        if any(level[0] >= DANGER for level in levels):
            return []  # refused as written: its finding says so, and no test before it makes it safe
        pH, gases = self._pH(trace, float(vessel.pH[0]), variants, drafts, levels)
        rests = self._rests(trace, variants, drafts, levels)
        return [*pH, *rests, *points, *self._alarms(trace, gases)]

    def _varied(self, vessel: Mixture, back: Mapping[str, float]) -> tuple[list[_Variant], Mixture]:
        """The vessel as it is, with each rest put back, and at each pH that can be reached; one lane each."""
        shifted = self._titrated(vessel)
        variants = [_Variant()] + [_Variant(token=token) for token in back]
        variants += [_Variant(pH=float(value)) for value in shifted.pH]
        whole = vessel.repeated(len(variants))
        amounts = {token: whole.total(token).copy() for token in {*shifted.amounts, *whole.amounts, *back}}
        first = 1 + len(back)
        for token, most in back.items():
            lane = next(place for place, one in enumerate(variants) if one.token == token)
            amounts[token][lane] = most
        for token, amount in shifted.amounts.items():
            amounts[token][first:] = amount
        content = whole.with_amounts(amounts)
        content.hint = None
        return variants, content

    def _titrated(self, vessel: Mixture) -> Mixture:
        """The vessel with strong acid or base in it, one lane for about every unit of pH within reach."""
        now, volume = float(vessel.pH[0]), float(vessel.volume_L[0])
        reach = self.scale["hold-pH-reach"]
        moved = np.concatenate([-_ADDED[::-1], [0.0], _ADDED]) * volume
        pH = self._with_protons(vessel, moved).pH
        for _ in range(_ROUNDS):
            far = np.abs(np.diff(pH)) > _SPACING
            far &= (np.minimum(pH[1:], pH[:-1]) < now + reach) & (np.maximum(pH[1:], pH[:-1]) > now - reach)
            if not far.any():
                break
            between = [np.linspace(moved[at], moved[at + 1], _FINER + 2)[1:-1] for at in np.flatnonzero(far)]
            fresh = np.concatenate(between)
            moved, pH = np.concatenate([moved, fresh]), np.concatenate([pH, self._with_protons(vessel, fresh).pH])
            order = np.argsort(moved)
            moved, pH = moved[order], pH[order]
        chosen: list[int] = []
        for lane in np.argsort(pH):
            apart = not chosen or pH[lane] - pH[chosen[-1]] >= 0.7 * _SPACING
            if abs(pH[lane] - now) <= reach and apart:
                chosen.append(int(lane))
        return self._with_protons(vessel, moved[chosen])

    def _with_protons(self, vessel: Mixture, protons: Array) -> Mixture:
        """The vessel with so many mol of strong acid (less than none: of base), one lane each; the counter-ions do nothing."""
        many = vessel.repeated(len(protons))
        added = {
            PROTON: many.total(PROTON) + protons,
            self.anion: many.total(self.anion) + np.maximum(protons, 0.0),
            self.cation: many.total(self.cation) + np.maximum(-protons, 0.0),
        }
        return many.with_amounts({**many.amounts, **added})

    def _tried(self, trace: StepTrace, vessel: Mixture) -> list[Draft]:
        """The hazards of the step from each of these vessels."""
        assert trace.added is not None
        lanes = vessel.lanes
        added = trace.added.take(np.array([0])).repeated(lanes)
        course = along(
            vessel, added, self.reactor, trace.surroundings, capacity_L=None, air_mol=None, fractions=_FRACTIONS
        )

        def same(values: Array) -> Array:
            return np.full(lanes, float(values[0]))

        trial = replace(
            trace,
            before=vessel,
            added=added,
            path=course,
            contact=None,
            storage=None,
            after=course.mixture.take(course.last()),
            capacity_L=same(trace.capacity_L),
            rating_kPa=None if trace.rating_kPa is None else same(trace.rating_kPa),
            duration_s=None if trace.duration_s is None else same(trace.duration_s),
            left_alone=(),
            left_firings=(),
            notes=[],
        )
        return self.judge.drafts(trial)

    # --- what comes of it

    def _pH(
        self,
        trace: StepTrace,
        now: float,
        variants: list[_Variant],
        drafts: list[Draft],
        levels: list[NDArray[np.int_]],
    ) -> tuple[list[HoldPoint], list[str]]:
        """The window of pH about the vessel's own in which no danger of the step stands; and the gases that stand beyond it."""
        lanes = [place for place, one in enumerate(variants) if one.pH is not None]
        values = np.array([variants[lane].pH for lane in lanes], dtype=float)
        if not lanes or not np.isfinite(now):
            return [], []
        tests = tests_for({"pH"}, self.stock.index)
        found: list[HoldPoint] = []
        behind: list[Draft] = []
        for sign, word, beyond in ((1.0, "above", "below"), (-1.0, "below", "above")):
            side = values[sign * (now - values) > 0]
            bounds = []
            for draft, level in zip(drafts, levels, strict=True):
                graded = level[lanes]
                dangerous = [value for value in side if graded[list(values).index(value)] >= DANGER]
                floor = DANGER if level[0] >= WARNING else WARNING
                grave = [value for value in side if graded[list(values).index(value)] >= floor]
                if dangerous:
                    nearest = max if sign > 0 else min
                    bounds.append((nearest(grave), nearest(dangerous), draft))
            if not bounds:
                continue
            bound = (max if sign > 0 else min)(grave for grave, _, _ in bounds)
            danger = (max if sign > 0 else min)(dangerous for _, dangerous, _ in bounds)
            safe = [value for value in side if sign * (value - bound) > 0]
            must = min(safe, key=lambda value: abs(value - bound)) if safe else now
            must = sign * np.ceil(sign * must * 10 - 1e-6) / 10  # to the safe side
            if not _READABLE[0] <= must <= _READABLE[1]:
                continue  # there the reserve of acid or base decides, which no strip shows
            drawn = [draft for _, _, draft in bounds]
            behind += drawn
            basis = f"At pH {figures(danger)} and {beyond}, this step brings {self._told(drawn)} to a danger"
            basis += "" if bound == danger else f", and to a warning from pH {figures(bound)}"
            basis += (
                f" (followed again with the vessel at {len(values)} pH values from {min(values):.1f} to {max(values):.1f}); "
                f"by the amounts written it stands at pH {now:.1f}."
            )
            if abs(now - must) < self.scale["strip-precision"]:
                basis += " That is closer than a strip can tell: use a meter, or bring the pH further off first."
            found.append(
                HoldPoint(
                    step=trace.number,
                    vessel=trace.vessel,
                    must=f"pH {word} {figures(must)}",
                    test=_test_words(tests[0].name, tests[0].procedure) if tests else "",
                    basis=basis,
                    sources=list(tests[0].sources) if tests else [],
                )
            )
        gases = [draft.tokens[0] for draft in behind if draft.kind == "toxic-gas"]
        return found, gases

    def _rests(
        self, trace: StepTrace, variants: list[_Variant], drafts: list[Draft], levels: list[NDArray[np.int_]]
    ) -> list[HoldPoint]:
        """What an earlier step took away, and which this step would make dangerous if it were still there."""
        found = []
        for lane, variant in enumerate(variants):
            if not variant.token:
                continue
            worse = [
                draft
                for draft, level in zip(drafts, levels, strict=True)
                if level[lane] >= DANGER and level[0] < DANGER
            ]
            if not worse:
                continue
            record = self.stock.species(variant.token)
            test = tests_for({record.report_key}, self.stock.index)[0]
            found.append(
                HoldPoint(
                    step=trace.number,
                    vessel=trace.vessel,
                    must=f"no {record.name or record.formula} left ({record.report_key})",
                    test=_test_words(test.name, f"{test.procedure} {test.reading}"),
                    basis=f"With as much of it as there was before it was treated, this step would bring {self._told(worse)} to a danger.",
                    sources=list(test.sources),
                )
            )
        return found

    def _temperature(self, trace: StepTrace) -> list[HoldPoint]:
        """How cool the vessel must be, where the step warms it much."""
        course = trace.path
        assert course is not None
        rise = float((course.reached_C - course.unreacted.temperature_C).max())
        if not np.isfinite(rise) or rise < self.scale["heat-warning"]:
            return []
        top = _BOILING_C - self.scale["boiling-margin"]
        must = top - rise
        start = float(course.unreacted.temperature_C.max())
        if must <= start:
            return []  # it comes too near to boiling as written: a finding, and nothing to test
        tests = tests_for({"temperature"}, self.stock.index)
        return [
            HoldPoint(
                step=trace.number,
                vessel=trace.vessel,
                must=f"temperature below {np.floor(must):.0f} degC",
                test=_test_words(tests[0].name, f"{tests[0].procedure} {tests[0].reading}") if tests else "",
                basis=f"The addition warms the vessel by up to {figures(rise)} K if no heat is lost; from {must:.0f} degC it would come within "
                f"{self.scale['boiling-margin']:g} K of boiling.",
                sources=list(tests[0].sources) if tests else [],
            )
        ]

    def _alarms(self, trace: StepTrace, gases: list[str]) -> list[HoldPoint]:
        tests = tests_for({"gas"}, self.stock.index)
        found = []
        for token in dict.fromkeys(gases):
            gas = self.stock.index.gases.get(token)
            if gas is None or not tests:
                continue
            limit = gas.ceiling or gas.idlh
            at = "" if limit is None else f" set to no more than {figures(limit.magnitude)} {limit.unit}"
            found.append(
                HoldPoint(
                    step=trace.number,
                    vessel=trace.vessel,
                    must=f"an alarm for {gas.name}{at} is running, and the hood draws",
                    test=_test_words(tests[0].name, f"{tests[0].procedure} {tests[0].reading}"),
                    basis="This gas comes if the pH above is missed."
                    + ("" if limit is None else " The limit is its short-term limit or, where it has none, its IDLH."),
                    sources=[*tests[0].sources, *([] if limit is None else [limit.source])],
                )
            )
        return found

    def _told(self, drafts: list[Draft]) -> str:
        """``a toxic gas (hydrogen sulfide)`` and so on, once each."""
        words = [
            f"{_DECIDED[draft.kind]} ({', '.join(name_of(token, self.stock) for token in draft.tokens)})"
            if draft.tokens
            else _DECIDED[draft.kind]
            for draft in drafts
        ]
        return " and ".join(dict.fromkeys(words))


def _test_words(name: str, how: str) -> str:
    return f"{name[:1].upper() + name[1:] if name[1:2].islower() else name}: {how}"
