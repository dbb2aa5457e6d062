"""``carboy vet``: is this procedure safe in this order, and does it reach its aim?"""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from carboy.cli.output import Progress, first_reading, status_of, write

SHORT = "Is this procedure safe, and does it reach its aim?"
HELP = """Is this procedure safe in this order, at these amounts, in this vessel, and does it reach its aim?

\b
carboy vet procedure.yaml
carboy vet monday/*.yaml --plain > monday.log
carboy vet procedure.yaml --json
carboy vet procedure.yaml --why 2
carboy vet procedure.yaml --follow mercury
carboy vet procedure.yaml --mend
carboy vet procedure.yaml --mend --apply 1 --output mended.yaml

A case file has bottles, vessels, steps and goals; cases/ holds examples. Several files: the exit status is that of
the gravest verdict, and --json prints a list of objects.

--follow ELEMENT tells where every gram of it went (name or symbol; may be given several times): by vessel, cake, filtrate,
washings, contaminated solids, samples and gas, at the end and after each step.

--mend looks for the nearest changes that clear it (reorder, neutralise, dilute, cool, slow down, filter, vent, keep
apart); each has been vetted before it is shown. --apply writes one; over the old file only with the old text kept
beside it as FILE.bak."""


def vet(
    files: Annotated[list[Path], typer.Argument(metavar="FILE", help="Case files (YAML).", show_default=False)],
    json: Annotated[bool, typer.Option("--json", help="Print the report as one JSON object.")] = False,
    plain: Annotated[bool, typer.Option("--plain", help="ASCII without colour, for logs.")] = False,
    full: Annotated[bool, typer.Option("--full", help="Every derivation, note and citation.")] = False,
    why: Annotated[
        int | None, typer.Option(metavar="N", help="How the numbers of finding (N) were had; nothing else.")
    ] = None,
    follow: Annotated[
        list[str] | None,
        typer.Option(metavar="ELEMENT", help="Where every gram of it went; a name or symbol.", show_default=False),
    ] = None,
    mend: Annotated[bool, typer.Option("--mend", help="Look for changes that clear it, each vetted.")] = False,
    apply: Annotated[
        int | None, typer.Option(metavar="N", help="Write the case file of change N; with --mend.")
    ] = None,
    output: Annotated[
        Path | None,
        typer.Option(metavar="FILE", help="Where --apply writes; the old file, with a backup, if not given."),
    ] = None,
) -> None:
    from carboy.cli.printing import printed
    from carboy.errors import InputError
    from carboy.text.cases import read_case
    from carboy.vetting import laboratory

    if why is not None and len(files) > 1:
        raise InputError("--why speaks of one report, and these are several files")
    if mend and len(files) > 1:
        raise InputError("--mend works on one file at a time")
    if mend and why is not None:
        raise InputError("--why shows one finding and nothing else; --mend goes without it")
    if not mend and (apply is not None or output is not None):
        raise InputError("--apply and --output belong to --mend")
    if output is not None and apply is None:
        raise InputError("--output needs --apply, the number of the change to write")
    if follow and why is not None:
        raise InputError("--why shows one finding and nothing else; --follow goes without it")
    elements = _symbols(follow)
    with first_reading():
        lab = laboratory()
    plans = [read_case(file, lab.names) for file in files]  # all are read before the first is judged
    reports = []
    for plan in plans:
        with Progress("step") as progress:
            reports.append(lab.vet(plan, progress, hold_points=True, follow=elements))
    names = [str(file) for file in files]
    text = printed(reports, lab, names, json=json, plain=plain, full=full, why=why)
    if mend:
        from carboy.cli.mending import chosen, with_mendings, write_mended

        with Progress("change") as progress:
            mendings = lab.mend(plans[0], progress)
        text = with_mendings(text, reports[0], mendings, json=json, plain=plain)
        if apply is not None:
            mended = chosen(mendings, apply)
            write(text)
            typer.echo(write_mended(mended, files[0], output), err=True)
            raise typer.Exit(status_of([mended.report]))
    write(text)
    raise typer.Exit(status_of(reports))


def _symbols(words: list[str] | None) -> list[str]:
    if not words:
        return []
    from carboy.planning.accounting import element_symbol

    return [element_symbol(word) for word in words]
