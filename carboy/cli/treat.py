"""``carboy treat``: how does this waste become safe?"""

from __future__ import annotations

from typing import Annotated

import typer

from carboy.cli.output import Progress, Status, first_reading, write

SHORT = "How does this waste become safe?"
HELP = """How does this waste become safe? Procedures from the treatments of the graph, each vetted by the engine before it is offered.

\b
carboy treat "4 L of (0.02 M mercury(II) nitrate + 0.5 M nitric acid)"
carboy treat "2 L of (0.005 M potassium dichromate + 0.02 M sulfuric acid)" --limit "dissolved chromium below 0.5 mg/L"
carboy treat "5 L of (0.02 M sodium cyanide + 0.02 M sodium hydroxide)" --case 1 > cyanide.yaml
carboy treat "1 L of acetone"

The waste is what stands on its label. The levels that count as safe are those of the graph; --limit adds one, or takes the
place of the one for the same element. --case N prints route N as a case file, to be changed and vetted again.

Exit status: 0 the first route raises no objection, or there is nothing to treat; 1 it goes under conditions, or no bench treatment is
sound; 3 cannot say (something unknown, a metal without a record, a strength left open); 2 the input is wrong."""


def treat(
    waste: Annotated[str, typer.Argument(metavar="WASTE", help="As read off its label.", show_default=False)],
    limit: Annotated[str, typer.Option(metavar="GOAL", help='"dissolved mercury below 0.2 mg/L".')] = "",
    place: Annotated[str, typer.Option(metavar="WORD", help="hood, bench, room, outdoors.")] = "",
    hood_flow: Annotated[str, typer.Option(metavar="TEXT", help='Air drawn by the hood, "0.4 m3/s".')] = "",
    case: Annotated[int | None, typer.Option(metavar="N", help="Print route N as a case file; nothing else.")] = None,
    json: Annotated[bool, typer.Option("--json", help="Print the answer as one JSON object.")] = False,
    plain: Annotated[bool, typer.Option("--plain", help="ASCII without colour, for logs.")] = False,
) -> None:
    from carboy.errors import InputError
    from carboy.planning.routes import DEFAULT_SETTING, find_routes
    from carboy.reports.routes import routes_text
    from carboy.reports.style import style_for
    from carboy.vetting import laboratory

    with first_reading():
        lab = laboratory()
    setting = dict(DEFAULT_SETTING)
    if place:
        setting = {"place": place, "temperature": setting["temperature"]}
    if hood_flow:
        setting["hood_flow"] = hood_flow
    with Progress("Trying route") as progress:
        report = find_routes(lab, waste, limit or None, setting, progress)
    if case is not None:
        if not 1 <= case <= len(report.routes):
            raise InputError(f"there is no route {case}; {len(report.routes)} were found")
        write(report.routes[case - 1].case_file)
    elif json:
        write(report.model_dump_json(indent=2))
    else:
        write(routes_text(report, style_for(plain=plain), lab.index.sources))
    raise typer.Exit(_status(report.outcome, report.routes[0].report.verdict if report.routes else ""))


def _status(outcome: str, verdict: str) -> Status:
    if outcome == "routes found":
        return Status.NO_OBJECTION if verdict == "no objection" else Status.OBJECTION
    if outcome == "nothing to treat":
        return Status.NO_OBJECTION
    return Status.CANNOT_SAY if outcome == "cannot say" else Status.OBJECTION
