"""Answers to a pattern as a table, a column for each thing asked for."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from carboy.model.knowledge import Index
from carboy.reports.style import Style
from carboy.reports.table import table


def answers_text(
    variables: Sequence[str], answers: Sequence[Mapping[str, tuple[str, str]]], index: Index, style: Style
) -> str:
    """The table with its heading, and how many answers there are."""
    if not answers:
        return style.finished("Nothing in the graph and the rules answers that.\n")
    rows = [[_shown(answer[name], index, style) for name in variables] for answer in answers]
    lines = list(table([list(variables), *rows], style.width))
    count = "1 answer" if len(answers) == 1 else f"{len(answers)} answers"
    return style.finished("\n".join([style.strong(lines[0]), *lines[1:], "", count]) + "\n")


def _shown(thing: tuple[str, str], index: Index, style: Style) -> str:
    sort, key = thing
    if sort == "chemical":
        record = index.species.get(key)
        name = index.substances[key].name if key in index.substances else (record.name if record is not None else "")
        formula = style.formula(key)
        return name if key in index.substances or (formula == key and name) else f"{formula} {name}".strip()
    if sort == "material":
        return index.materials[key].name
    if sort == "container":
        return index.containers[key].name
    return key
