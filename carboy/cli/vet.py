"""``carboy vet``: is this procedure safe in this order, and does it reach its aim?"""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from carboy.cli.output import Progress, first_reading, status_of, write

HELP = """Is this procedure safe in this order, at these amounts, in this vessel, and does it reach its aim?

\b
carboy vet procedure.yaml
carboy vet monday/*.yaml --plain > monday.log
carboy vet procedure.yaml --json
carboy vet procedure.yaml --why 2

A case file has bottles, vessels, steps and goals; cases/ holds examples. Several files: the exit status is that of
the gravest verdict, and --json prints a list of objects."""


def vet(
    files: Annotated[list[Path], typer.Argument(metavar="FILE", help="Case files (YAML).", show_default=False)],
    json: Annotated[bool, typer.Option("--json", help="Print the report as one JSON object.")] = False,
    plain: Annotated[bool, typer.Option("--plain", help="ASCII without colour, for logs.")] = False,
    full: Annotated[bool, typer.Option("--full", help="Every derivation, note and citation.")] = False,
    why: Annotated[
        int | None, typer.Option(metavar="N", help="How the numbers of finding (N) were had; nothing else.")
    ] = None,
) -> None:
    from carboy.cli.printing import printed
    from carboy.errors import InputError
    from carboy.text.cases import read_case
    from carboy.vetting import laboratory

    if why is not None and len(files) > 1:
        raise InputError("--why speaks of one report, and these are several files")
    with first_reading():
        lab = laboratory()
    plans = [read_case(file, lab.names) for file in files]  # all are read before the first is judged
    reports = []
    for plan in plans:
        with Progress("step") as progress:
            reports.append(lab.vet(plan, progress))
    names = [str(file) for file in files]
    write(printed(reports, lab, names, json=json, plain=plain, full=full, why=why))
    raise typer.Exit(status_of(reports))
