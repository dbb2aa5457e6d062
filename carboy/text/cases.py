"""Case files: bottles, vessels, steps, goals and expectations, as a :class:`~carboy.model.plan.Case`.

A case is YAML. Every name is looked up while it is read, and the bottles are kept account of, so that a step which
takes from a bottle that does not exist, or more than is in it, is an error at its line. With no ``vessels`` there is
one open glass vessel (its ``volume`` is None: twice the final volume); filtering and decanting make new vessels of the
names given, or ``cake`` and ``filtrate``.

Besides what the bench language shows: ``half of``, ``the rest of`` and ``all of`` a bottle; ``stir: 10 min``; a step
of one word (``- stir``); ``heel`` and ``part`` of a transfer; a vessel written as its volume (``tank: 20 L``).

A filter may have ``retained`` (mL of liquid per g of solid) and ``passes`` (share of the solids that runs through),
``first_runnings: 200 mL`` (which hold all that passes) with ``runnings``, the vessel they go to; ``aid: 20 g`` (filter aid,
which stays with the cake) and ``paper: 5 g`` with ``waste``, the bin that it goes to (``contaminated solids``). Both hold
liquid; ``20 g, 3 mL/g`` says how much. ``settle: 2 h`` lets solids sink before a ``decant``. ``wash: cake-1`` (or ``rinse``)
``with: 50 mL of water`` ``to: washings``; without ``to`` the rinse stays where it is. ``sample: 20 mL from tank`` ``to: vial``.
``wipe: tank`` ``with: 10 g of paper`` (or ``20 g of nitrile gloves, 0.2 mL/g``) ``to: bin``.

``limits`` are those of the site, ``mercury: 0.05 mg/L`` or ``pH: 6 to 9``; goals may name them (``total mercury in jug below
the site limit``) or take them all (``jug meets the site limits``).
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Literal, get_args

from msgspec import Struct

from carboy.errors import InputError
from carboy.model.plan import (
    Absorbent,
    Add,
    Case,
    Check,
    Cover,
    Expectation,
    Filter,
    Goal,
    Interval,
    Portion,
    Rinse,
    Setting,
    Step,
    Temper,
    Transfer,
    VesselSpec,
    Wait,
    Wipe,
)
from carboy.model.report import Moment, Signal, Verdict
from carboy.model.rule import Kind
from carboy.span import Span
from carboy.text.documents import MOST_CHARACTERS, Node, from_data, read_yaml
from carboy.text.goals import Target, goal_of, parse_target
from carboy.text.passages import Passage, closest
from carboy.text.portions import NameLookup, parse_portion
from carboy.text.quantities import Dimension, begins_quantity, parse_quantity, read_quantity

CASE_KEYS = ("title", "setting", "bottles", "vessels", "steps", "limits", "goals", "expect")
SETTING_KEYS = ("place", "hood_flow", "room_volume", "air_changes", "temperature")
VESSEL_KEYS = ("volume", "material", "cover", "rating", "holds")
PLACES = ("hood", "bench", "room", "outdoors", "glovebox", "cabinet", "store")
COVERS: tuple[str, ...] = ("open", "loose", "vented", "sealed")
STEP_KEYS: dict[str, tuple[str, ...]] = {
    "add": ("to", "over"),
    "filter": (
        "cake",
        "filtrate",
        "retained",
        "passes",
        "aid",
        "paper",
        "waste",
        "first_runnings",
        "runnings",
    ),
    "decant": ("to", "cake", "filtrate", "retained", "passes"),
    "transfer": ("to", "part", "heel", "over"),
    "sample": ("to",),
    "rinse": ("with", "to", "retained"),
    "wash": ("with", "to", "retained"),
    "wipe": ("with", "to"),
    "heat": ("in", "to"),
    "cool": ("in", "to"),
    "wait": ("in", "for"),
    "stand": ("in", "for"),
    "settle": ("in", "for"),
    "stir": ("in", "for"),
    "seal": ("in",),
    "open": ("in",),
    "vent": ("in",),
    "check": ("in",),
}
EXPECT_KEYS = (
    "step",
    "kind",
    "species",
    "signal",
    "moment",
    "rule",
    "absent",
    "verdict",
    "quantity",
    "between",
    "above",
    "below",
    "goal",
    "met",
    "words",
    "known_failure",
)
NUMBERS_OF_A_STEP = (
    "pH",
    "temperature_C",
    "gauge_kPa",
    "volume_L",
    "dissolved_mol",
    "solids_mol",
    "gas_mol",
    "amount_mol",
)
_WITH_SPECIES = ("dissolved_mol", "solids_mol", "gas_mol")
DEFAULT_VESSEL = "vessel"
WASTE = "contaminated solids"  # the bin for paper and the like where none is named
_LARGEST_VESSEL = 1e5  # L
_LONGEST_TIME = 3.2e9  # s, a hundred years
_LONGEST_NAME = 80

_FROM = re.compile(r"(?P<part>\S.*?)\s+(?:from|out of|of)\s+(?:the\s+)?(?P<source>\S.*)", re.IGNORECASE)
_ABSORBENT = re.compile(
    r"\s*(?P<amount>[^,]*?\d\s*(?:mg|g|kg))\s*(?:of\s+(?P<what>[^,]+?))?\s*"
    r"(?:,\s*(?P<holds>\d+(?:\.\d+)?)\s*(?:mL|ml)\s*(?:/|per)\s*g)?\s*"
)
_MEETS = re.compile(
    r"\s*(?P<vessel>\S.*?)\s+(?:meets|keeps|is within)\s+(?:the\s+)?(?:site|discharge|site's own)\s+limits?\s*",
    re.IGNORECASE,
)
_PAPERY = re.compile(r"paper|towel|cloth|tissue|wipe|filter aid|filter pad", re.IGNORECASE)
_MOST_HELD = 100.0  # mL per g
_SHARES = {"all": 1.0, "half": 0.5, "a half": 0.5, "a third": 1 / 3, "a quarter": 0.25}
_REST = ("rest", "the rest", "remainder", "the remainder", "what is left")


def read_case(source: str | Path, names: NameLookup, *, file: str = "") -> Case:
    """The case in a file, or in a text.

    ``source``: a Path, a text of several lines, or the name of a file. ``names`` knows the graph's names. ``file`` is
    what errors call a text.
    Raises InputError with file, line and column for anything that cannot be read.
    """
    if isinstance(source, str) and ("\n" in source or ": " in source):
        return _CaseReader(names, file).case(read_yaml(source, file))
    path = Path(source)
    text = _contents(path)
    return _CaseReader(names, file or str(source)).case(read_yaml(text, file or str(source)))


def case_from_mapping(data: Mapping[str, Any], names: NameLookup, *, file: str = "") -> Case:
    """The case in dicts, lists and texts that are laid out as a case file.

    Raises InputError; its place is the path of the entry.
    """
    return _CaseReader(names, file).case(from_data(data, file))


def setting_from_mapping(data: Mapping[str, Any]) -> Setting:
    """A Setting from ``{"place": "hood", "hood_flow": "0.4 m3/s"}`` and the like. Raises InputError."""
    return _setting(from_data(data, "setting"))


def vessel_from_mapping(name: str, data: Mapping[str, Any] | str, names: NameLookup) -> VesselSpec:
    """A vessel from ``{"volume": "20 L", "material": "HDPE", "cover": "open"}`` or from its volume alone.

    Raises InputError.
    """
    return _CaseReader(names, "").vessel(name, from_data(data, "vessel"))


def combine_case(
    portions: Sequence[str],
    names: NameLookup,
    setting: Setting | None = None,
    vessel: VesselSpec | None = None,
) -> Case:
    """The case in which the portions are poured one after the other into one vessel; step 1 is the first.

    Raises InputError.
    """
    if not portions:
        raise InputError("at least one portion is needed, such as '500 mL of acetone'")
    vessel = vessel or VesselSpec(name=DEFAULT_VESSEL)
    read = [parse_portion(text, names) for text in portions]
    steps = tuple(Add(portion=portion, to=vessel.name) for portion in read)
    return Case(
        title=" + ".join(portion.text for portion in read), setting=setting or Setting(), vessels=(vessel,), steps=steps
    )


def _contents(path: Path) -> str:
    try:
        if not path.exists():
            raise InputError(f"the case file '{path}' does not exist")
        if not path.is_file():
            raise InputError(f"'{path}' is no file")
        if path.stat().st_size > 4 * MOST_CHARACTERS:
            raise InputError(f"the case file '{path}' is too large to be one")
        return path.read_bytes().decode("utf-8")
    except UnicodeDecodeError as error:
        raise InputError(f"the case file '{path}' is not UTF-8 text (byte {error.start + 1})") from None
    except (OSError, ValueError) as error:  # ValueError: a null character in the name
        raise InputError(
            f"the case file '{path}' cannot be read: {getattr(error, 'strerror', None) or error}"
        ) from None


def _span(passage: Passage) -> Span:
    return passage.span(0, len(passage.text))


def _setting(node: Node) -> Setting:
    entries = node.named("the setting", SETTING_KEYS)
    values: dict[str, Any] = {}
    for key, (_, value) in entries.items():
        if key == "place":
            word = value.worded("the place").text.strip().lower()
            word = {"fume hood": "hood", "fume cupboard": "hood"}.get(word, word)
            if word not in PLACES:
                value.fail(
                    f"'{word}' is no place that is known here; it can be {', '.join(PLACES)}", closest(word, PLACES, 2)
                )
            values[key] = word
            continue
        dimension: Dimension = {"hood_flow": "flow", "room_volume": "volume", "air_changes": "air changes"}.get(
            key, "temperature"
        )  # type: ignore[assignment]
        quantity = parse_quantity(value.worded(f"the {key}"), dimension)
        if key != "temperature" and quantity.high <= 0.0:
            value.fail(f"the {key} must be more than zero; leave it out if it is not known")
        values[key] = quantity.times(1e-3) if key == "room_volume" else quantity
    return Setting(**values)


class _Bottle(Struct):
    """What is left in a bottle. ``left`` None: parts were taken in units that cannot be compared with its amount."""

    portion: Portion
    left: Interval | None
    emptied: Span | None = None


@dataclass
class _CaseReader:
    """Reads one case; keeps account of bottles and vessels while it goes through the steps."""

    names: NameLookup
    file: str
    bottles: dict[str, _Bottle] = field(default_factory=dict)
    places: dict[str, Passage] = field(default_factory=dict)  # of the names of bottles and vessels
    vessels: dict[str, VesselSpec] = field(default_factory=dict)  # declared
    made: set[str] = field(default_factory=set)  # by filtering and decanting
    filled: set[str] = field(default_factory=set)
    declared: bool = True
    site: dict[str, Target] = field(default_factory=dict)  # limits of the site, by report key or pH

    # -- the whole

    def case(self, root: Node) -> Case:
        entries = root.named("a case", CASE_KEYS)
        if "steps" not in entries:
            root.fail("a case needs 'steps', the list of what is done")
        title = ""
        if "title" in entries:
            title = " ".join(entries["title"][1].worded("the title").text.split())
        setting = _setting(entries["setting"][1]) if "setting" in entries else Setting()
        portions: dict[str, Portion] = {}
        if "bottles" in entries and entries["bottles"][1].kind != "null":
            for name, (key, value) in entries["bottles"][1].named("'bottles'").items():
                self.check_name(name, key, "bottle")
                portions[name] = parse_portion(value.worded(f"the bottle '{name}'"), self.names)
                self.bottles[name] = _Bottle(portions[name], portions[name].amount)
        self.declared = "vessels" in entries and entries["vessels"][1].kind != "null"
        if self.declared:
            for name, (key, value) in entries["vessels"][1].named("'vessels'").items():
                self.check_name(name, key, "vessel")
                self.vessels[name] = self.vessel(name, value)
                if self.vessels[name].holds:
                    self.filled.add(name)
        nodes = entries["steps"][1].listed("'steps'")
        if not nodes:
            entries["steps"][1].fail("the list of steps is empty")
        steps = tuple(self.step(node) for node in nodes)
        limits = self.limits(entries["limits"][1]) if "limits" in entries else {}
        goals = tuple(goal for node in self.optional_list(entries, "goals") for goal in self.goals(node))
        expect = tuple(self.expectation(node, len(steps), goals) for node in self.optional_list(entries, "expect"))
        return Case(
            title=title or (Path(self.file).stem if self.file else "untitled"),
            setting=setting,
            bottles=portions,
            vessels=tuple(self.vessels.values()),
            steps=steps,
            goals=goals,
            limits=limits,
            expect=expect,
            file=self.file,
        )

    def optional_list(self, entries: dict[str, tuple[Passage, Node]], key: str) -> tuple[Node, ...]:
        if key not in entries or entries[key][1].kind == "null":
            return ()
        return entries[key][1].listed(f"'{key}'")

    def check_name(self, name: str, key: Passage, what: str) -> None:
        span = _span(key)
        if len(name) > _LONGEST_NAME:
            raise InputError(f"this name of a {what} is too long (more than {_LONGEST_NAME} characters)", span=span)
        if not name.isprintable():
            raise InputError(f"this name of a {what} holds a character that cannot be shown", span=span)
        if name in self.places:
            raise InputError(
                f"'{name}' is the name of a bottle and of a vessel", span=span, other=_span(self.places[name])
            )
        self.places[name] = key

    def vessel(self, name: str, node: Node) -> VesselSpec:
        if node.kind == "null":
            return VesselSpec(name=name, material=self.material("glass", None))
        if node.kind == "text":
            return VesselSpec(name=name, volume=self.volume(node), material=self.material("glass", None))
        values: dict[str, Any] = {"material": self.material("glass", None)}
        for key, (_, value) in node.named(f"the vessel '{name}'", VESSEL_KEYS).items():
            if key == "volume":
                values[key] = self.volume(value)
            elif key == "material":
                values[key] = self.material(value.worded("the material").text.strip(), value)
            elif key == "cover":
                values[key] = self.word(value, COVERS, "cover")
            elif key == "rating":
                values[key] = parse_quantity(value.worded("the rating"), "pressure")
                if values[key].high <= 0.0:
                    value.fail("the rating must be more than zero; leave it out if it is not known")
            else:
                nodes = value.items if value.kind == "list" else (value,)
                values[key] = tuple(parse_portion(one.worded(f"what '{name}' holds"), self.names) for one in nodes)
        return VesselSpec(name=name, **values)

    def volume(self, node: Node) -> Interval:
        volume = parse_quantity(node.worded("the volume"), "volume")
        if volume.high <= 0.0:
            node.fail("a vessel needs a volume of more than zero; leave it out if it is not known")
        if volume.low > _LARGEST_VESSEL or (math.isfinite(volume.high) and volume.high > _LARGEST_VESSEL):
            node.fail("no vessel is as large as that; check the figure and the unit")
        return volume

    def material(self, word: str, node: Node | None) -> str:
        """The id of a container material.

        ``glass`` that nobody wrote is taken as it is if the graph has no such name.
        """
        found = self.names.container(word)
        if found is not None:
            return found
        if node is not None:
            node.fail(f"'{word}' is no container material that is known here", tuple(self.names.suggest(word, 3)))
        return word

    def word(self, node: Node, known: Sequence[str], what: str) -> str:
        """One of a few words."""
        word = node.worded(f"the {what}").text.strip()
        if word not in known:
            node.fail(f"'{word}' is no {what}; it can be {', '.join(known)}", closest(word, known, 2))
        return word

    # -- steps

    def step(self, node: Node) -> Step:
        if node.kind == "text" and node.text in STEP_KEYS:  # "- stir"
            verb, place, value, entries = node.text, node.passage, Node("null", node.passage), {}
        else:
            entries = node.named("a step", None)
            known = [*STEP_KEYS, *dict.fromkeys(key for keys in STEP_KEYS.values() for key in keys)]
            verbs = [key for key in entries if key in STEP_KEYS]
            unknown = next((key for key in entries if key not in known), None)
            if unknown is not None and not verbs:
                message = f"'{unknown}' is no kind of step; a step is one of {', '.join(STEP_KEYS)}"
                raise InputError(
                    message, span=_span(entries[unknown][0]), suggestions=closest(unknown, list(STEP_KEYS), 2)
                )
            if not verbs:
                node.fail(f"this step does not say what is done; a step has one of {', '.join(STEP_KEYS)}")
            if len(verbs) > 1:
                message = f"this step does two things ('{verbs[0]}' and '{verbs[1]}'); make two steps of it"
                raise InputError(message, span=_span(entries[verbs[1]][0]), other=_span(entries[verbs[0]][0]))
            verb = verbs[0]
            entries = node.named(f"the step '{verb}'", (verb, *STEP_KEYS[verb]))
            place, value = entries.pop(verb)
        options = {key: entry[1] for key, entry in entries.items()}
        if verb == "add":
            return self.add(value, options)
        if verb in ("filter", "decant"):
            return self.filter("filter" if verb == "filter" else "decant", value, options)
        if verb == "transfer":
            return self.transfer(value, options)
        if verb == "sample":
            return self.sample(value, options)
        if verb in ("rinse", "wash"):
            return self.rinse("rinse" if verb == "rinse" else "wash", place, value, options)
        if verb == "wipe":
            return self.wipe(place, value, options)
        if verb in ("heat", "cool"):
            return self.temper("heat" if verb == "heat" else "cool", place, value, options)
        if verb in ("wait", "stand", "settle", "stir"):
            return self.wait(verb, place, value, options)
        if verb == "check":
            return self.check(value, options)
        vessel_node = self.either(value, options.get("in"), f"the vessel of '{verb}'")
        kind: Any = verb
        return Cover(kind=kind, vessel=self.existing(vessel_node, place))

    def either(self, first: Node, second: Node | None, what: str) -> Node | None:
        if first.kind != "null" and second is not None:
            second.fail(f"{what} is given twice")
        return first if first.kind != "null" else second

    def known_vessels(self) -> list[str]:
        return [*self.vessels, *sorted(self.made - set(self.vessels))]

    def existing(self, node: Node | None, place: Passage, *, filled: bool = False) -> str:
        """The vessel named by ``node``, or the only one there is."""
        name, span = "", _span(place)
        if node is not None:
            name, span = node.worded("the name of a vessel").text.strip(), node.span
        if not self.declared and not self.vessels:
            if name in self.bottles:
                raise InputError(f"'{name}' is a bottle; add it to a vessel first", span=span)
            self.vessels[name or DEFAULT_VESSEL] = VesselSpec(
                name=name or DEFAULT_VESSEL, material=self.material("glass", None)
            )
        known = self.known_vessels()
        if not name:
            if len(known) != 1:
                raise InputError(f"which vessel? There {self.count(known)}; name it", span=span)
            name = known[0]
        if name not in known:
            if name in self.bottles:
                raise InputError(f"'{name}' is a bottle; add it to a vessel first", span=span)
            message = f"there is no vessel '{name}' at this step; there {self.count(known)}"
            raise InputError(message, span=span, suggestions=closest(name, known, 2))
        if filled and name not in self.filled:
            raise InputError(f"nothing is in '{name}' at this step", span=span)
        return name

    def count(self, known: Sequence[str]) -> str:
        if not known:
            return "is none"
        return f"{'is' if len(known) == 1 else 'are'} {', '.join(repr(name) for name in known)}"

    def duration(self, node: Node, what: str) -> Interval:
        duration = parse_quantity(node.worded(what), "time")
        if duration.high <= 0.0:
            node.fail(f"{what} must be more than zero; leave it out if it takes no time")
        if duration.low > _LONGEST_TIME or (math.isfinite(duration.high) and duration.high > _LONGEST_TIME):
            node.fail("this is longer than a hundred years; check the figure and the unit")
        return duration

    def add(self, value: Node, options: dict[str, Node]) -> Add:
        passage = value.worded("what is added")
        step: dict[str, Any] = {}
        name = passage.text.strip()
        if name in self.bottles:
            step = self.from_bottle(name, None, passage)
        elif name in self.known_vessels():
            step = self.from_vessel(name, None, passage)
        elif (found := _FROM.fullmatch(passage.plain.strip())) and (part := self.taken(passage, found)):
            step = part
        elif not begins_quantity(passage, 0) and not passage.plain.strip().lower().startswith(("unknown", "trace")):
            known = [*self.bottles, *self.known_vessels()]
            near = closest(name, known, 2)
            if near or not any(sign.isspace() for sign in name):
                listed = f" ({', '.join(known)})" if known else ""
                value.fail(
                    f"'{name}' is no bottle and no vessel{listed}, and no portion, which begins with an amount", near
                )
            step = {"portion": parse_portion(passage, self.names)}
        else:
            step = {"portion": parse_portion(passage, self.names)}
        to = self.existing(options.get("to"), passage)
        if step.get("source") == to:
            value.fail(f"'{to}' cannot be added to itself")
        self.filled.add(to)
        over = self.duration(options["over"], "the time of an addition") if "over" in options else None
        return Add(to=to, over=over, **step)

    def taken(self, passage: Passage, found: re.Match[str]) -> dict[str, Any] | None:
        """``1 L from rinse-14``; None if this is a portion (``1 L of water``)."""
        lead = len(passage.plain) - len(passage.plain.lstrip())
        start, end = lead + found.start("part"), lead + found.end("part")
        source = passage.text[lead + found.start("source") : lead + found.end("source")].strip()
        words = passage.plain[start:end].strip().lower()
        is_from = not re.search(r"\sof\s", passage.plain[end : lead + found.start("source")], re.IGNORECASE)
        share = next((value for word, value in _SHARES.items() if words == word), None)
        spoken = share is not None or words in _REST
        known = [*self.bottles, *self.known_vessels()]
        if source not in known:
            if not (is_from or spoken):
                return None
            at = lead + found.start("source")
            passage.fail(f"there is no bottle or vessel '{source}'", at, at + len(source), closest(source, known, 2))
        if spoken:
            if source in self.bottles:
                return self.from_bottle(source, None if share in (None, 1.0) else share, passage)
            if share not in (None, 1.0):
                passage.fail("a share can be taken of a bottle only; give an amount", start, end)
            return self.from_vessel(source, None, passage)
        reading = read_quantity(passage, start, end, ("volume", "mass"), "an amount")
        if reading is None or passage.plain[reading.end : end].strip():
            at, stop = passage.word(reading.end if reading else start, end)
            passage.fail(
                f"'{passage.text[at:stop]}' is no amount; write '1 L from {source}' or 'all of {source}'", at, stop
            )
        if reading.interval.high <= 0.0:
            passage.fail("an amount of zero adds nothing; leave this step out", reading.start, reading.end)
        part = (reading.interval, reading.unit)
        return (
            self.from_bottle(source, part, passage)
            if source in self.bottles
            else self.from_vessel(source, part, passage)
        )

    def from_vessel(self, name: str, part: tuple[Interval, str] | None, passage: Passage) -> dict[str, Any]:
        if name not in self.filled:
            raise InputError(f"nothing is in '{name}' at this step", span=_span(passage))
        if part is None:
            self.filled.discard(name)
            return {"source": name}
        return {"source": name, "part": part[0], "part_unit": part[1]}

    def from_bottle(self, name: str, part: tuple[Interval, str] | float | None, passage: Passage) -> dict[str, Any]:
        bottle = self.bottles[name]
        span = _span(passage)
        if bottle.emptied is not None:
            raise InputError(f"the bottle '{name}' is empty by now", span=span, other=bottle.emptied)
        amount, unit = bottle.portion.amount, bottle.portion.unit
        if isinstance(part, float):
            if unit == "mol":
                raise InputError(f"the amount of '{name}' is in mol, of which no share can be poured", span=span)
            part = (amount.times(part), unit)
        if part is None:
            untouched = bottle.left == amount
            bottle.emptied = span
            if untouched or bottle.left is None or unit == "mol":
                return {"source": name}
            return {"source": name, "part": bottle.left, "part_unit": unit}
        taken, taken_unit = part
        if taken_unit != unit:
            bottle.left = None
        elif bottle.left is not None:
            if taken.low > bottle.left.high * (1 + 1e-9):
                left = f"{bottle.left.high:.4g} {unit}"
                before = "" if bottle.left == amount else " by now"
                raise InputError(f"the bottle '{name}' holds no more than {left}{before}", span=span)
            high = bottle.left.high - taken.low if math.isfinite(bottle.left.high) else math.inf
            low = max(0.0, bottle.left.low - taken.high)
            bottle.left = Interval(low=float(f"{low:.12g}"), high=float(f"{max(high, low):.12g}"))
            if bottle.left.high <= 1e-9 * max(amount.high, 1e-12):
                bottle.emptied = span
        return {"source": name, "part": taken, "part_unit": taken_unit}

    def new_vessel(self, node: Node | None, default: str, taken: str) -> str:
        """The vessel that a filtrate or cake goes to: a known one, or a new one of this name."""
        if node is None:
            name, number = default, 2
            while name in self.vessels or name in self.made or name in self.bottles or name == taken:
                name, number = f"{default}-{number}", number + 1
        else:
            passage = node.worded("the name of a vessel")
            name = passage.text.strip()
            if name in self.bottles:
                node.fail(
                    f"'{name}' is the name of a bottle; a vessel needs one of its own", other=_span(self.places[name])
                )
            if name == taken:
                node.fail("cake and filtrate cannot go into one vessel")
            if name not in self.vessels and name not in self.made:
                self.check_name(name, passage, "vessel")
        if name not in self.vessels:
            self.made.add(name)
        return name

    def filter(self, kind: Literal["filter", "decant"], value: Node, options: dict[str, Node]) -> Filter:
        vessel = self.existing(value if value.kind != "null" else None, value.passage, filled=True)
        liquid = self.either(
            options.get("filtrate", Node("null", value.passage)), options.get("to"), "where the liquid goes"
        )
        self.filled.discard(vessel)
        if liquid is not None and liquid.text == vessel:
            liquid.fail(f"the liquid cannot go back into '{vessel}'; name another vessel")
        cake_node = options.get("cake")
        if (kind == "decant" and cake_node is None) or (cake_node is not None and cake_node.text == vessel):
            cake = vessel
        else:
            cake = self.new_vessel(cake_node, "cake", liquid.text if liquid is not None else "")
        filtrate = self.new_vessel(liquid, "filtrate" if kind == "filter" else "decantate", cake)
        self.filled |= {cake, filtrate}
        retained: float | None = None
        if "retained" in options:
            retained = self.retained(options["retained"])
        passes: Interval | None = None
        if "passes" in options:
            passes = parse_quantity(options["passes"].worded("the share of solids that passes"), "share")
        aid = self.absorbent(options["aid"], "filter aid") if "aid" in options else None
        paper = self.absorbent(options["paper"], "paper") if "paper" in options else None
        waste = self.bin(options.get("waste"), (vessel, cake, filtrate)) if paper is not None else ""
        if paper is None and "waste" in options:
            options["waste"].fail(
                "'waste' is where the 'paper' goes; say how much paper there is, such as 'paper: 5 g'"
            )
        first, runnings = self.first_runnings(options, passes, cake, filtrate)
        return Filter(
            kind=kind,
            vessel=vessel,
            cake=cake,
            filtrate=filtrate,
            retained=retained,
            passes=passes,
            aid=aid,
            paper=paper,
            waste=waste,
            first_runnings=first,
            runnings=runnings,
        )

    def first_runnings(
        self, options: dict[str, Node], passes: Interval | None, cake: str, filtrate: str
    ) -> tuple[Interval | None, str]:
        """The first runnings of a filter and the vessel they go to (\"\" for the filtrate's)."""
        if "first_runnings" not in options:
            if "runnings" in options:
                options["runnings"].fail("how much are the first runnings? Write such as 'first_runnings: 200 mL'")
            return None, ""
        node = options["first_runnings"]
        volume = parse_quantity(node.worded("the first runnings"), "volume")
        if volume.high <= 0.0:
            node.fail("first runnings of nothing are none; leave this out")
        if passes is None:
            node.fail("what share of the solids passes with the first runnings? Write such as 'passes: 2 %'")
        if "runnings" not in options:
            return volume, ""
        place = options["runnings"].worded("the name of a vessel").text.strip()
        if place == cake:
            options["runnings"].fail("the first runnings cannot go into the cake; name another vessel")
        name = place if place in self.vessels else self.new_vessel(options["runnings"], "runnings", filtrate)
        self.filled.add(name)
        return volume, name

    def absorbent(self, node: Node, words: str) -> Absorbent:
        """``20 g``, ``20 g of paper``, ``20 g of paper, 3 mL/g``."""
        passage = node.worded(f"the {words}")
        found = _ABSORBENT.fullmatch(passage.plain)
        if found is None:
            node.fail(
                f"the {words} is given by its dry weight, such as '20 g', or '20 g, 3 mL/g' with the liquid that it holds"
            )
        reading = read_quantity(passage, found.start("amount"), found.end("amount"), ("mass",), "a weight")
        if reading is None or passage.plain[reading.end : found.end("amount")].strip() or reading.interval.high <= 0.0:
            node.fail(f"the {words} is given by its dry weight, such as '20 g'")
        if not reading.interval.exact:
            node.fail(f"the dry weight of the {words} is one figure, such as '20 g'")
        named = (found["what"] or words).strip()
        holds = float(found["holds"].replace(",", ".")) if found["holds"] else None
        if holds is not None and holds > _MOST_HELD:
            node.fail("nothing holds as much liquid as that; the figure is in mL per g")
        papery = bool(_PAPERY.search(named))
        if holds is None and not papery:
            node.fail(
                f"how much liquid does the {named} hold? Only for paper, cloth and filter aid is there a usual figure; "
                f"write such as '{found['amount'].strip()} of {named}, 0.5 mL/g'"
            )
        worn = re.sub(r"\s*\bgloves?\b", "", named).strip()  # "nitrile gloves" are nitrile
        material = self.names.container(named) or (worn and self.names.container(worn)) or ""
        if not material and papery:
            material = self.names.container("paper") or ""
        return Absorbent(grams=reading.interval.low, holds=holds, material=material, words=named)

    def bin(self, node: Node | None, taken: Sequence[str]) -> str:
        """The vessel that contaminated solids go to: a known one, or a new one of this name."""
        if node is None:
            if WASTE not in self.vessels:
                self.made.add(WASTE)
            name = WASTE
        else:
            name = node.worded("the name of a vessel").text.strip()
            if name in taken:
                node.fail(f"'{name}' is where something else of this step goes; a bin has a name of its own")
            if name not in self.known_vessels():
                name = self.new_vessel(node, WASTE, "")
        self.filled.add(name)
        return name

    def wipe(self, place: Passage, value: Node, options: dict[str, Node]) -> Wipe:
        if "with" not in options:
            raise InputError("a wipe needs 'with', such as 'with: 10 g of paper'", span=_span(place))
        vessel = self.existing(value if value.kind != "null" else None, place, filled=True)
        absorbent = self.absorbent(options["with"], "paper")
        return Wipe(vessel=vessel, absorbent=absorbent, to=self.bin(options.get("to"), (vessel,)))

    def sample(self, value: Node, options: dict[str, Node]) -> Transfer:
        """``20 mL from tank``."""
        passage = value.worded("what is sampled")
        found = _FROM.fullmatch(passage.plain.strip())
        if found is None:
            value.fail("a sample says how much is taken of what, such as '20 mL from tank'")
        taken = self.taken(passage, found)
        if taken is None or "part" not in taken or taken["source"] in self.bottles:
            value.fail("a sample says how much is taken of which vessel, such as '20 mL from tank'")
        vessel = taken["source"]
        node = options.get("to")
        if node is None:
            to = self.new_vessel(None, "sample", vessel)
        else:
            to = node.worded("the name of a vessel").text.strip()
            if to == vessel:
                node.fail(f"a sample of '{to}' goes into another vessel")
            if to not in self.known_vessels():
                to = self.new_vessel(node, "sample", vessel)
        self.filled.add(to)
        return Transfer(kind="sample", vessel=vessel, to=to, part=taken["part"], part_unit=taken["part_unit"])

    def retained(self, node: Node) -> float:
        """mL per g: ``0.5`` or ``0.5 mL/g``."""
        passage = node.worded("the liquid retained")
        found = re.fullmatch(r"\s*(?P<figure>\d+(?:[.,]\d+)?)\s*(?:mL\s*/\s*g|ml\s*/\s*g|mL per g)?\s*", passage.plain)
        if found is None:
            node.fail("the liquid retained is a figure in mL per g of solid, such as '0.5 mL/g'")
        figure = float(found["figure"].replace(",", "."))
        if figure > 100.0:
            node.fail("a cake does not retain as much as that; the figure is in mL per g of solid")
        return figure

    def transfer(self, value: Node, options: dict[str, Node]) -> Transfer:
        passage = value.worded("what is transferred")
        part: Interval | None = None
        name = passage.text.strip()
        source: Node = value
        found = _FROM.fullmatch(passage.plain.strip())
        if found and name not in self.known_vessels() and begins_quantity(passage, 0):
            lead = len(passage.plain) - len(passage.plain.lstrip())
            inner = Passage(
                passage.text[lead + found.start("part") : lead + found.end("part")],
                passage.file,
                passage.within,
                _cut(passage, lead + found.start("part"), lead + found.end("part")),
            )
            part = parse_quantity(inner, "volume")
            source = Node(
                "text",
                Passage(
                    passage.text[lead + found.start("source") :],
                    passage.file,
                    passage.within,
                    _cut(passage, lead + found.start("source"), len(passage.text)),
                ),
            )
        vessel = self.existing(source, passage, filled=True)
        if "part" in options:
            if part is not None:
                options["part"].fail("the part is given twice")
            part = parse_quantity(options["part"].worded("the part"), "volume")
        if part is not None and part.high <= 0.0:
            value.fail("a part of zero moves nothing; leave this step out")
        heel = parse_quantity(options["heel"].worded("the heel"), "volume") if "heel" in options else None
        if heel is not None and part is not None:
            options["heel"].fail("give the part that is moved or the heel that is left, not both")
        if "to" not in options:
            value.fail("a transfer needs 'to', the vessel that receives it")
        to = self.existing(options["to"], passage)
        if to == vessel:
            options["to"].fail(f"'{to}' cannot be transferred to itself")
        if part is None and heel is None:
            self.filled.discard(vessel)
        self.filled.add(to)
        over = self.duration(options["over"], "the time of a transfer") if "over" in options else None
        return Transfer(vessel=vessel, to=to, part=part, heel=heel, over=over)

    def rinse(self, kind: Literal["rinse", "wash"], place: Passage, value: Node, options: dict[str, Node]) -> Rinse:
        if "with" not in options:
            raise InputError(f"a {kind} needs 'with', the portion to {kind} with", span=_span(place))
        vessel = self.existing(value if value.kind != "null" else None, place)
        portion = parse_portion(options["with"].worded("what is rinsed with"), self.names)
        self.filled.add(vessel)
        if "retained" in options and "to" not in options:
            options["retained"].fail("the liquid retained is what stays when washings run off; say where 'to'")
        if "to" not in options:
            return Rinse(kind=kind, vessel=vessel, portion=portion)
        to = options["to"].worded("the name of a vessel").text.strip()
        if to == vessel:
            options["to"].fail(f"the washings cannot run back into '{vessel}'; leave 'to' out if they stay there")
        if to not in self.known_vessels():
            to = self.new_vessel(options["to"], "washings", vessel)
        self.filled.add(to)
        retained = self.retained(options["retained"]) if "retained" in options else None
        return Rinse(kind=kind, vessel=vessel, portion=portion, to=to, retained=retained)

    def temper(self, kind: Literal["heat", "cool"], place: Passage, value: Node, options: dict[str, Node]) -> Temper:
        """``heat: 80 degC`` with ``in``, or ``heat: tank`` with ``to``."""
        if value.kind == "text" and ("to" in options or value.text in self.known_vessels()):
            if "in" in options:
                options["in"].fail(f"the vessel of '{kind}' is given twice")
            vessel, target = self.existing(value, place, filled=True), options.get("to")
        else:
            vessel, target = "", self.either(value, options.get("to"), "the temperature")
            if target is not None:
                vessel = self.existing(options.get("in"), place, filled=True)
        if target is None:
            raise InputError(f"the step '{kind}' needs a temperature, such as '80 degC'", span=_span(place))
        return Temper(kind=kind, vessel=vessel, to=parse_quantity(target.worded("the temperature"), "temperature"))

    def wait(self, verb: str, place: Passage, value: Node, options: dict[str, Node]) -> Wait:
        """A vessel that is not named is the only one, or all of them."""
        kind: Any = verb
        given: Node | None = value if value.kind != "null" else None
        vessel_node = options.get("in")
        if given is not None and given.kind == "text" and given.text in self.known_vessels():
            vessel_node = self.either(given, vessel_node, f"the vessel of '{verb}'")
            given = None
        time = options.get("for") if given is None else self.either(given, options.get("for"), "the time")
        if time is None and verb == "wait":
            raise InputError("a wait needs a time, such as 'wait: 24 h'", span=_span(place))
        known = self.known_vessels()
        vessel = (
            self.existing(vessel_node, place) if vessel_node is not None or len(known) == 1 or verb == "stir" else ""
        )
        return Wait(kind=kind, vessel=vessel, duration=self.duration(time, "the time") if time is not None else None)

    def check(self, value: Node, options: dict[str, Node]) -> Check:
        passage = value.worded("a check")
        target = parse_target(passage, self.names, with_temperature=True)
        vessel = self.vessel_of_target(target, passage, options.get("in"))
        quantity = f"{target.quantity} {target.subject}".strip()
        return Check(
            vessel=vessel,
            quantity=quantity,
            low=target.low,
            high=target.high,
            unit=target.unit,
            text=passage.text.strip(),
        )

    def vessel_of_target(self, target: Target, passage: Passage, given: Node | None) -> str:
        if target.vessel_place is None:
            return self.existing(given, passage)
        if given is not None:
            given.fail("the vessel of this check is given twice")
        start, end = target.vessel_place
        places = _cut(passage, start, end)
        return self.existing(
            Node("text", Passage(passage.text[start:end], passage.file, passage.within, places)), passage
        )

    # -- goals and expectations

    def limits(self, node: Node) -> dict[str, str]:
        """The site's own limits: ``mercury: 0.05 mg/L``, ``pH: 6 to 9``."""
        if node.kind == "null":
            return {}
        written: dict[str, str] = {}
        for key, (place, value) in node.named("'limits'").items():
            words = " ".join(value.worded(f"the limit of '{key}'").text.split())
            ends = re.fullmatch(r"(\S+)\s*(?:to|-)\s*(\S+.*)", words)
            window = f"between {ends[1]} and {ends[2]}" if ends else words
            if window[:1].isdigit() or window[:1] == ".":
                window = f"below {window}"
            try:
                target = parse_target(f"{key} {window}", self.names)
            except InputError as error:
                raise InputError(
                    f"this site limit cannot be read: {error.message}", span=_span(place), suggestions=error.suggestions
                ) from None
            if target.vessel:
                value.fail("a site limit holds for whatever leaves; it names no vessel")
            self.site["pH" if target.quantity == "pH" else target.subject] = target
            written[key] = words
        return written

    def goals(self, node: Node) -> Iterator[Goal]:
        """The goal of a line; a line such as ``jug meets the site limits`` is one for each of them."""
        passage = node.worded("a goal")
        found = _MEETS.fullmatch(passage.plain)
        if found is None:
            target = parse_target(passage, self.names, site=self.site)
            yield goal_of(passage.text.strip(), target, self.in_the_end(target, passage, node))
            return
        if not self.site:
            node.fail("the case has no site limits; write them under 'limits', such as 'mercury: 0.05 mg/L'")
        for subject, own in self.site.items():
            whole = Target(
                own.quantity, own.subject, found["vessel"], found.span("vessel"), own.low, own.high, own.unit, "site"
            )
            vessel = self.in_the_end(whole, passage, node)
            only = "dissolved " if own.quantity == "dissolved" else ""
            yield goal_of(f"{only}{subject} in {vessel} within the site limit", whole, vessel)

    def in_the_end(self, target: Target, passage: Passage, node: Node) -> str:
        """The vessel of a goal, which must hold something when all is done."""
        vessel = self.vessel_of_target(target, passage, None)
        if vessel not in self.filled:
            node.fail(f"'{vessel}' is empty at the end, so that this goal says nothing")
        return vessel

    def expectation(self, node: Node, steps: int, goals: Sequence[Goal]) -> Expectation:
        entries = {key: entry[1] for key, entry in node.named("an expectation", EXPECT_KEYS).items()}
        values: dict[str, Any] = {}
        for key in ("species", "rule", "words", "known_failure"):
            if key in entries:
                values[key] = entries[key].worded(f"'{key}'").text.strip()
        for key, what, known in (
            ("kind", "kind of finding", get_args(Kind)),
            ("signal", "signal word", get_args(Signal)),
            ("moment", "moment", get_args(Moment)),
            ("verdict", "verdict", get_args(Verdict)),
        ):
            if key in entries:
                values[key] = self.word(entries[key], known, what)
        for key in ("absent", "met"):
            if key in entries:
                values[key] = self.truth(entries[key], key)
        if "step" in entries:
            text = entries["step"].worded("the number of a step").text.strip()
            if not text.isdecimal() or not text.isascii() or len(text) > 6 or not 1 <= int(text) <= steps:
                entries["step"].fail(f"'{text}' is no step; the steps are numbered 1 to {steps}")
            values["step"] = int(text)
        if "goal" in entries:
            words = " ".join(entries["goal"].worded("the goal").text.split())
            texts = [" ".join(goal.text.split()) for goal in goals]
            if words not in texts:
                entries["goal"].fail("this is none of the goals of this case", closest(words, texts, 1))
            values["goal"] = goals[texts.index(words)].text
        self.expected_number(entries, values)
        if not any(
            key in values
            for key in ("kind", "rule", "species", "verdict", "quantity", "goal", "words", "signal", "moment")
        ):
            node.fail(
                "this expectation says nothing that could fail; "
                "give a kind, a rule, a verdict, a quantity, a goal or words"
            )
        if ("met" in values) != ("goal" in values):
            node.fail("'goal' and 'met' belong together")
        return Expectation(**values)

    def expected_number(self, entries: dict[str, Node], values: dict[str, Any]) -> None:
        windows = [key for key in ("between", "above", "below") if key in entries]
        if "quantity" not in entries:
            if windows:
                entries[windows[0]].fail(f"'{windows[0]}' needs a 'quantity', such as 'pH' or 'dissolved_mol Hg'")
            return
        word, *rest = entries["quantity"].worded("the quantity").text.split()
        if word not in NUMBERS_OF_A_STEP:
            entries["quantity"].fail(
                f"'{word}' is no number of a step; it can be {', '.join(NUMBERS_OF_A_STEP)}",
                closest(word, NUMBERS_OF_A_STEP, 2),
            )
        if (word in _WITH_SPECIES) != (len(rest) == 1):
            entries["quantity"].fail(
                f"'{word}' {'needs one' if word in _WITH_SPECIES else 'takes no'} species after it"
            )
        if not windows:
            entries["quantity"].fail("a quantity needs 'between', 'above' or 'below'")
        values["quantity"] = " ".join([word, *rest])
        if "between" in windows:
            if len(windows) > 1:
                entries[windows[1]].fail("'between' stands alone")
            both = entries["between"]
            ends = both.items if both.kind == "list" else ()
            if both.kind == "text" and (found := re.fullmatch(r"(\S+)\s+and\s+(\S+)", both.text)):
                ends = tuple(
                    Node("text", Passage(part, both.passage.file, both.passage.within, both.passage.positions))
                    for part in found.groups()
                )
            if len(ends) != 2:
                both.fail("'between' needs two figures, as in [7, 9]")
            values["low"], values["high"] = self.figure(ends[0]), self.figure(ends[1])
            if values["low"] > values["high"]:
                both.fail("this range runs backwards; write the smaller figure first")
        if "above" in windows:
            values["low"] = self.figure(entries["above"])
        if "below" in windows:
            values["high"] = self.figure(entries["below"])

    def figure(self, node: Node) -> float:
        text = node.worded("a figure").text.strip().replace("\u2212", "-")
        if not re.fullmatch(r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d{1,3})?", text):
            node.fail(f"'{text}' is no figure")
        value = float(text)
        if not math.isfinite(value):
            node.fail("this figure is too large")
        return value

    def truth(self, node: Node, what: str) -> bool:
        text = node.worded(f"'{what}'").text.strip().lower()
        if text not in ("true", "yes", "false", "no"):
            node.fail(f"'{what}' is true or false")
        return text in ("true", "yes")


def _cut(passage: Passage, start: int, end: int) -> Sequence[int] | None:
    """The places of a part of a passage."""
    return None if passage.positions is None else [passage.positions[place] for place in range(start, end + 1)]
