"""``carboy kb``: is the knowledge sound?"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from carboy.cli.output import Progress, Status, Waiting, counted_words, first_reading, write

if TYPE_CHECKING:
    from carboy.model.knowledge import Index
    from carboy.model.rule import Rule

app = typer.Typer(help="Check the knowledge graph and the rules.", no_args_is_help=True, rich_markup_mode=None)

CHECK_HELP = """Is the knowledge sound? Loads the graph strictly, runs its SHACL shapes, checks every rule, and runs the fires
and silent lines of the rules on the engine.

\b
carboy kb check
carboy kb check --rule acid-frees-hydrogen-sulfide     only this rule's examples
carboy kb check --quick                                without running the examples
carboy kb check --kb my/kb --rules my/rules

Problems stand as file:line: what is wrong. Exit status: 0 sound, 1 errors."""


@app.callback()
def _group() -> None:
    """Check the knowledge graph and the rules."""


@app.command("check", help=CHECK_HELP)
def check(
    rule: Annotated[
        list[str] | None, typer.Option("--rule", metavar="ID", help="Run the examples of this rule only.")
    ] = None,
    quick: Annotated[bool, typer.Option("--quick", help="Do not run the examples.")] = False,
    kb: Annotated[
        Path | None, typer.Option("--kb", metavar="FOLDER", help="A knowledge folder; the shipped one if not given.")
    ] = None,
    rules: Annotated[Path | None, typer.Option("--rules", metavar="PATH", help="A rule file or folder.")] = None,
    notes: Annotated[bool, typer.Option("--notes", help="Show notes too (sources that nothing uses).")] = False,
) -> None:
    from carboy.errors import InputError, RuleError
    from carboy.knowledge.index import load_index
    from carboy.knowledge.validate import check_knowledge
    from carboy.rulebook.book import load_rules

    if rules is not None and not rules.exists():
        raise InputError(f"there is no rule file or folder '{rules}'")
    with Waiting("Loading the graph and running its shapes (some seconds)"):
        problems = check_knowledge(kb)
    lines = [f"kb/{one}" for one in problems if one.severity == "error" or notes]
    errors = sum(one.severity == "error" for one in problems)
    for line in lines:
        write(line)
    if errors:
        write(f"kb: {counted_words(errors, 'error')}; the rules are not checked until it loads")
        raise typer.Exit(Status.OBJECTION)
    with Waiting("Compiling the graph (some seconds)"):
        index = load_index(kb)
    write(f"kb: {_content(index)}; sound")
    try:
        book = load_rules(rules)
    except RuleError as error:
        write(f"rules/{error.render()}")
        write("rules: they cannot be read")
        raise typer.Exit(Status.OBJECTION) from None
    raise typer.Exit(_check_rules(book, index, rule or [], quick=quick))


COVERAGE_HELP = """What do the graph and the rules leave uncovered? Classes that no rule asks for, substances that no rule can bind,
gases without a Henry constant, substances without a CAS number, rules that no shipped case fires.

\b
carboy kb coverage
carboy kb coverage --examples      also runs the fires lines of the rules (minutes)
carboy kb coverage --quick         runs nothing
carboy kb coverage --json

A gap is not always a fault. Exit status: 0; 2 if something cannot be read."""


@app.command("coverage", help=COVERAGE_HELP)
def coverage_(
    quick: Annotated[bool, typer.Option("--quick", help="Run neither cases nor examples.")] = False,
    examples: Annotated[bool, typer.Option("--examples", help="Run the fires lines of the rules too.")] = False,
    json: Annotated[bool, typer.Option("--json", help="Print one object.")] = False,
    plain: Annotated[bool, typer.Option("--plain", help="ASCII without colour, for logs.")] = False,
) -> None:
    from carboy.cli.cases import case_files
    from carboy.datafiles import data_dir
    from carboy.errors import InputError
    from carboy.reports.style import style_for
    from carboy.rulebook.coverage import coverage, rules_fired
    from carboy.text.cases import read_case
    from carboy.vetting import laboratory

    if quick and examples:
        raise InputError("--quick runs nothing and --examples runs them all; choose one")
    with first_reading():
        lab = laboratory()
    fired = None
    if not quick:
        plans = [read_case(file, lab.names) for file in case_files([data_dir("cases")])]
        with Progress("run") as progress:
            fired = rules_fired(lab, plans, examples=examples, progress=progress)
    found = coverage(lab.index, lab.rules, fired)
    if json:
        from msgspec.json import encode, format

        write(format(encode(found), indent=2).decode())
        return
    from carboy.reports.gaps import Gap, gaps_text

    gaps = [
        Gap("Classes that no rule asks for", found.classes_without_rule),
        Gap("Substances without a class", found.substances_without_class, "A salt acts through its ions."),
        Gap("Gases without a Henry constant", found.gases_without_henry_constant, "A vapour need not dissolve."),
        Gap("Substances without a CAS number", found.substances_without_cas),
    ]
    if found.rules_not_fired is not None:
        gaps.append(Gap(f"Rules that no {'case or example' if examples else 'case'} fires", found.rules_not_fired))
    write(gaps_text(gaps, style_for(plain=plain)))


def _check_rules(book: tuple[Rule, ...], index: Index, only: list[str], *, quick: bool) -> Status:
    from carboy.errors import InputError
    from carboy.knowledge.names import Names
    from carboy.rulebook.lint import lint_rules
    from carboy.text.portions import parse_portion

    names = Names(index)
    unknown = [one for one in only if one not in {rule.id for rule in book}]
    if unknown:
        raise InputError(f"there is no rule '{unknown[0]}'")
    with Waiting(f"Checking {len(book)} rules (some seconds)"):
        problems = lint_rules(book, index, names=index.names, parse_portion=lambda text: parse_portion(text, names))
    for one in problems:
        write(f"rules/{one}" if one.severity == "error" else f"rules/{one} ({one.severity})")
    errors = sum(one.severity == "error" for one in problems)
    examples = sum(len(rule.fires) + len(rule.silent) for rule in book)
    write(
        f"rules: {len(book)} rules, {examples} examples; {counted_words(errors, 'error')}, {len(problems) - errors} remarks"
    )
    if quick:
        return Status.OBJECTION if errors else Status.NO_OBJECTION
    from carboy.rulebook.running import check_examples
    from carboy.vetting import Laboratory

    wanted = [rule for rule in book if not only or rule.id in only]
    with Progress("example") as progress:
        failed = check_examples(Laboratory(index, book), wanted, progress)
    for one in failed:
        write(f"rules/{one}")
    run = sum(len(rule.fires) + len(rule.silent) for rule in wanted if not rule.off)
    misses = sum(bool(example.known_miss) for rule in wanted for example in (*rule.fires, *rule.silent))
    write(f"examples: {run} run, {len(failed)} failed" + (f", {misses} known misses" if misses else ""))
    return Status.OBJECTION if errors or failed else Status.NO_OBJECTION


def _content(index: Index) -> str:
    return (
        f"{len(index.substances)} substances, {len(index.species)} species, {len(index.materials)} materials, {len(index.gases)} gases, "
        f"{len(index.equilibria)} equilibria, {len(index.containers)} container materials, {len(index.sources)} sources"
    )
