"""A rule for a terminal, from the rule file alone: explanation first, then conditions, equations, sources, examples."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from carboy.model.knowledge import Source
from carboy.model.rule import Example, Rule
from carboy.reports.citations import Citations
from carboy.reports.style import Style, wrapped
from carboy.text.rule_printer import condition_text, flag_text, reaction_text

_MARGIN = "  "
_ID = 40  # columns for the id of a rule in the list; a longer one has its title below


def list_text(rules: Sequence[Rule], style: Style) -> str:
    """All rules, one a line: id and title."""
    lines: list[str] = []
    for rule in rules:
        lead = rule.id.ljust(_ID) + "  "
        if len(rule.id) > _ID:
            lines.append(rule.id)
            lead = " " * len(lead[: _ID + 2])
        lines += wrapped(rule.title + (f" (off: {rule.off})" if rule.off else ""), style.width, lead, " " * (_ID + 2))
    return style.finished("\n".join([*lines, "", f"{len(rules)} rules"]) + "\n")


def rule_page(rule: Rule, style: Style, sources: Mapping[str, Source]) -> str:
    """The whole rule."""
    return style.finished("\n".join(_lines(rule, style, Citations(sources))) + "\n")


def _lines(rule: Rule, style: Style, citations: Citations) -> Iterator[str]:
    yield from (style.strong(line) for line in wrapped(rule.title, style.width))
    place = f", {rule.place.file}:{rule.place.line}" if rule.place else ""
    yield style.faint(f"{rule.id}{place}")
    if rule.off:
        yield from wrapped(f"Switched off: {rule.off}", style.width)
    if rule.says:
        yield ""
        yield from wrapped(f"{rule.says} {citations.marks(rule.cites)}", style.width)
    speed = "" if rule.speed == "at once" else f", in {rule.speed}"
    yield from _section("What prevents it", rule.guard, style)
    yield from _section("It needs", [condition_text(one) for one in rule.needs], style)
    yield from _section(f"It does{speed}", [style.equation(reaction_text(one)) for one in rule.does], style)
    yield from _section("It flags", [flag_text(one) for one in rule.flags], style)
    yield from _section("It fires on", [_example(one) for one in rule.fires], style)
    yield from _section("It is silent on", [_example(one) for one in rule.silent], style)
    yield from citations.lines(style, full=True)


def _section(title: str, items: Sequence[str], style: Style) -> Iterator[str]:
    if not items:
        return
    yield ""
    yield style.strong(title)
    for item in items:
        yield from wrapped(item, style.width, f"{_MARGIN}- ")


def _example(example: Example) -> str:
    return example.text
