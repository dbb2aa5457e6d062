"""The commands put together, and every error turned into a sentence."""

from __future__ import annotations

import os
import sys
from typing import Annotated

import typer

import carboy
from carboy.cli import ask, cases, combine, dose, kb, look, rule, treat, vet
from carboy.cli.output import Status
from carboy.errors import CarboyError

HELP = """Vets the mixing and treatment of laboratory chemical waste before a cap is opened.

\b
carboy combine "500 mL of 6 % sodium hypochlorite" "100 mL of 31 % hydrochloric acid"
carboy vet procedure.yaml
carboy look "muriatic acid"
carboy ask "?r gives ?g, ?g is toxic-gas, ?r needs acid"

Exit status: 0 no objection, 1 conditional or refuse, 3 cannot say, 2 the input is wrong.

A screening aid, not a permit: the safety data sheets, the rules of the site and a qualified person decide."""

app = typer.Typer(
    name="carboy",
    help=HELP,
    no_args_is_help=True,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
)


def _version(wanted: bool) -> None:
    if wanted:
        typer.echo(f"carboy {carboy.__version__}")
        raise typer.Exit


@app.callback()
def _common(
    version: Annotated[
        bool, typer.Option("--version", help="Print the version and stop.", callback=_version, is_eager=True)
    ] = False,
) -> None:
    pass


app.command("combine", help=combine.HELP, short_help="May these bottles go together?")(combine.combine)
app.command("vet", help=vet.HELP, short_help="Is this procedure safe, and does it reach its aim?")(vet.vet)
app.command("dose", help=dose.HELP, short_help="How much reagent, and how much is too much?")(dose.dose)
app.command("treat", help=treat.HELP, short_help="How does this waste become safe?")(treat.treat)
app.command("look", help=look.HELP, short_help="What the graph knows of a thing.")(look.look)
app.command("ask", help=ask.HELP, short_help="Ask the graph and the rules.")(ask.ask)
app.command("rule", help=rule.HELP, short_help="A rule in its own words.")(rule.rule)
app.command("cases", help=cases.HELP, short_help="Run the expect blocks of case files.")(cases.cases)
app.add_typer(kb.app, name="kb")


def run() -> None:
    """Run the command line and exit. No user input ends in a traceback."""
    # pydantic would look through every installed distribution for plug-ins, which no record here uses
    os.environ.setdefault("PYDANTIC_DISABLE_PLUGINS", "__all__")
    try:
        app()
    except CarboyError as error:
        _fail(shortened(error.render()))
    except BrokenPipeError:  # the reader of a pipe went away
        _quiet_stdout()
        sys.exit(Status.OBJECTION)
    except KeyboardInterrupt:
        sys.exit(130)
    except Exception as error:  # a fault of carboy itself: nothing was vetted, and that is what is said
        if os.environ.get("CARBOY_TRACEBACK"):
            raise
        sys.stderr.write(
            f"carboy: a fault of the program itself ({type(error).__name__}: {error}). Nothing was vetted.\n"
            "Set CARBOY_TRACEBACK=1 and run it again to see where.\n"
        )
        sys.exit(Status.CANNOT_SAY)


def shortened(message: str, most: int = 12) -> str:
    """A message of many lines cut to the first ones, with a word on the rest."""
    lines = message.splitlines()
    if len(lines) <= most:
        return message
    return "\n".join([*lines[:most], f"... and {len(lines) - most} more lines; 'carboy kb check' shows everything"])


def _fail(message: str) -> None:
    from carboy.reports.style import style_for

    style = style_for(sys.stderr)
    sys.stderr.write(style.finished(f"carboy: {message}\n"))
    sys.exit(Status.WRONG_INPUT)


def _quiet_stdout() -> None:
    """So that closing standard output at exit does not complain about the pipe again."""
    try:
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, sys.stdout.fileno())
    except OSError:
        pass
