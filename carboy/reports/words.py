"""What verdicts, signals, kinds and moments are called when they are told to a person."""

from __future__ import annotations

from collections.abc import Iterable

from carboy.model.report import Finding, Report, Signal, Verdict
from carboy.model.rule import Kind

VERDICTS: dict[Verdict, str] = {
    "refuse": "Do not do this as written.",
    "conditional": "Only with the precautions below.",
    "cannot say": "Something that matters is not known. Do not mix until it is.",
    "no objection": "Nothing above a note was found in what this covers.",
}
# in the order of gravity, the worst first
KINDS: dict[Kind, str] = {
    "toxic-gas": "toxic gas",
    "explosive": "explosive",
    "fire": "fire",
    "flammable-gas": "flammable gas",
    "pressure": "pressure",
    "polymerization": "polymerization",
    "heat": "heat",
    "toxic-product": "toxic product",
    "asphyxiant-gas": "asphyxiant gas",
    "oxygen": "oxygen",
    "foam": "foam",
    "attack": "attack on the vessel",
    "remobilised": "metal back in solution",
    "incomplete": "aim missed",
}
GASES: tuple[Kind, ...] = ("toxic-gas", "flammable-gas", "asphyxiant-gas", "oxygen")
_GRAVITY = {kind: place for place, kind in enumerate(KINDS)}
SIGNALS: tuple[Signal, ...] = ("danger", "warning", "note")
OTHER_ORDER = "other order"
EITHER_ORDER = "either order"
LAST_OF_TWO = 2  # where one thing is poured into another, the step that needs no number
_WHOLE = 0.995
_START = 0.005


def is_formed(finding: Finding) -> bool:
    """Whether its amount is of something that the event makes, not of something that was there and is at stake, or goes back."""
    if finding.amount_mol is None or not finding.species or finding.kind == "remobilised":
        return False
    return not finding.path or not set(finding.path[-1].to) <= set(finding.path[-1].from_)


def moment_words(finding: Finding, actions: dict[int, str], *, alike: bool = False) -> str:
    """When it stands: the step, and the part of the addition.

    ``actions`` has what was done in which step; empty where the title says it. ``alike``: that all stand in either order has been said.
    """
    words = _when(finding)
    if finding.step in actions and finding.order != OTHER_ORDER:
        words = f"step {finding.step} ({actions[finding.step]}), {words}"
    elif finding.step != LAST_OF_TWO:
        words = f"step {finding.step}, {words}"
    if finding.order == EITHER_ORDER:
        words += "" if alike else "; in either order of pouring"
    elif finding.order == "as written":
        words += "; in this order of pouring"
    if finding.holds == "in part":
        words += "; over part of the stated ranges only"
    return words


def _when(finding: Finding) -> str:
    if finding.moment == "contact":
        return "where the stream falls in"
    if finding.moment == "storage":
        return f"while it stands, over {finding.speed}" if finding.speed else "while it stands"
    if finding.moment == "after":
        return "once all is in"
    low, high = finding.fractions
    from_start, to_end = low <= _START, high >= _WHOLE
    if from_start and to_end:
        return "all through the addition"
    if to_end:
        return f"from {_percent(low)} of the addition on"
    if from_start:
        return f"from the first drop until {_percent(high)} is in"
    if round(low, 2) == round(high, 2):
        return f"near {_percent(low)} of the addition"
    return f"between {_percent(low)} and {_percent(high)} of the addition"


def _percent(fraction: float) -> str:
    return f"{100 * fraction:.0f}\u00a0%"


def by_signal(report: Report, signal: Signal) -> list[Finding]:
    """Findings of one signal in this order of pouring, by step, the graver kind first."""
    return in_order(one for one in report.findings if one.signal == signal and one.order != OTHER_ORDER)


def of_other_order(report: Report) -> list[Finding]:
    """What only the other order of pouring brings."""
    return in_order(one for one in report.findings if one.order == OTHER_ORDER)


def in_order(findings: Iterable[Finding]) -> list[Finding]:
    """By step, then by signal, then by the gravity of the kind; what else one species brings stands next to the gravest of it."""
    listed = list(findings)

    def key(finding: Finding) -> tuple[int, int, int, str, int]:
        signal = SIGNALS.index(finding.signal)
        akin = [
            one
            for one in listed
            if (one.step, one.signal, one.species) == (finding.step, finding.signal, finding.species)
        ]
        first = min(_GRAVITY[one.kind] for one in akin)
        return finding.step, signal, first, " ".join(finding.species), _GRAVITY[finding.kind]

    return sorted(listed, key=key)
