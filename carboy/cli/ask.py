"""``carboy ask``: questions to the graph and the rules."""

from __future__ import annotations

from typing import Annotated

import typer

from carboy.cli.output import first_reading, write

SHORT = "Ask the graph and the rules."
HELP = """Ask the graph and the rules in the words of the rules. A word with ? is what you want to know.

\b
carboy ask "?r gives ?g, ?g is toxic-gas, ?r needs acid"     which rules set which toxic gas free by acid
carboy ask "?s is metal-sulfide"                             everything of a class
carboy ask "?s is oxidiser but not nitrate"                  with an exception
carboy ask "?r flags explosive, ?r needs ?x"                 what can become explosive, and from what
carboy ask "?m contains sodium hypochlorite"                 trade materials by ingredient
carboy ask "?s dissolves into CN-, ?s contains Zn"           salts by ion and element
carboy ask "?x attacks HDPE"                                 what a bottle does not stand
carboy ask "?r cites niosh-idlh"                             rules by source

Clauses are joined by ", " and all must hold. Relations: is, gives, needs, flags, cites, contains,
dissolves into, attacks. 'or' and 'but not' join objects. 'needs acid' and 'needs base' count a limit on the pH too.
Exit status: 0 with answers, 1 without, 2 if the pattern cannot be read."""


def ask(
    pattern: Annotated[str, typer.Argument(metavar="PATTERN", help="Clauses joined by commas.", show_default=False)],
    json: Annotated[bool, typer.Option("--json", help="Print a list of objects, one an answer.")] = False,
    plain: Annotated[bool, typer.Option("--plain", help="ASCII without colour, for logs.")] = False,
) -> None:
    from carboy.knowledge.index import load_index
    from carboy.reports.style import style_for
    from carboy.rulebook.book import load_rules
    from carboy.rulebook.query import Questions

    with first_reading():
        questions = Questions(load_index(), load_rules())
    variables, answers = questions.ask(pattern)
    if json:
        from msgspec.json import encode, format

        rows = [{name: answer[name][1] for name in variables} for answer in answers]
        write(format(encode(rows), indent=2).decode())
    else:
        from carboy.reports.answers import answers_text

        write(answers_text(variables, answers, questions.index, style_for(plain=plain)))
    raise typer.Exit(0 if answers else 1)
