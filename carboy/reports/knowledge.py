"""What the graph knows of a thing, for a terminal: one line a fact, with how it was had and from where."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence

from carboy.knowledge.entries import Entry, Fact, bounds
from carboy.model.knowledge import Source
from carboy.reports.citations import Citations
from carboy.reports.figures import quantity
from carboy.reports.style import Style
from carboy.reports.table import table

_MINUS = re.compile(r"(?<![\w)])-(?=\d)")  # before a figure, not within a word or a span
_LABEL = 24  # columns
_EXACT = 6  # significant figures: a value is shown as the graph has it


def entries_text(found: Sequence[Entry], style: Style, sources: Mapping[str, Source]) -> str:
    """The entries one below the other, the sources at the end."""
    citations = Citations(sources)
    lines = [*_lines(found, style, citations), *citations.lines(style, full=True)]
    return style.finished("\n".join(lines) + "\n")


def _lines(found: Sequence[Entry], style: Style, citations: Citations) -> Iterator[str]:
    for place, entry in enumerate(found):
        if place:
            yield ""
        shown = style.formula(entry.name) if entry.sort in ("species", "gas") else entry.name
        token = f" {style.formula(entry.id)}" if entry.sort in ("species", "gas") and entry.id != entry.name else ""
        yield f"{style.strong(shown)}{token}, {entry.sort}"
        yield from table(
            [_row(fact, style, citations) for fact in entry.facts], style.width, indent=2, limits={0: _LABEL}
        )


def _row(fact: Fact, style: Style, citations: Citations) -> list[str]:
    text = fact.text
    notes = [fact.note] if fact.note else []
    if fact.value is not None:
        text = quantity(bounds(fact.value), fact.value.unit, _EXACT)
        notes = [note for note in (fact.value.basis, fact.value.note) if note]
    elif fact.form == "formula":
        text = style.formula(fact.text)
    elif fact.form == "equation":
        text = _sum_text(fact.text, style) if _is_sum(fact.text) else style.equation(fact.text)
    marks = citations.marks([fact.source]) if fact.source else ""
    behind = "; ".join(notes)
    if not style.plain:
        behind = _MINUS.sub("−", behind)
    tail = f" ({behind})" if behind else ""
    return [fact.label, f"{text}{tail}" + (f" {marks}" if marks else "")]


def _sum_text(text: str, style: Style) -> str:
    """``2 Na+ + HS-`` with its formulas as the style shows them."""
    terms = []
    for term in text.split(" + "):
        count, blank, token = term.rpartition(" ")
        terms.append(f"{count}{blank}{style.formula(token)}")
    return " + ".join(terms)


def _is_sum(text: str) -> bool:
    return not any(sign in text for sign in ("=", "->", ">"))
