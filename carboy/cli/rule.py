"""``carboy rule``: a rule in its own words."""

from __future__ import annotations

from typing import Annotated

import typer

from carboy.cli.output import first_reading, write

SHORT = "A rule in its own words."
HELP = """A rule in its own words: what it says, what prevents it, its conditions, equations, sources and examples.

\b
carboy rule acid-frees-hydrogen-sulfide
carboy rule                                  lists all rules"""


def rule(
    identifier: Annotated[
        str, typer.Argument(metavar="ID", help="The rule's id; without one all are listed.", show_default=False)
    ] = "",
    plain: Annotated[bool, typer.Option("--plain", help="ASCII without colour, for logs.")] = False,
) -> None:
    from carboy.errors import InputError
    from carboy.reports.style import style_for
    from carboy.rulebook.book import load_rules

    rules = {one.id: one for one in load_rules()}
    style = style_for(plain=plain)
    if not identifier:
        from carboy.reports.rules import list_text

        write(list_text(list(rules.values()), style))
        return
    if identifier not in rules:
        from rapidfuzz import fuzz, process

        # by words in any order, so that a few words of an id find it, and a word that is in none finds nothing
        near = process.extract(
            identifier, list(rules), scorer=fuzz.token_set_ratio, processor=_words, limit=3, score_cutoff=75
        )
        raise InputError(f"there is no rule '{identifier}'", suggestions=tuple(word for word, _, _ in near))
    from carboy.knowledge.index import load_index
    from carboy.reports.rules import rule_page

    with first_reading():
        sources = load_index().sources
    write(rule_page(rules[identifier], style, sources))


def _words(identifier: str) -> str:
    return " ".join(identifier.casefold().replace("-", " ").split())
