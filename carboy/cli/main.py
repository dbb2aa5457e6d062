"""The commands put together, and every error turned into a sentence."""

from __future__ import annotations

import os
import sys
from collections.abc import Sequence
from importlib import import_module
from typing import Annotated

import typer

import carboy
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

COMMANDS = ("combine", "vet", "dose", "treat", "look", "ask", "rule", "cases", "kb")  # in the order of the help page


def _version(wanted: bool) -> None:
    if wanted:
        typer.echo(f"carboy {carboy.__version__}")
        raise typer.Exit


def _common(
    version: Annotated[
        bool, typer.Option("--version", help="Print the version and stop.", callback=_version, is_eager=True)
    ] = False,
) -> None:
    pass


def application(*commands: str) -> typer.Typer:
    """The command line with some of :data:`COMMANDS`; with all of them where none is named."""
    app = typer.Typer(
        name="carboy",
        help=HELP,
        no_args_is_help=True,
        rich_markup_mode=None,
        pretty_exceptions_enable=False,
        context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
    )
    app.callback()(_common)
    for name in commands or COMMANDS:
        module = import_module(f"carboy.cli.{name}")
        if name == "kb":
            app.add_typer(module.app, name=name)
        else:
            app.command(name, help=module.HELP, short_help=module.SHORT)(getattr(module, name))
    return app


def _asked_for(arguments: Sequence[str]) -> tuple[str, ...]:
    """The command that is called for by its name; none where the help, a slip of the pen or the shell's completion needs them all.

    A command is built from its signature by pydantic, which takes a while for all of them."""
    completing = any(name.startswith("_CARBOY_COMPLETE") for name in os.environ)
    return tuple(arguments[:1]) if not completing and arguments and arguments[0] in COMMANDS else ()


def run() -> None:
    """Run the command line and exit. No user input ends in a traceback."""
    # pydantic would look through every installed distribution for plug-ins, which no record here uses
    os.environ.setdefault("PYDANTIC_DISABLE_PLUGINS", "__all__")
    try:
        application(*_asked_for(sys.argv[1:]))()
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
