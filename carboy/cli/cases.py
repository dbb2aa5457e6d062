"""``carboy cases``: the expect blocks of case files, run."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from carboy.cli.output import Progress, Status, counted_words, first_reading, write

SHORT = "Run the expect blocks of case files."
HELP = """Run the expect blocks of case files, one line a case. Without files: the cases that ship with carboy.

\b
carboy cases
carboy cases my-procedures/*.yaml
carboy cases my-procedures

Exit status: 0 if all hold, 1 if an expectation fails, 2 if a file cannot be read."""

_SUFFIXES = (".yaml", ".yml")


def cases(
    files: Annotated[list[Path] | None, typer.Argument(metavar="FILE", help="Case files.", show_default=False)] = None,
    plain: Annotated[bool, typer.Option("--plain", help="ASCII without colour, for logs.")] = False,
) -> None:
    from carboy.datafiles import data_dir
    from carboy.errors import CarboyError, InputError
    from carboy.reports.style import style_for
    from carboy.rulebook.expectations import check_expectations
    from carboy.text.cases import read_case
    from carboy.vetting import laboratory

    found = case_files(files or [data_dir("cases")])
    if not found:
        raise InputError("there is no case file here")
    style = style_for(plain=plain)
    with first_reading():
        lab = laboratory()
    failed = unreadable = expectations = 0
    with Progress("case") as progress:
        for number, file in enumerate(found, start=1):
            progress(number, len(found), file.stem)
            try:
                case = read_case(file, lab.names)
                failures = check_expectations(lab.vet(case), case)
            except CarboyError as error:
                unreadable += 1
                write(style.finished(f"{style.alarm('WRONG')}  {file.name}\n        {error.render()}"))
                continue
            expectations += len(case.expect)
            count = counted_words(len(case.expect), "expectation")
            known = sum(1 for one in case.expect if one.known_failure)
            count += f", {known} of them a known failure" if known else ""
            failed += bool(failures)
            word = style.alarm("FAILS") if failures else "holds"
            write(style.finished(f"{word}  {file.stem}: {count}"))
            for failure in failures:
                write(style.finished(f"       {failure.text}: {failure.reason}"))
    counted = f"{counted_words(len(found), 'case')}, {counted_words(expectations, 'expectation')}"
    write(f"{counted}, {failed} failed, {unreadable} could not be read")
    raise typer.Exit(Status.WRONG_INPUT if unreadable else Status.OBJECTION if failed else Status.NO_OBJECTION)


def case_files(places: list[Path]) -> list[Path]:
    """The files named, and the case files below the folders named, in steady order."""
    found: list[Path] = []
    for place in places:
        if place.is_dir():
            found += sorted(file for file in place.rglob("*") if file.suffix in _SUFFIXES and file.is_file())
        else:
            found.append(place)
    return list(dict.fromkeys(found))
