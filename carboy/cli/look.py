"""``carboy look``: what the graph knows of a thing."""

from __future__ import annotations

from typing import Annotated

import typer

from carboy.cli.output import first_reading, write

SHORT = "What the graph knows of a thing."
HELP = """What the graph knows of a substance, material, gas, species, class, container material or source.

\b
carboy look "muriatic acid"
carboy look H2S
carboy look 1313-82-2
carboy look metal-sulfide
carboy look HDPE

Every value stands with how it was had (looked up, computed, from memory ...) and with its source."""


def look(
    name: Annotated[
        list[str],
        typer.Argument(metavar="NAME", help="Name, formula, CAS number, class or source.", show_default=False),
    ],
    json: Annotated[bool, typer.Option("--json", help="Print a list of objects.")] = False,
    plain: Annotated[bool, typer.Option("--plain", help="ASCII without colour, for logs.")] = False,
) -> None:
    from carboy.errors import InputError
    from carboy.knowledge.entries import entries, suggestions
    from carboy.knowledge.index import load_index
    from carboy.knowledge.names import Names

    text = " ".join(" ".join(name).split())
    with first_reading():
        index = load_index()
    names = Names(index)
    found = entries(text, index, names) if text else []
    if not found:
        raise InputError(
            f"the graph knows nothing called '{text}'", suggestions=suggestions(text, index, names) if text else ()
        )
    if json:
        from msgspec.json import encode, format

        write(format(encode(found), indent=2).decode())
        return
    from carboy.reports.knowledge import entries_text
    from carboy.reports.style import style_for

    write(entries_text(found, style_for(plain=plain), index.sources))
