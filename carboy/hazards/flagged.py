"""What the rules say of a step: words for the hazards that were computed, and hazards known only by class."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np
from msgspec import Struct

from carboy.bench.trace import Course, StepTrace
from carboy.chemistry.mixture import TRACE, Array
from carboy.chemistry.relations import part_of
from carboy.chemistry.stock import ChemicalStock
from carboy.hazards.draft import DANGER, NOTE, WARNING, Draft, Levels, Scale, Where, courses, graded, worst_lane
from carboy.hazards.metals import element_of, limit_for
from carboy.hazards.numbers import figures
from carboy.hazards.workings import dissolved_measure, limit_measure, plain
from carboy.model.knowledge import Limit
from carboy.model.report import Measure
from carboy.model.rule import Bound, Flag, Kind, Present, Rule
from carboy.reasoning.at_hand import RulesAtHand
from carboy.reasoning.binding import Binding, Mask, View
from carboy.reasoning.firing import SPEEDS, Firing
from carboy.text.formulas import elements, molar_mass

GAS_KINDS: tuple[Kind, ...] = ("toxic-gas", "flammable-gas", "asphyxiant-gas", "oxygen")
COMPUTED: tuple[Kind, ...] = (*GAS_KINDS, "heat", "foam", "pressure", "remobilised")
_END_STATE_ONLY: tuple[Kind, ...] = ("incomplete", "remobilised")
Mark = tuple[str, int, tuple[tuple[str, str], ...]]  # one flag of one rule with what it bound
_GRADES = {"": DANGER, "danger": DANGER, "warning": WARNING, "note": NOTE}
_ANYWAY_AT_CONTACT: tuple[Kind, ...] = ("explosive", "fire")


class Raised(Struct):
    """One flag of one rule raised in a course: lanes and the grams that weigh it, ``[lanes]``."""

    rule: Rule
    flag: Flag
    bound: dict[str, str]
    mask: Mask
    grams: Array
    moles: Array
    firing: Firing | None


def raised_flags(
    course: Course, trace: StepTrace, where: str, book: RulesAtHand, stock: ChemicalStock
) -> Iterator[Raised]:
    """Every flag that a rule raises in a course."""
    after = View(course.mixture, trace.surroundings)
    start = View(course.unreacted, trace.surroundings)
    fired: dict[str, list[Firing]] = {}
    for firing in course.firings:
        fired.setdefault(firing.rule.id, []).append(firing)
    able = {rule.id for rule in book.of(after, start)}
    for rule in book.rules:
        if not (rule.id in fired if rule.does else rule.id in able):
            continue
        if rule.does:
            for firing in fired[rule.id]:
                for flag in rule.flags:
                    mask = firing.extent > TRACE
                    mask = _and_when(mask, flag, start, firing.bound, rule)
                    if mask.any():
                        grams, moles = _weight_of_firing(flag, firing, course, stock)
                        yield Raised(rule, flag, firing.bound, mask, grams, moles, firing)
            continue
        if SPEEDS.index(rule.speed) > SPEEDS.index("minutes") and where != "storage":
            continue
        for flag in rule.flags:
            views = (after,) if flag.kind in _END_STATE_ONLY else (after, start)
            seen: dict[tuple[tuple[str, str], ...], Raised] = {}
            for view in views:
                for names, mask, grams, moles in _matches(rule, flag, view, stock):
                    key = tuple(sorted(names.items()))
                    if key in seen:
                        seen[key].mask = seen[key].mask | mask
                        seen[key].grams = np.maximum(seen[key].grams, grams)
                        seen[key].moles = np.maximum(seen[key].moles, moles)
                    else:
                        seen[key] = Raised(rule, flag, names, mask, grams, moles, None)
            yield from seen.values()


def _matches(
    rule: Rule, flag: Flag, view: View, stock: ChemicalStock
) -> Iterator[tuple[dict[str, str], Mask, Array, Array]]:
    for binding in view.bindings(rule):
        mask = np.ones(view.mixture.lanes, dtype=bool)
        for condition in (*rule.needs, *flag.when):
            mask &= view.holds(condition, binding)
            if not mask.any():
                break
        if mask.any():
            grams, moles = _weight(rule, flag, view, binding, stock)
            yield (
                {variable: carrier.token for variable, carrier in binding.items()},
                mask,
                np.where(mask, grams, 0.0),
                np.where(mask, moles, 0.0),
            )


def _and_when(mask: Mask, flag: Flag, view: View, names: dict[str, str], rule: Rule) -> Mask:
    if not flag.when:
        return mask
    binding: Binding = {}
    for one in rule.needs:
        if isinstance(one, Bound):
            found = view.having((names[one.variable],), where=one.where)
            if found:
                binding[one.variable] = found[0]
    for condition in flag.when:
        mask = mask & view.holds(condition, binding)
    return mask


def _weight(rule: Rule, flag: Flag, view: View, binding: Binding, stock: ChemicalStock) -> tuple[Array, Array]:
    """Grams and mol of what judges the flag: the term it is weighed by, else the scarcest thing the rule needs."""
    terms = [flag.weighed_by] if flag.weighed_by else [one.variable for one in rule.needs if isinstance(one, Bound)]
    if not terms:
        terms = [one.term for one in rule.needs if isinstance(one, Present) and not one.negated]
    grams = np.full(view.mixture.lanes, np.inf)
    moles = np.full(view.mixture.lanes, np.inf)
    for term in terms:
        token = binding[term].token if term in binding else term
        amount = view.amount(term, binding)
        mass = stock.molar_mass(token) if token in stock.index.species or token in stock.index.substances else 0.0
        if mass:
            grams, moles = np.minimum(grams, amount * mass), np.minimum(moles, amount)
    whole = view.mixture.mass_g
    return np.where(np.isfinite(grams), grams, whole), np.where(np.isfinite(moles), moles, 0.0)


def _weight_of_firing(flag: Flag, firing: Firing, course: Course, stock: ChemicalStock) -> tuple[Array, Array]:
    made = dict(firing.reaction.products)
    used = dict(firing.reaction.reactants)
    term = flag.weighed_by or (flag.terms[0] if flag.terms else "")
    token = named_by(term, firing.bound, stock)
    if token in made or token in used:
        moles = (made.get(token) or used[token]) * firing.extent
        return moles * stock.molar_mass(token), moles
    masses = [
        count * firing.extent * stock.molar_mass(name)
        for name, count in firing.reaction.reactants
        if name not in ("H+", "OH-", "H2O")
    ]
    grams = np.minimum.reduce(masses) if masses else course.mixture.mass_g
    return grams, firing.extent


def class_drafts(
    trace: StepTrace, book: RulesAtHand, stock: ChemicalStock, scale: Scale, computed: list[Draft]
) -> list[Draft]:
    """Drafts for flags without a computed magnitude; flags with one lend their words to the drafts in ``computed``."""
    drafts: dict[tuple[str, ...], Draft] = {}
    stood: dict[bool, dict[Mark, float]] = {}
    for where, course in courses(trace):
        stored = where == "storage"
        if stored not in stood:
            stood[stored] = _standing(trace, book, stock, stored) if trace.added is not None else {}
        standing = stood[stored]
        for raised in raised_flags(course, trace, where, book, stock):
            flag = raised.flag
            if flag.kind in COMPUTED and _lend(raised, where, computed, stock, course):
                continue
            if flag.kind in ("foam", "remobilised") or (where == "contact" and flag.kind in _END_STATE_ONLY):
                continue
            if flag.kind == "heat" and not _heat_unknown(raised, course, stock):
                continue  # it was computed, and is too little for a line
            if flag.kind == "pressure" and (
                trace.cover != "sealed" or where == "contact" or any(one.kind == "pressure" for one in computed)
            ):
                continue
            if (
                flag.kind in GAS_KINDS
                and flag.terms
                and all(f"{_gas_of(term, raised.bound, stock)}(g)" in stock.formation for term in flag.terms)
            ):
                continue  # a gas whose amount is computed, and is too little for a line
            looked_at = scale.afresh()
            draft = _class_draft(raised, where, trace, course, stock, looked_at, standing)
            if draft is None:
                continue
            draft.thresholds = looked_at.used
            key = (draft.kind, *draft.tokens, raised.rule.id, "storage" if where == "storage" else "")
            known = drafts.get(key)
            if known is None or (known.where == where and draft.level > known.level):
                drafts[key] = draft
    return list(drafts.values())


def _heat_unknown(raised: Raised, course: Course, stock: ChemicalStock) -> bool:
    """Whether the graph lacks the very enthalpy that a rule's heat would be computed from: of its reaction, or of what it binds."""
    names = {name_of(token, stock) for token in raised.bound.values()} | {raised.rule.title}
    return bool(names.intersection(course.unknown_heat))


def named_by(term: str, bound: dict[str, str], stock: ChemicalStock) -> str:
    """The token that a flag's term stands for: a species, a bound variable, or a relation of one (``?m.metal``)."""
    variable, _, part = term.partition(".")
    if variable not in bound:
        return term
    return part_of(bound[variable], part, stock) or bound[variable]


def _gas_of(term: str, bound: dict[str, str], stock: ChemicalStock) -> str:
    return named_by(term, bound, stock).removesuffix("(g)")


def _mark(rule: Rule, flag: Flag, bound: dict[str, str]) -> Mark:
    return rule.id, rule.flags.index(flag), tuple(sorted(bound.items()))


def _standing(trace: StepTrace, book: RulesAtHand, stock: ChemicalStock, stored: bool) -> dict[Mark, float]:
    """Flags that stood already in the vessel or in the bottle, with the grams that weighed them; what each would do if left by itself
    stands whatever its weight."""
    stood: dict[Mark, float] = {
        _mark(firing.rule, flag, firing.bound): np.inf for firing in trace.left_firings for flag in firing.rule.flags
    }
    own = replace(trace.surroundings, container="", container_words=frozenset())  # its own bottle, which it stood
    for mixture in trace.left_alone if stored else (trace.before, trace.added):
        if mixture is None or not mixture.amounts:
            continue
        view = View(mixture, own)
        for rule in book.of(view):
            if rule.does:
                continue
            for flag in rule.flags:
                for names, mask, grams, _ in _matches(rule, flag, view, stock):
                    key = _mark(rule, flag, names)
                    stood[key] = max(stood.get(key, 0.0), float(grams[mask].max()))
    return stood


def _lend(raised: Raised, where: str, computed: list[Draft], stock: ChemicalStock, course: Course) -> bool:
    """Give a rule's words to the computed drafts of its kind; True if there was one."""
    lent = False
    for draft in computed:
        if draft.kind != raised.flag.kind or draft.where != where:
            continue
        if raised.flag.kind in GAS_KINDS:
            mine = {f"{_gas_of(term, raised.bound, stock)}(g)" for term in raised.flag.terms}
            if not mine.intersection(draft.tokens):
                continue
        if raised.flag.kind == "remobilised" and raised.flag.terms and not _same_element(raised, draft, stock):
            continue
        if not (course.table(raised.mask) & (draft.levels > 0)).any():
            continue
        lent = True
        if raised.rule not in draft.rules:
            draft.rules.append(raised.rule)
            draft.names.update({variable: name_of(token, stock) for variable, token in raised.bound.items()})
            draft.bound.update(raised.bound)
            draft.bound_by[raised.rule.id] = dict(raised.bound)
        if raised.firing is not None:
            draft.cause_rule = draft.cause_rule or raised.rule.id
    return lent


def _same_element(raised: Raised, draft: Draft, stock: ChemicalStock) -> bool:
    def elements(token: str) -> set[str]:
        record = stock.index.species.get(token)
        return (
            set()
            if record is None
            else {element for element in record.atoms if element not in ("H", "O", "C", "N", "S", "Cl", "I")}
        )

    mine = set().union(*(elements(named_by(term, raised.bound, stock)) for term in raised.flag.terms))
    theirs = set().union(*(elements(token) for token in draft.tokens))
    return not mine or bool(mine & theirs)


def name_of(token: str, stock: ChemicalStock) -> str:
    """The name of a species or substance as one says it."""
    record = stock.index.species.get(token)
    if record is not None and record.name:
        return record.name
    substance = stock.index.substances.get(token)
    return substance.name if substance is not None else token


class Shortfall(Struct, frozen=True):
    """A treatment that leaves something above its limit: mg/L and severity, ``[lanes]``."""

    element: str
    moles: Array
    litres: Array
    mg_L: Array
    levels: Levels
    limit: Limit


def _shortfall(raised: Raised, course: Course, stock: ChemicalStock, scale: Scale) -> Shortfall | None:
    """What stays dissolved of the component that an ``incomplete`` flag names, against its limit; None where the graph has no limit."""
    for term in raised.flag.terms:
        token = named_by(term, raised.bound, stock)
        record = stock.index.species.get(token)
        if record is None or not record.report_key:
            continue
        limit = limit_for(record.report_key, stock.index.limits)
        element = element_of(record.report_key)
        if limit is None or element not in elements():
            continue
        moles = course.mixture.dissolved(token) * record.atoms.get(element, 1.0)
        volume = np.maximum(course.mixture.volume_L, 1e-9)
        strength = np.where(raised.mask, 1000 * moles * molar_mass({element: 1.0}) / volume, 0.0)
        worst = limit.value.magnitude
        levels = graded(strength, worst, worst, scale["remobilised-danger-factor"] * worst)
        return Shortfall(element, moles, volume, strength, levels, limit)
    return None


def _needed(rule: Rule, view: View, stock: ChemicalStock) -> tuple[str, ...]:
    """The things that a rule's ``present`` conditions find, for a flag that names none and binds none."""
    found: list[str] = []
    for one in rule.needs:
        if isinstance(one, Present) and not one.negated:
            known = one.term in stock.index.species or one.term in stock.index.substances
            found += [one.term] if known else [carrier.token for carrier in view.having((one.term,), where=one.where)]
    return tuple(dict.fromkeys(found))


def _class_draft(
    raised: Raised,
    where: Where,
    trace: StepTrace,
    course: Course,
    stock: ChemicalStock,
    scale: Scale,
    standing: dict[Mark, float],
) -> Draft | None:
    flag, rule = raised.flag, raised.rule
    grams = np.where(raised.mask, raised.grams, 0.0)
    shortfall: Shortfall | None = None
    if flag.kind == "explosive":
        levels = graded(
            grams,
            0.01 * scale["energetic-warning-amount"],
            scale["energetic-warning-amount"],
            scale["energetic-danger-amount"],
        )
    elif flag.kind == "incomplete":
        shortfall = _shortfall(raised, course, stock, scale)
        levels = np.full(course.mixture.lanes, WARNING) if shortfall is None else shortfall.levels
    elif flag.kind in ("attack", "pressure"):
        levels = np.full(course.mixture.lanes, WARNING)
    else:
        levels = graded(
            grams,
            0.01 * scale["reactive-trace-amount"],
            scale["reactive-trace-amount"],
            scale["reactive-danger-amount"],
        )
    levels = np.where(raised.mask, np.minimum(levels, _GRADES[flag.grade]), 0)
    stood = standing.get(_mark(rule, flag, raised.bound))
    if (
        stood is not None
        and (raised.firing is None or np.isinf(stood))
        and float(grams.max()) <= scale["markedly-worse-factor"] * max(stood, 1e-12)
    ):
        levels = np.minimum(levels, NOTE)
    if flag.kind == "heat" or (where == "contact" and flag.kind not in _ANYWAY_AT_CONTACT):
        levels = np.minimum(levels, WARNING)
    moment = flag.moment or rule.moment
    if moment == "storage" and where == "contact":
        return None
    levels = course.table(levels)
    if flag.kind in _END_STATE_ONLY and where == "path":
        levels = np.where(np.arange(course.points) == course.points - 1, levels, 0)
    if not levels.any():
        return None
    terms = (
        tuple(named_by(term, raised.bound, stock) for term in flag.terms)
        or tuple(dict.fromkeys(raised.bound.values()))
        or _needed(rule, View(course.unreacted, trace.surroundings), stock)
    )
    names = {variable: name_of(token, stock) for variable, token in raised.bound.items()}
    subject = flag.words or ", ".join(name_of(term, stock) for term in terms)
    if flag.kind == "heat" and not flag.words:
        subject = f"heat, which the graph has no figure for; {subject}"
    weight = float(grams.max())
    lane = int(np.argmax(grams))
    measures: list[Measure] = []
    summary = f"{rule.title}{': ' + subject if subject else ''}."
    if shortfall is not None:
        lane = worst_lane(levels, course.table(shortfall.mg_L))
        left = float(shortfall.mg_L[lane])
        limit = shortfall.limit.value.magnitude
        summary = f"{rule.title}: {figures(left)} mg/L of {shortfall.element} stay dissolved, against a limit of {limit:g} mg/L."
        measures = [
            dissolved_measure(
                shortfall.element, left, float(shortfall.moles[lane]), float(shortfall.litres[lane]), "equilibrium"
            ),
            limit_measure(shortfall.element, shortfall.limit),
        ]
    elif weight > 0 and flag.kind not in ("attack", "incomplete", "pressure"):
        summary = f"{summary[:-1]} ({figures(weight)} g at stake)."
        moles = float(raised.moles[lane])
        measures = [
            Measure(
                quantity="amount at stake",
                value=weight,
                unit="g",
                basis="what the flag is weighed by" if flag.weighed_by else "the scarcest of what the rule needs",
                equation="m = n x M" if moles else "",
                inputs=[plain("n", moles, "mol"), plain("M", weight / moles, "g/mol")] if moles else [],
            )
        ]
    draft = Draft(
        flag.kind,
        terms,
        levels,
        course.fractions,
        "storage" if moment == "storage" else where,
        trace,
        summary,
        None,
        measures,
        rules=[rule],
        names=names,
        bound=dict(raised.bound),
        bound_by={rule.id: dict(raised.bound)},
        lane=lane,
    )
    if raised.firing is not None:
        draft.amount = course.table(np.where(raised.mask, raised.moles, 0.0))
        draft.cause_rule = rule.id
    elif flag.kind in GAS_KINDS:
        draft.amount = course.table(np.where(raised.mask, raised.moles, 0.0))
        draft.at_most = True
    return draft
