"""From a walk to findings: every hazard of every step drafted, given its reaction paths and put into the report's form."""

from __future__ import annotations

import re

import numpy as np
from msgspec import Struct

from carboy.bench.trace import StepTrace
from carboy.bench.walk import Walk
from carboy.chemistry.stock import ChemicalStock
from carboy.hazards.draft import NOTE, Draft, Scale, course_of, worst_lane
from carboy.hazards.flagged import class_drafts
from carboy.hazards.gas import gas_drafts
from carboy.hazards.metals import remobilised_drafts
from carboy.hazards.physical import foam_drafts, heat_drafts, pressure_drafts
from carboy.hazards.sight import sights
from carboy.model.knowledge import Index
from carboy.model.report import Finding, PathStep, RuleSight, Signal
from carboy.model.rule import Rule
from carboy.reasoning.at_hand import RulesAtHand
from carboy.reasoning.equation import consumed_for
from carboy.reasoning.firing import SPEEDS
from carboy.reasoning.record import Node, Record

_SIGNALS: dict[int, Signal] = {1: "note", 2: "warning", 3: "danger"}
SIGNAL_ORDER = {"danger": 0, "warning": 1, "note": 2}
_MOMENT_ORDER = {"contact": 0, "during": 1, "after": 2, "storage": 3}
_VARIABLE = re.compile(r"\?(\w+)(?:\.\w+)?")


class Judgement(Struct):
    """Findings, and by how many grades of severity each stated range moves them in all."""

    findings: list[Finding]
    leverage: dict[str, float]


def in_order(findings: list[Finding]) -> list[Finding]:
    """By step, then gravity, then moment."""
    return sorted(findings, key=lambda one: (one.step, SIGNAL_ORDER[one.signal], _MOMENT_ORDER[one.moment], one.kind))


class Judge:
    """Judges walks by the rules and the thresholds of the graph."""

    def __init__(self, stock: ChemicalStock, rules: tuple[Rule, ...]) -> None:
        self.stock = stock
        self.index: Index = stock.index
        self.book = RulesAtHand(tuple(rule for rule in rules if rule.flags and not rule.off), stock)
        self.scale = Scale(stock.index)

    def judge(self, walk: Walk) -> Judgement:
        """All findings, one per kind, species, step and vessel, in the order of steps and of gravity; and what each range does to them."""
        found: list[Finding] = []
        leverage = dict.fromkeys(walk.ranges.variables, 0.0)
        last = {
            trace.vessel: trace.number for trace in walk.steps if trace.path is not None or trace.storage is not None
        }
        for trace in walk.steps:
            for draft in self._merged(self._drafts(trace)):
                if draft.kind == "incomplete" and (trace.number != last[trace.vessel] or not walk.aims):
                    draft.levels = np.minimum(
                        draft.levels, NOTE
                    )  # on the way to an aim, or without one, it is only told
                found.append(self._finding(draft, walk.record))
                if not draft.throughout or draft.level > NOTE:
                    levels = draft.levels.max(axis=1).astype(float)
                    for key in leverage:
                        leverage[key] += walk.ranges.leverage(key, levels)
        return Judgement(in_order(found), leverage)

    def findings(self, walk: Walk) -> list[Finding]:
        """The findings alone."""
        return self.judge(walk).findings

    def drafts(self, trace: StepTrace) -> list[Draft]:
        """Every hazard of one step with its severity in every lane, before it is put into words."""
        return self._merged(self._drafts(trace))

    def _drafts(self, trace: StepTrace) -> list[Draft]:
        if trace.path is None and trace.contact is None and trace.storage is None:
            return []
        computed = gas_drafts(trace, self.stock, self.scale)
        for drafts_of in (heat_drafts, foam_drafts, pressure_drafts, remobilised_drafts):
            looked_at = self.scale.afresh()
            for draft in drafts_of(trace, self.stock, looked_at):
                draft.thresholds = looked_at.used
                computed.append(draft)
        drafts = [*computed, *class_drafts(trace, self.book, self.stock, self.scale, computed)]
        if trace.before is None and trace.added is not None:
            # a bottle poured into an empty vessel is what it was; only what it does to the vessel, or in itself at once, is news
            drafts = [draft for draft in drafts if draft.level > NOTE]
        return drafts

    def _merged(self, drafts: list[Draft]) -> list[Draft]:
        """One draft per kind and species; the gravest leads, then the one along the path; the others lend rules and measures."""
        groups: dict[tuple[object, ...], list[Draft]] = {}
        for draft in drafts:
            if draft.level > 0:
                groups.setdefault((draft.kind, draft.tokens, draft.trace.number, draft.trace.vessel), []).append(draft)
        leaders = []
        for group in groups.values():
            group.sort(key=lambda one: (-one.level, ("path", "contact", "storage").index(one.where)))
            leader = group[0]
            for other in group[1:]:
                for rule in other.rules:
                    if rule not in leader.rules:
                        leader.rules.append(rule)
                        leader.bound_by[rule.id] = other.bound_by.get(rule.id, {})
                        leader.names = {**other.names, **leader.names}
                leader.equations += [one for one in other.equations if one not in leader.equations]
            leaders.append(leader)
        return leaders

    def finding_of(self, draft: Draft, record: Record) -> Finding:
        """A draft that was made elsewhere, as a finding with its reaction paths."""
        return self._finding(draft, record)

    # --- words -------------------------------------------------------------------------------------------------

    def _finding(self, draft: Draft, record: Record) -> Finding:
        paths = self._paths(draft, record)
        rule_ids = [rule.id for rule in draft.rules]
        controls = list(
            dict.fromkeys(
                [
                    *draft.controls,
                    *(_sentence(_filled(guard, draft.names)) for rule in draft.rules for guard in rule.guard),
                ]
            )
        )
        sources = list(dict.fromkeys([*draft.sources, *(key for rule in draft.rules for key in rule.cites)]))
        says = " ".join(dict.fromkeys(_sentence(_filled(rule.says, draft.names)) for rule in draft.rules))
        return Finding(
            rule=rule_ids[0] if rule_ids else f"{draft.kind}-by-amount",
            kind=draft.kind,
            signal=_SIGNALS[draft.level],
            step=draft.trace.number,
            vessel=draft.trace.vessel,
            moment=draft.moment,
            fractions=draft.span,
            holds="throughout" if draft.throughout else "in part",
            species=[self.plain_formula(token) for token in draft.tokens],
            amount_mol=draft.amount_range(),
            summary=draft.summary,
            says=says,
            path=paths[0] if paths else [],
            other_paths=paths[1:],
            measures=draft.measures,
            controls=controls,
            sources=sources,
            rules=rule_ids,
            speed=self._speed(draft),
            sight=self._sight(draft),
            thresholds=list(draft.thresholds),
        )

    def _speed(self, draft: Draft) -> str:
        """How fast it goes on in storage: the pace of the quickest of its rules that is slow."""
        if draft.moment != "storage":
            return ""
        slow = [rule.speed for rule in draft.rules if rule.speed in ("hours", "days")]
        return min(slow, key=SPEEDS.index) if slow else ""

    def _sight(self, draft: Draft) -> list[RuleSight]:
        course = course_of(draft)
        if course is None or not draft.rules or draft.level <= NOTE:
            return []
        lane = draft.lane
        if lane is None:
            size = draft.levels.astype(float) if draft.amount is None else draft.amount
            lane = worst_lane(draft.levels, size)
        return sights(draft.rules, draft.bound_by, course, draft.trace.surroundings, lane, self.stock)

    def plain_formula(self, token: str) -> str:
        """``H2S`` for the token of a species, gas, solid or substance."""
        record = self.index.species.get(token)
        if record is not None and record.formula:
            return record.formula
        substance = self.index.substances.get(token)
        if substance is not None:
            return substance.formula
        return token.removesuffix("(g)")

    # --- reaction paths ----------------------------------------------------------------------------------------

    def _paths(self, draft: Draft, record: Record) -> list[list[PathStep]]:
        number, vessel = draft.trace.number, draft.trace.vessel
        nodes: list[Node] = []
        rule = draft.rules[0].id if draft.rules else "equilibrium"
        for sort, equation, left, right in draft.equations:
            token = draft.tokens[0] if draft.kind != "remobilised" else right[0]
            target = self.stock.dissolved_form.get(token, token)
            if target in self.index.species and self.stock.kind(target) == "component":
                nodes += record.sources(vessel, target, number)  # made by a rule or brought by a label as it is
                continue
            drawn = consumed_for(
                self.stock, target, max(float(draft.amount.max()) if draft.amount is not None else 0.0, 1e-12)
            )
            watching = rule if sort == "equilibrium" and draft.rules and not draft.rules[0].does else "equilibrium"
            shown = (tuple(map(self.stock.label, left)), tuple(map(self.stock.label, right)))
            nodes.append(
                record.fired(vessel, watching, equation, drawn, {target: 1.0}, number, sort="equilibrium", shown=shown)
            )
        if not draft.equations:
            nodes += record.events_of(draft.cause_rule, number) if draft.cause_rule else []
            if not nodes and draft.rules:
                drawn = {}
                for token in draft.tokens:
                    if token in self.index.species or token in self.index.substances:
                        drawn.update(dict.fromkeys(consumed_for(self.stock, token, 1.0), 1.0))
                for name in self._bound_tokens(draft):
                    drawn.update(dict.fromkeys(consumed_for(self.stock, name, 1.0), 1.0))
                nodes.append(
                    record.fired(
                        vessel,
                        rule,
                        draft.rules[0].title,
                        drawn,
                        {},
                        number,
                        sort="equilibrium",
                        shown=(tuple(map(self.stock.label, drawn)), tuple(map(self.stock.label, draft.tokens))),
                    )
                )
        paths = [path for node in nodes for path in record.paths(node)]
        unique: list[list[PathStep]] = []
        for path in paths:
            if path not in unique:
                unique.append(path)
        return unique

    def _bound_tokens(self, draft: Draft) -> list[str]:
        return [
            token for token in draft.bound.values() if token in self.index.species or token in self.index.substances
        ]


def _sentence(text: str) -> str:
    """With a capital, where a word begins it: what a variable stands for may be a name, but also a formula or ``pH``."""
    first = text.split(" ", 1)[0]
    return text[:1].upper() + text[1:] if first.islower() or "(" in first else text


def _filled(text: str, names: dict[str, str]) -> str:
    """``?s`` in a rule's words replaced by what was bound."""
    return _VARIABLE.sub(lambda match: names.get("?" + match.group(1), names.get(match.group(1), match.group(0))), text)
