"""Reports as a command prints them: text or JSON, whole or the page on one finding."""

from __future__ import annotations

from collections.abc import Sequence

from carboy.model.report import Report
from carboy.reports.style import style_for
from carboy.reports.terminal import report_text
from carboy.reports.why import explained, why_text
from carboy.vetting import Laboratory

_MOST_NEAR = 2
_LETTERS_A_SLIP = 6  # one wrong letter in so many is a slip of the pen; more is another substance
UNKNOWN = "unknown"  # what a label may honestly say


def printed(
    reports: Sequence[Report],
    lab: Laboratory,
    names: Sequence[str] = (),
    *,
    json: bool,
    plain: bool,
    full: bool,
    why: int | None,
) -> str:
    """The text of the reports. ``names`` head them where there are several; ``why`` asks for the page on one finding of the first, which
    with ``json`` is the finding alone. Raises InputError where there is no such finding."""
    if why is not None and json:
        return explained(reports[0], why).model_dump_json(indent=2, by_alias=True)
    if json:
        objects = [report.model_dump_json(indent=2) for report in reports]
        return objects[0] if len(objects) == 1 else "[" + ",\n".join(objects) + "]"
    style = style_for(plain=plain)
    if why is not None:
        return why_text(reports[0], why, style, lab.rules, lab.index.thresholds, lab.index.sources)
    texts = [
        report_text(report, style, lab.index.sources, near=_near(report.unrecognised, lab), full=full)
        for report in reports
    ]
    if len(texts) > 1:
        texts = [f"{name}\n\n{text}" for name, text in zip(names, texts, strict=True)]
    return "\n\n".join(texts)


def _near(words: Sequence[str], lab: Laboratory) -> dict[str, tuple[str, ...]]:
    """For each name that was not recognised those that are spelled nearly like it."""
    named = {word: lab.names.suggest(word) for word in words if word != UNKNOWN}
    if not named:
        return {}
    from rapidfuzz.distance import DamerauLevenshtein

    def slips(word: str, name: str) -> bool:
        return DamerauLevenshtein.distance(word.casefold(), name.casefold()) <= max(1, len(word) // _LETTERS_A_SLIP)

    return {word: tuple(name for name in found if slips(word, name))[:_MOST_NEAR] for word, found in named.items()}
