"""``carboy vet``: is this procedure safe in this order, and does it reach its aim?"""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from carboy.cli.output import Progress, status_of, write

HELP = """Is this procedure safe in this order, at these amounts, in this vessel, and does it reach its aim?

\b
carboy vet procedure.yaml
carboy vet monday/*.yaml --plain > monday.log
carboy vet procedure.yaml --json

A case file has bottles, vessels, steps and goals; cases/ holds examples. Several files: the exit status is that of
the gravest verdict, and --json prints a list of objects."""


def vet(
    files: Annotated[list[Path], typer.Argument(metavar="FILE", help="Case files (YAML).", show_default=False)],
    json: Annotated[bool, typer.Option("--json", help="Print the report as one JSON object.")] = False,
    plain: Annotated[bool, typer.Option("--plain", help="ASCII without colour, for logs.")] = False,
    full: Annotated[bool, typer.Option("--full", help="Every derivation, note and citation.")] = False,
) -> None:
    from carboy.reports.style import style_for
    from carboy.reports.terminal import report_text
    from carboy.text.cases import read_case
    from carboy.vetting import laboratory

    lab = laboratory()
    plans = [read_case(file, lab.names) for file in files]  # all are read before the first is judged
    reports = []
    for plan in plans:
        with Progress("step") as progress:
            reports.append(lab.vet(plan, progress))
    if json:
        objects = [report.model_dump_json(indent=2) for report in reports]
        write(objects[0] if len(objects) == 1 else "[" + ",\n".join(objects) + "]")
    else:
        style = style_for(plain=plain)
        texts = [report_text(report, style, lab.index.sources, full=full) for report in reports]
        if len(texts) > 1:
            texts = [f"{file}\n\n{text}" for file, text in zip(files, texts, strict=True)]
        write("\n\n".join(texts))
    raise typer.Exit(status_of(reports))
