"""``carboy combine``: may these bottles go together?"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Annotated

import typer

from carboy.cli.output import Progress, first_reading, status_of, write

SHORT = "May these bottles go together?"
HELP = """May these bottles go together? They are poured one after the other, in the order given.

\b
carboy combine "500 mL of 6 % sodium hypochlorite" "100 mL of 31 % hydrochloric acid"
carboy combine "about 2 L of household bleach" "250 mL of 2 M NaOH"
carboy combine "50 g of sodium bicarbonate" "1 L of 1 M HCl" --volume "2 L" --cover sealed
carboy combine "1 L of (0.05 M mercury(II) nitrate + 0.5 M nitric acid)" "20 g of CAS 1313-82-2"
carboy combine "1 L of unknown, pH 2" "1 L of 0.1 M KCN" --place hood --hood-flow "0.4 m3/s"
carboy combine "1 L of 0.1 M sodium sulfide" "1 L of 0.5 M HCl" --why 1
carboy combine "1 L of 0.1 M sodium sulfide" "1 L of 0.5 M HCl" --mend

A portion is what stands on a label: amount, strength, name, formula, CAS number or SMILES.
Ranges are followed to their ends: "10-50 g/L", "about 2 L", "up to 5 g", "trace of", "unknown"."""


def combine(
    portions: Annotated[
        list[str], typer.Argument(metavar="PORTION", help="As read off the labels.", show_default=False)
    ],
    volume: Annotated[
        str, typer.Option(metavar="TEXT", help='Volume of the vessel, "2 L". Twice the content if not given.')
    ] = "",
    cover: Annotated[str, typer.Option(metavar="WORD", help="open, loose, vented or sealed.")] = "open",
    material: Annotated[
        str, typer.Option(metavar="NAME", help='Of the vessel: glass, HDPE, "stainless steel".')
    ] = "glass",
    temperature: Annotated[str, typer.Option(metavar="TEXT", help='Of the place and the bottles, "22 degC".')] = "",
    place: Annotated[
        str, typer.Option(metavar="WORD", help="hood, bench, room, outdoors, glovebox, cabinet or store.")
    ] = "",
    hood_flow: Annotated[str, typer.Option(metavar="TEXT", help='Air drawn by the hood, "0.4 m3/s".')] = "",
    room_volume: Annotated[str, typer.Option(metavar="TEXT", help='"60 m3".')] = "",
    air_changes: Annotated[str, typer.Option(metavar="TEXT", help='Of the room, "6 per hour".')] = "",
    json: Annotated[bool, typer.Option("--json", help="Print the report as one JSON object.")] = False,
    plain: Annotated[bool, typer.Option("--plain", help="ASCII without colour, for logs.")] = False,
    full: Annotated[bool, typer.Option("--full", help="Every derivation, note and citation.")] = False,
    why: Annotated[
        int | None, typer.Option(metavar="N", help="How the numbers of finding (N) were had; nothing else.")
    ] = None,
    mend: Annotated[bool, typer.Option("--mend", help="Look for changes that clear it, each vetted.")] = False,
    apply: Annotated[
        int | None, typer.Option(metavar="N", help="Write the case file of change N; with --mend.")
    ] = None,
    output: Annotated[Path | None, typer.Option(metavar="FILE", help="The case file that --apply writes.")] = None,
) -> None:
    from carboy.cli.printing import printed
    from carboy.errors import InputError
    from carboy.text.cases import setting_from_mapping, vessel_from_mapping
    from carboy.vetting import laboratory

    if len(portions) < 2:
        raise InputError(f"combine needs two portions or more, and this is one: '{portions[0]}'")
    if mend and why is not None:
        raise InputError("--why shows one finding and nothing else; --mend goes without it")
    if not mend and (apply is not None or output is not None):
        raise InputError("--apply and --output belong to --mend")
    if (apply is None) != (output is None):
        raise InputError("--apply (which change) and --output (which file) belong together")
    surroundings = {
        "place": place,
        "hood_flow": hood_flow,
        "room_volume": room_volume,
        "air_changes": air_changes,
        "temperature": temperature,
    }
    with of_options():
        setting = setting_from_mapping({key: value for key, value in surroundings.items() if value})
    with first_reading():
        lab = laboratory()
    described = {"volume": volume, "material": material, "cover": cover}
    with of_options():
        vessel = vessel_from_mapping("vessel", {key: value for key, value in described.items() if value}, lab.names)
    report = lab.combine(tuple(portions), setting, vessel)
    text = printed([report], lab, json=json, plain=plain, full=full, why=why)
    if mend:
        from carboy.cli.mending import chosen, with_mendings, write_mended

        with Progress("change") as progress:
            mendings = lab.mend_together(tuple(portions), setting, vessel, progress)
        text = with_mendings(text, report, mendings, json=json, plain=plain)
        if apply is not None:
            mended = chosen(mendings, apply)
            write(text)
            typer.echo(write_mended(mended, None, output), err=True)
            raise typer.Exit(status_of([mended.report]))
    write(text)
    raise typer.Exit(status_of([report]))


@contextmanager
def of_options() -> Iterator[None]:
    """What is wrong with a setting or vessel is told by the option that gave it."""
    from carboy.errors import InputError

    try:
        yield
    except InputError as error:
        if error.span is None or "." not in error.span.file:
            raise
        option = "--" + error.span.file.rpartition(".")[2].replace("_", "-")
        words = f"{option}: {error.message}\n{error.span.excerpt()}"
        raise InputError(words, suggestions=error.suggestions) from None
