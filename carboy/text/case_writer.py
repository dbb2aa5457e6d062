"""A :class:`~carboy.model.plan.Case` as the YAML of a case file, which reads back to the same case.

Figures are written to twelve digits, as the reader keeps them. Comments of a file that the case once came from are not
part of a case and do not return.
"""

from __future__ import annotations

import io
import math
import re
from collections.abc import Sequence
from typing import Any, Literal

from carboy.model.plan import (
    Absorbent,
    Add,
    Case,
    Check,
    Cover,
    Expectation,
    Filter,
    Interval,
    Rinse,
    Setting,
    Step,
    Temper,
    Transfer,
    VesselSpec,
    Wait,
    Wipe,
)

Measured = Literal["L", "g", "s", "degC", "kPa", "m3/s", "m3", "/h"]

# the larger or smaller units that a person would write, with their size in the unit of the record; the first that gives a
# figure of four digits or fewer is taken
_WAYS: dict[str, tuple[tuple[str, float], ...]] = {
    "L": (("L", 1.0), ("mL", 1e-3)),
    "g": (("g", 1.0), ("mg", 1e-3)),
    "s": (("d", 86400.0), ("h", 3600.0), ("min", 60.0), ("s", 1.0)),
}
_DIGITS = 12
_READABLE = 4
_WIDEST = 1_000_000  # characters of a line: a text is never folded, so that it comes back as it was


def figure(value: float) -> str:
    """A number in plain digits, without an exponent, to twelve significant figures."""
    text = f"{value:.{_DIGITS}g}"
    if "e" in text:
        text = f"{value:.{max(0, _DIGITS - 1 - math.floor(math.log10(abs(value))))}f}"
        text = text.rstrip("0").rstrip(".") if "." in text else text
    return text


def quantity_text(interval: Interval, unit: Measured) -> str:
    """``1.2 to 1.5 L``, ``at least 30 min``: an interval in ``unit`` as the reader of quantities takes it."""
    if interval.low == 0.0 and interval.high == math.inf and unit != "degC":
        return "unknown"
    name, size = _way(interval, unit)
    low, high = figure(interval.low / size), figure(interval.high / size)
    if interval.exact:
        return f"{low} {name}"
    if interval.high == math.inf:
        return f"at least {low} {name}"
    return f"{low} to {high} {name}"


def _way(interval: Interval, unit: str) -> tuple[str, float]:
    ways = _WAYS.get(unit, ((unit, 1.0),))
    ends = [end for end in (interval.low, interval.high) if math.isfinite(end)]
    for name, size in ways:
        figures = [end / size for end in ends]
        short = all(float(f"{one:.{_READABLE}g}") == float(f"{one:.{_DIGITS}g}") for one in figures)
        if short and all(one == 0.0 or one >= 1.0 for one in figures):
            return name, size
    return unit, 1.0


def case_text(case: Case, comments: Sequence[str] = ()) -> str:
    """The case as a YAML text that ends in a newline; ``comments`` are lines put at its head."""
    from ruamel.yaml import YAML  # a check that writes no file goes without it

    root: dict[str, Any] = {}
    root["title"] = case.title
    setting = _setting(case.setting)
    if setting:
        root["setting"] = setting
    if case.bottles:
        root["bottles"] = {name: portion.text for name, portion in case.bottles.items()}
    if case.vessels:
        root["vessels"] = {spec.name: _vessel(spec) for spec in case.vessels}
    root["steps"] = [_step(step) for step in case.steps]
    if case.limits:
        root["limits"] = dict(case.limits)
    if case.goals:
        root["goals"] = [goal.text for goal in case.goals]
    if case.expect:
        root["expect"] = [_expectation(one) for one in case.expect]
    writer = YAML()
    writer.width = _WIDEST
    writer.allow_unicode = True
    writer.indent(mapping=2, sequence=4, offset=2)
    stream = io.StringIO()
    writer.dump(root, stream)
    head = "".join(f"# {line}".rstrip() + "\n" for comment in comments for line in comment.splitlines() or [""])
    return head + stream.getvalue()


def _flow(entries: dict[str, Any]) -> dict[str, Any]:
    """On one line, in braces."""
    from ruamel.yaml.comments import CommentedMap

    row = CommentedMap(entries)
    row.fa.set_flow_style()
    return row


def _setting(setting: Setting) -> dict[str, Any] | None:
    entries: dict[str, Any] = {}
    if setting.place:
        entries["place"] = setting.place
    measured: tuple[tuple[str, Interval | None, Measured], ...] = (
        ("hood_flow", setting.hood_flow, "m3/s"),
        ("room_volume", setting.room_volume, "m3"),
        ("air_changes", setting.air_changes, "/h"),
    )
    for key, interval, unit in measured:
        if interval is not None:
            entries[key] = quantity_text(interval, unit)
    if setting.temperature != Setting().temperature:
        entries["temperature"] = quantity_text(setting.temperature, "degC")
    return _flow(entries) if entries else None


def _vessel(spec: VesselSpec) -> dict[str, Any]:
    entries: dict[str, Any] = {}
    if spec.volume is not None:
        entries["volume"] = quantity_text(spec.volume, "L")
    entries["material"] = spec.material
    entries["cover"] = spec.cover
    if spec.rating is not None:
        entries["rating"] = quantity_text(spec.rating, "kPa")
    if not spec.holds:
        return _flow(entries)
    entries["holds"] = [portion.text for portion in spec.holds]
    return entries


def _step(step: Step) -> dict[str, Any] | str:
    row: dict[str, Any] = {}
    match step:
        case Add():
            row["add"] = _added(step)
            if step.to:
                row["to"] = step.to
            _timed(row, "over", step.over)
        case Filter():
            row[step.kind] = step.vessel
            if step.cake:
                row["cake"] = step.cake
            if step.filtrate:
                row["filtrate"] = step.filtrate
            if step.retained is not None:
                row["retained"] = f"{figure(step.retained)} mL/g"
            if step.passes is not None:
                row["passes"] = f"{figure(100 * step.passes.low)} to {figure(100 * step.passes.high)} %"
                if step.passes.exact:
                    row["passes"] = f"{figure(100 * step.passes.low)} %"
            if step.first_runnings is not None:
                row["first_runnings"] = quantity_text(step.first_runnings, "L")
            if step.runnings:
                row["runnings"] = step.runnings
            if step.aid is not None:
                row["aid"] = _absorbent(step.aid)
            if step.paper is not None:
                row["paper"] = _absorbent(step.paper)
                row["waste"] = step.waste
        case Transfer(kind="sample"):
            row["sample"] = (
                f"{quantity_text(step.part, step.part_unit)} from {step.vessel}" if step.part else step.vessel
            )
            row["to"] = step.to
        case Transfer():
            row["transfer"] = step.vessel
            row["to"] = step.to
            if step.part is not None:
                row["part"] = quantity_text(step.part, "L")
            if step.heel is not None:
                row["heel"] = quantity_text(step.heel, "L")
            _timed(row, "over", step.over)
        case Rinse():
            row[step.kind] = step.vessel
            row["with"] = step.portion.text
            if step.to:
                row["to"] = step.to
            if step.retained is not None:
                row["retained"] = f"{figure(step.retained)} mL/g"
        case Wipe():
            row["wipe"] = step.vessel
            row["with"] = _absorbent(step.absorbent)
            row["to"] = step.to
        case Temper():
            row[step.kind] = quantity_text(step.to, "degC")
            _placed(row, step.vessel)
        case Wait():
            row[step.kind] = None if step.duration is None else quantity_text(step.duration, "s")
            _placed(row, step.vessel)
        case Cover():
            row[step.kind] = step.vessel or None
        case Check():
            row["check"] = step.text or _check_words(step)
            if step.vessel and not names_vessel(str(row["check"]), step.vessel):
                row["in"] = step.vessel
    only = next(iter(row.items()))
    return str(only[0]) if len(row) == 1 and only[1] is None else row


def _added(step: Add) -> str:
    if step.portion is not None:
        return step.portion.text
    if step.part is None:
        return step.source
    return f"{quantity_text(step.part, 'g' if step.part_unit == 'g' else 'L')} from {step.source}"


def _absorbent(dry: Absorbent) -> str:
    text = (
        f"{quantity_text(Interval(low=dry.grams, high=dry.grams), 'g')} of {dry.words}"
        if dry.words
        else f"{figure(dry.grams)} g"
    )
    return text if dry.holds is None else f"{text}, {figure(dry.holds)} mL/g"


def _timed(row: dict[str, Any], key: str, duration: Interval | None) -> None:
    if duration is not None:
        row[key] = quantity_text(duration, "s")


def _placed(row: dict[str, Any], vessel: str) -> None:
    if vessel:
        row["in"] = vessel


def names_vessel(text: str, vessel: str) -> bool:
    """Whether a check or goal names this vessel in its own words."""
    return re.search(_named(vessel), text) is not None


def with_vessel(text: str, old: str, new: str) -> str:
    """A check or goal with another vessel in the place where it names one; as it was where it names none."""
    return re.sub(_named(old), lambda found: found.group(1) + new, text)


def _named(vessel: str) -> str:
    return rf"(\b(?:in|of)\s+(?:the\s+)?){re.escape(vessel)}(?!\S)"


def _check_words(step: Check) -> str:
    """The words of a check that was made without them."""
    unit = f" {step.unit}" if step.unit else ""
    if step.low is not None and step.high is not None:
        return f"{step.quantity} between {figure(step.low)} and {figure(step.high)}{unit}"
    if step.low is not None:
        return f"{step.quantity} above {figure(step.low)}{unit}"
    return f"{step.quantity} below {figure(step.high or 0.0)}{unit}"


def _expectation(one: Expectation) -> dict[str, Any]:
    entries: dict[str, Any] = {}
    if one.step is not None:
        entries["step"] = one.step
    for key in ("kind", "species", "signal", "moment", "rule"):
        if getattr(one, key):
            entries[key] = getattr(one, key)
    if one.absent:
        entries["absent"] = True
    if one.verdict:
        entries["verdict"] = one.verdict
    if one.quantity:
        entries["quantity"] = one.quantity
        if one.low is not None and one.high is not None:
            entries["between"] = [one.low, one.high]
        elif one.low is not None:
            entries["above"] = one.low
        elif one.high is not None:
            entries["below"] = one.high
    if one.goal:
        entries["goal"] = one.goal
        entries["met"] = bool(one.met)
    for key in ("words", "known_failure"):
        if getattr(one, key):
            entries[key] = getattr(one, key)
    return _flow(entries)
