"""``carboy dose``: how much reagent does an aim need, and how much is too much?"""

from __future__ import annotations

from typing import Annotated

import typer

from carboy.cli.output import Status, first_reading, write

SHORT = "How much reagent, and how much is too much?"
HELP = """How much of a reagent does an aim need, how much is too much, and which test tells when to stop?

\b
carboy dose "4 L of (0.02 M mercury(II) nitrate + 0.5 M sodium bicarbonate)" --with "0.5 M sodium sulfide" \\
    --aim "dissolved mercury below 0.2 mg/L"
carboy dose "1 L of 0.2 M hydrochloric acid" --with "sodium bicarbonate" --aim "pH between 6 and 9" --over "20 min"

The reagent stands without an amount; with one ("200 mL of 0.5 M sodium sulfide"), that is the most at hand. What is
offered has been vetted as 'carboy combine' does it. Exit status: 0 there is a dose with nothing above a note, 1 there
is none or only with precautions, 3 cannot say, 2 the input is wrong."""


def dose(
    waste: Annotated[str, typer.Argument(metavar="WASTE", help="As read off the label.", show_default=False)],
    reagent: Annotated[
        str, typer.Option("--with", metavar="REAGENT", help="As on its label, without an amount.", show_default=False)
    ],
    aim: Annotated[
        str,
        typer.Option(metavar="AIM", help='"dissolved lead below 0.69 mg/L", "pH between 7 and 9".', show_default=False),
    ],
    over: Annotated[str, typer.Option(metavar="TIME", help='Time that the addition takes, "20 min".')] = "",
    volume: Annotated[str, typer.Option(metavar="TEXT", help='Volume of the vessel, "10 L".')] = "",
    cover: Annotated[str, typer.Option(metavar="WORD", help="open, loose, vented or sealed.")] = "open",
    material: Annotated[str, typer.Option(metavar="NAME", help="Of the vessel: glass, HDPE.")] = "glass",
    temperature: Annotated[str, typer.Option(metavar="TEXT", help='Of the place and the bottles, "22 degC".')] = "",
    place: Annotated[str, typer.Option(metavar="WORD", help="hood, bench, room, outdoors.")] = "",
    hood_flow: Annotated[str, typer.Option(metavar="TEXT", help='Air drawn by the hood, "0.4 m3/s".')] = "",
    json: Annotated[bool, typer.Option("--json", help="Print the report as one JSON object.")] = False,
    plain: Annotated[bool, typer.Option("--plain", help="ASCII without colour, for logs.")] = False,
    full: Annotated[bool, typer.Option("--full", help="Every note and citation.")] = False,
) -> None:
    from carboy.planning.dosing import dose_report
    from carboy.reports.dosing import dose_text
    from carboy.reports.style import style_for
    from carboy.text.cases import setting_from_mapping, vessel_from_mapping
    from carboy.text.quantities import parse_quantity
    from carboy.vetting import laboratory

    surroundings = {"place": place, "hood_flow": hood_flow, "temperature": temperature}
    setting = setting_from_mapping({key: value for key, value in surroundings.items() if value})
    time = parse_quantity(over, "time") if over else None
    with first_reading():
        lab = laboratory()
    described = {"volume": volume, "material": material, "cover": cover}
    vessel = vessel_from_mapping("vessel", {key: value for key, value in described.items() if value}, lab.names)
    report = dose_report(lab, waste, reagent, aim, setting, vessel, time)
    if json:
        write(report.model_dump_json(indent=2))
    else:
        write(dose_text(report, style_for(plain=plain), lab.index.sources, full=full))
    ranked = {"no objection": Status.NO_OBJECTION, "cannot say": Status.CANNOT_SAY}
    raise typer.Exit(ranked.get(report.verdict, Status.OBJECTION))
