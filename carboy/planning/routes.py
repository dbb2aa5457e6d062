"""Routes for a waste: sequences from the graph of states, made into procedures, vetted, and ranked."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from io import StringIO
from typing import Any

import numpy as np

from carboy.bench.walk import Walk
from carboy.chemistry.mixture import TRACE, Mixture
from carboy.errors import InputError
from carboy.hazards.steps import pair
from carboy.model.knowledge import Index
from carboy.model.plan import Goal, Portion
from carboy.model.report import Report
from carboy.model.treatment import Rejected, Route, RouteStep, Stream, TreatReport
from carboy.planning.liquid import counted_mass, hazards_of, said, unknown_metals
from carboy.planning.procedure import WASTE, Builder, CannotDo, Procedure, Vetter
from carboy.planning.search import PH, State, must_go, reachable, sequences
from carboy.text.case_writer import quantity_text
from carboy.text.cases import case_from_mapping
from carboy.text.goals import parse_goal
from carboy.text.portions import parse_portion

CAUTIONS = (
    "This is a screening aid, not a permit: a qualified person reads every step before the first drop.",
    "Treating hazardous waste needs a permit (40 CFR 264, 265 and 270) unless an exclusion holds: treatment in the accumulation container "
    "(40 CFR 262), elementary neutralisation of what is a waste for its pH alone (40 CFR 264.1(g)(6), 270.1(c)(2)(v)). The state may be stricter.",
    "What goes to the sewer needs the consent of its authority (40 CFR 403.5); a limit met here is not that consent.",
    "Sludge, filters, gloves and rinses from it leave by a licensed contractor, with the waste they come from on the label (40 CFR 262, 268).",
    "Try it on a hundredth of the waste first, and measure what the label does not say.",
)
NEUTRALISATION = "Only the pH makes this a waste: the elementary neutralisation exclusion may hold (40 CFR 264.1(g)(6)); ask the site."
LIQUID_GOES_TO = "the sewer, where its authority allows, or a contractor"
SOLID_GOES_TO = "a contractor, moist and apart from acid and bleach, unless an analysis shows it harmless"
DEFAULT_SETTING = {"place": "hood", "hood_flow": "0.4 m3/s", "temperature": "22 degC"}
_TRIED = 10  # sequences made into procedures
_LISTED = 60  # sequences looked through for those
_OFFERED = 3
_OFFERED_ALIKE = 2  # of those that take the hazards of the waste in the same way and differ in what follows
_TRIED_ALIKE = 4
_PATIENCE = ((1.0, 1.0), (4.0, 2.5))  # how much slower and roomier each try is
_CURED_BY_PATIENCE = frozenset({"foam", "heat", "asphyxiant-gas", "pressure", "oxygen", "toxic-gas"})
_SHOWN = 1e-3  # mg/L

Progress = Callable[[int, int], None]


def find_routes(
    lab: Vetter,
    waste: str,
    aim: str | None = None,
    setting: Mapping[str, Any] | None = None,
    progress: Progress | None = None,
    *,
    _split_before: bool = False,
) -> TreatReport:
    """Routes for the waste that ``waste`` describes like a label. ``aim``: a further goal, ``dissolved mercury below 0.2 mg/L``.

    Raises InputError where the waste or the aim cannot be read.
    """
    portion = parse_portion(waste, lab.names)
    goal = _aim(aim, lab) if aim else None
    places = dict(DEFAULT_SETTING if setting is None else setting)
    blank = TreatReport(waste=waste, outcome="cannot say", hazards=[], cautions=list(CAUTIONS))
    if portion.unrecognised:
        blank.unrecognised = [item.words for item in portion.unrecognised]
        blank.reasons = [
            "What is not known cannot be treated: every reagent may be the wrong one. Have it analysed, or leave it closed to a contractor."
        ]
        return blank
    builder = Builder(lab, waste, places)
    content = builder.waste_alone()
    if content.solved is None and not content.aside:
        raise InputError(f"'{waste}' is not a liquid in water; dissolve or name its solution first")
    state = hazards_of(content, lab.stock)
    report = blank.model_copy(update={"hazards": said(state, lab.index.hazards)})
    report.remains = said(state - must_go(lab.index), lab.index.hazards)
    report = _searched(report, state, content, builder, lab, goal, progress)
    part = "" if report.routes or _split_before else _part(portion, builder.portions, lab)
    if part:
        split = find_routes(lab, part, aim, setting, progress, _split_before=True)
        if split.routes:
            split.reasons.insert(
                0,
                f"It is too much for one batch on the bench. These routes are for one of {builder.portions} equal portions, "
                f"{part.partition(' of ')[0]} each; every portion is treated by itself.",
            )
            return split.model_copy(update={"waste": waste})
    return report


def _part(portion: Portion, parts: int, lab: Vetter) -> str:
    """One of so many equal parts of a waste as a label has it; empty where it cannot be said, or need not."""
    words = portion.text.partition(" of ")[2]
    if parts < 2 or not words or portion.unit == "mol":
        return ""
    text = f"{quantity_text(portion.amount.times(1.0 / parts), portion.unit)} of {words}"
    same = [item.model_dump() for item in parse_portion(text, lab.names).ingredients] == [
        item.model_dump() for item in portion.ingredients
    ]  # but for where they stand in the text
    return text if same else ""


def _searched(
    report: TreatReport,
    state: State,
    content: Mixture,
    builder: Builder,
    lab: Vetter,
    goal: Goal | None,
    progress: Progress | None,
) -> TreatReport:
    metals = unknown_metals(content, lab.stock)
    if metals:
        report.reasons.append(
            f"No treatment is recorded for {', '.join(metals)}: this leaves untreated by a contractor."
        )
        return report
    refused = [item for item in lab.index.untreatable.values() if set(item.hazards) & state]
    if refused:
        report.outcome = "no sound treatment"
        report.reasons += [f"{item.name[0].upper()}{item.name[1:]}: {item.reason}" for item in refused]
        return report
    if not state & must_go(lab.index):
        report.outcome = "nothing to treat"
        return report
    report.outcome = "no sound treatment"
    found: list[Route] = []
    queue = list(sequences(state, lab.index, _LISTED))
    tried: list[tuple[str, ...]] = []
    longer: set[tuple[str, ...]] = set()
    alike: dict[frozenset[str], tuple[int, int]] = {}  # tried and offered
    while queue and len(tried) < _TRIED and len(found) < _OFFERED:
        sequence = queue.pop(0)
        if sequence in tried or any(set(route.treatments) <= set(sequence) for route in found):
            continue  # the same with something needless added
        manner = _manner(sequence, state, lab.index)
        tries, offers = alike.get(manner, (0, 0))
        if tries >= _TRIED_ALIKE or offers >= _OFFERED_ALIKE:
            continue
        tried.append(sequence)
        alike[manner] = (tries + 1, offers)
        if progress is not None:
            progress(len(tried), _TRIED)
        attempt = _tried(sequence, state, builder, lab, goal)
        if isinstance(attempt, Route):
            if all(route.case_file != attempt.case_file for route in found):
                found.append(attempt)
                alike[manner] = (tries + 1, offers + 1)
            continue
        report.rejected.append(attempt.rejected)
        # what the records did not foresee: go on from where it ended, once
        if attempt.left and attempt.left != state and sequence not in longer:
            further = next(sequences(attempt.left, lab.index, 1), ())
            if further and not set(further) & set(sequence):
                queue.insert(0, (*sequence, *further))
                longer.add(queue[0])
    if found:
        report.outcome = "routes found"
        report.routes = sorted(found, key=lambda route: route.cost)
        if state <= {"acid", "base"}:
            report.cautions.insert(1, NEUTRALISATION)
    elif unheld := _not_calculated(tried, lab.index):
        report.outcome = "cannot say"
        report.reasons += ["The published treatment cannot be confirmed by this calculation.", *unheld]
    elif tried and builder.open_ranges():
        report.outcome = "cannot say"
        report.reasons.append(
            "The label leaves open how much there is: "
            + "; ".join(builder.open_ranges())
            + ". No one amount of reagent fits both ends. Measure it, and ask again with the figure."
        )
    elif tried:
        report.reasons.append(
            "None of the treatments of the graph reaches a safe end by way of steps that vet clean; what stood in the way is told for each."
        )
    else:
        stuck = reachable(state, lab.index)
        report.reasons.append(
            "No sequence of the recorded treatments fits: "
            + (
                f"{', '.join(said(stuck, lab.index.hazards))} would stay."
                if stuck
                else "each is forbidden by something else in the liquid."
            )
        )
        report.reasons += _in_the_way(stuck, state, lab.index)
    return report


def _manner(sequence: tuple[str, ...], state: State, index: Index) -> frozenset[str]:
    """The treatments of a sequence that take what the waste holds, the pH aside where there is more."""
    meant = state & must_go(index)
    meant = meant - set(PH) or meant
    return frozenset(key for key in sequence if meant & set(index.treatments[key].takes))


def _in_the_way(stuck: State, state: State, index: Index) -> list[str]:
    """For each hazard that stays, what keeps its treatments from being done."""
    words = []
    for key in sorted(stuck - set(PH) or stuck):
        takers = [treatment for treatment in index.treatments.values() if key in treatment.takes]
        against = state & frozenset(other for treatment in takers for other in treatment.forbidden_by)
        if takers and against:
            name = index.hazards[key].name
            words.append(
                f"{name[0].upper()}{name[1:]}: its treatments ({'; '.join(treatment.name for treatment in takers)}) "
                f"are not sound beside {', '.join(said(against, index.hazards))}."
            )
    if words:
        words.append("It leaves closed, with all of it on the label, by a contractor.")
    return words


def _not_calculated(tried: list[tuple[str, ...]], index: Index) -> list[str]:
    """What the treatments that were tried rest on beyond the equilibria."""
    words = (index.treatments[key].not_calculated for sequence in tried for key in sequence)
    return [text for text in dict.fromkeys(words) if text]


def _aim(text: str, lab: Vetter) -> Goal:
    goal = parse_goal(text, lab.names)
    if goal.vessel:
        raise InputError("the aim names no vessel here; it is the last liquid that is meant")
    return goal


@dataclass(frozen=True)
class _Attempt:
    """A procedure that is not offered; ``left`` are the hazards at its end where nothing but these stood against it."""

    rejected: Rejected
    left: State = frozenset()


def _tried(
    sequence: tuple[str, ...], state: State, builder: Builder, lab: Vetter, goal: Goal | None
) -> Route | _Attempt:
    names = [lab.index.treatments[key].name for key in sequence]
    reasons: list[str] = []
    left: State = frozenset()
    for slower, roomier in _PATIENCE:
        try:
            made = builder.build(sequence, slower=slower, roomier=roomier)
        except CannotDo as problem:
            return _Attempt(Rejected(names=names, reasons=[f"{problem}."]))
        mapping = made.mapping(_goals(sequence, state, made, lab.index, goal))
        case = case_from_mapping(mapping, lab.names)
        report = lab.vet(case)
        walk = lab.walk(case)
        reasons = _objections(report, walk, made, lab)
        if not reasons:
            return _route(sequence, made, mapping, lab.vet(case, hold_points=True), walk, lab)
        dangers = [finding for finding in report.findings if finding.signal == "danger"]
        if not dangers:
            left = hazards_of(walk.vessels[made.vessel].content, lab.stock) & must_go(lab.index)
        if not any(finding.kind in _CURED_BY_PATIENCE for finding in dangers):
            break
    return _Attempt(Rejected(names=names, reasons=reasons), left)


def _goals(sequence: tuple[str, ...], state: State, made: Procedure, index: Index, aim: Goal | None) -> list[str]:
    """What must hold of the last liquid: the level of every hazard that was there or came on the way."""
    wanted = set(state)
    for key in sequence:
        wanted |= set(index.treatments[key].leaves)
    texts = []
    aimed = (aim.subject, aim.subject.split("(")[0]) if aim is not None else ()
    for key in sorted(wanted & must_go(index)):
        hazard = index.hazards[key]
        for token in hazard.species:
            subject = index.species[token].report_key
            if hazard.above is None or subject == token or subject.split("(")[0] in aimed:
                continue  # what the goals have no name for is judged on the last liquid itself
            texts.append(f"dissolved {subject} in {made.vessel} below {hazard.above.magnitude:g} mg/L")
    low, high = index.hazards.get("acid"), index.hazards.get("base")
    if low is not None and low.pH_low is not None and high is not None and high.pH_high is not None:
        texts.append(f"pH in {made.vessel} between {low.pH_low.magnitude:g} and {high.pH_high.magnitude:g}")
    if aim is not None:
        texts.append(_with_vessel(aim, made.vessel))
    return texts


def _with_vessel(aim: Goal, vessel: str) -> str:
    """The aim as a goal of the case: the words before the window, the vessel, the window."""
    words = aim.text
    for start in (" below ", " above ", " between ", " at most ", " at least ", " under ", " over "):
        place = words.lower().find(start)
        if place > 0:
            return f"{words[:place]} in {vessel}{words[place:]}"
    return words


def _objections(report: Report, walk: Walk, made: Procedure, lab: Vetter) -> list[str]:
    """Why a procedure is not offered; empty where nothing stands against it."""
    words = [f"Step {finding.step}: {finding.summary}" for finding in report.findings if finding.signal == "danger"]
    words += [
        f"Not reached: {goal.goal}{_had(goal.value, goal.unit)}." for goal in report.goals if goal.met is not True
    ]
    if report.verdict == "cannot say":
        words.append("The calculation does not settle.")
    left = hazards_of(walk.vessels[made.vessel].content, lab.stock) & must_go(lab.index)
    told = " ".join(words)
    words += [
        f"Still in the liquid: {name}." for name in said(left, lab.index.hazards) if name not in told and not words
    ]
    if report.verdict == "refuse" and not words:
        words.append("The procedure is refused.")
    return list(dict.fromkeys(words))


def _had(value: tuple[float, float] | None, unit: str) -> str:
    if value is None:
        return ""
    low, high = value
    figures = f"{low:.3g}" if low == high or f"{low:.3g}" == f"{high:.3g}" else f"{low:.3g} to {high:.3g}"
    return f", it is {figures}" + ("" if unit == "pH" else f" {unit}")


def _route(
    sequence: tuple[str, ...], made: Procedure, mapping: dict[str, Any], report: Report, walk: Walk, lab: Vetter
) -> Route:
    done = [
        key for key in sequence if any(key == treatment for treatment, _ in made.origin)
    ]  # not those that found nothing to do
    treatments = [lab.index.treatments[key] for key in done]
    streams = _streams(made, walk, lab)
    warned = [finding for finding in report.findings if finding.signal == "warning"]
    sludge = sum(high for stream in streams for _, high in stream.solids_g.values())
    return Route(
        treatments=done,
        names=[item.name for item in treatments],
        vessel_L=made.size_L,
        steps=[
            RouteStep(step=place.step, action=_said_step(step, words), treatment=treatment, pH=place.pH, test=test)
            for step, words, place, (treatment, test) in zip(
                made.steps, made.words, report.steps, made.origin, strict=True
            )
        ],
        streams=streams,
        sludge_g=sludge,
        dangers=list(dict.fromkeys(danger for item in treatments for danger in item.dangers)),
        notes=[item.note for item in treatments if item.note],
        sources=sorted({source for item in treatments for source in item.sources}),
        # fewest steps, least sludge (a step for each 20 g), the mildest reagents, and least to mind on the way
        cost=len(made.steps) + sludge / 20.0 + 1.5 * (sum(item.harshness for item in treatments) + len(warned)),
        case_file=_yaml(mapping),
        report=report,
    )


def _said_step(step: Mapping[str, str], words: str) -> str:
    if "add" in step:
        over = f" over {step['over']}" if "over" in step else ""
        return f"add {'the ' if step['add'] == WASTE else ''}{words or step['add']} to the {step['to']}{over}"
    if "filter" in step:
        return f"filter the {step['filter']}: {step['cake']} on the filter, clear liquid to the {step['filtrate']}"
    action = next(iter(step))
    return f"{action} {step[action]}" + (f" in the {step['in']}" if "in" in step else "")


def _streams(made: Procedure, walk: Walk, lab: Vetter) -> list[Stream]:
    streams = []
    ending = made.origin[-1][0]
    rest = lab.index.treatments[ending].goes_to if ending and not made.cakes else LIQUID_GOES_TO
    for vessel, kind, goes in (
        *((name, "sludge", lab.index.treatments[key].goes_to if key else SOLID_GOES_TO) for name, key in made.cakes),
        (made.vessel, "liquid", rest),
    ):
        content = walk.vessels[vessel].content
        solids = {
            lab.stock.label(token): amount * lab.stock.molar_mass(token) for token, amount in content.solids.items()
        }
        for token, amount in content.aside.items():
            if lab.stock.species(token).phase == "s":
                solids[lab.stock.label(token)] = amount * lab.stock.molar_mass(token)
        dissolved = {}
        if kind == "liquid":
            for token in content.dissolvable:
                record = lab.stock.species(token)
                if not record.report_key or not _worth_telling(token, lab):
                    continue
                strength = (
                    1000
                    * content.dissolved(token)
                    * counted_mass(token, lab.stock)
                    / np.maximum(content.volume_L, 1e-9)
                )
                if np.any(strength > _SHOWN):
                    dissolved[record.report_key] = pair(strength)
        streams.append(
            Stream(
                vessel=vessel,
                kind=kind,  # type: ignore[arg-type]
                volume_L=pair(content.volume_L),
                pH=None if content.solved is None or kind == "sludge" else pair(content.pH),
                mg_L=dissolved,
                solids_g={key: pair(grams) for key, grams in sorted(solids.items()) if np.any(grams > TRACE)},
                goes_to=goes,
            )
        )
    return streams


def _worth_telling(token: str, lab: Vetter) -> bool:
    return any(token in hazard.species for hazard in lab.index.hazards.values())


def _yaml(mapping: dict[str, Any]) -> str:
    from ruamel.yaml import YAML  # only a route that is written out needs it

    writer = YAML()
    writer.width = 120
    text = StringIO()
    writer.dump(mapping, text)
    return text.getvalue()
