"""What README.md shows is what happens. ``python tests/test_readme.py`` writes today's output into it."""

from __future__ import annotations

import os
import re
import shlex
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
README = ROOT / "README.md"
TEST_MARK = "<!-- the test command -->"
MOST_LINES = 18  # of output that a README block shows
_BLOCK = re.compile(r"```(?P<language>\w+)\n(?P<body>.*?)```", re.DOTALL)


def blocks(language: str) -> list[str]:
    return [
        found["body"] for found in _BLOCK.finditer(README.read_text(encoding="utf-8")) if found["language"] == language
    ]


def shown() -> Iterator[tuple[str, list[str]]]:
    """Command and the output below it, of each console block."""
    for body in blocks("console"):
        first, *rest = body.splitlines()
        assert first.startswith("$ carboy ")
        yield first[2:], rest


def output_of(command: str) -> list[str]:
    """What a command line prints, cut as the README cuts it."""
    line = command.replace("carboy ", f"{shlex.quote(sys.executable)} -m carboy ", 1)
    environment = {**os.environ, "COLUMNS": "80", "PYTHONIOENCODING": "utf-8", "NO_COLOR": "1"}
    ran = subprocess.run(
        line, shell=True, capture_output=True, text=True, encoding="utf-8", check=False, cwd=ROOT, env=environment
    )
    assert ran.stderr == ""
    lines = [text.replace("\u00a0", " ").replace("\u202f", " ").rstrip() for text in ran.stdout.rstrip().splitlines()]
    return [*lines[:MOST_LINES], "..."] if len(lines) > MOST_LINES else lines


@pytest.mark.skipif(os.name == "nt", reason="the README's shell lines are for a POSIX shell")
@pytest.mark.parametrize(("command", "lines"), list(shown()), ids=[command[:40] for command, _ in shown()])
def test_shown_output_is_what_is_printed(command, lines):
    assert lines == output_of(command)


def test_python_example_runs(capsys, monkeypatch):
    (code,) = blocks("python")
    monkeypatch.chdir(ROOT)
    exec(compile(code, "README.md", "exec"), {})
    printed = capsys.readouterr().out.splitlines()
    assert printed[0] == "refuse"
    assert any(
        line.startswith("danger toxic-gas ['H2S'] (0.1") or line.startswith("danger toxic-gas ['H2S'] (0.09")
        for line in printed
    )


def test_yaml_example_is_a_case_whose_aim_is_judged(tmp_path):
    import carboy

    (text,) = blocks("yaml")
    file = tmp_path / "procedure.yaml"
    file.write_text(text, encoding="utf-8")
    report = carboy.vet(file)
    assert report.unrecognised == []
    assert [goal.goal for goal in report.goals] == ["dissolved copper in jug below 2 mg/L"]
    assert report.goals[0].value is not None


def test_set_up_is_two_commands_for_a_fresh_machine():
    lines = [line for body in blocks("sh") for line in body.splitlines() if "venv" in line]
    assert len(lines) == 2
    run, test = lines
    assert test == 'python3 -m venv .venv && .venv/bin/pip install -e ".[test]" && .venv/bin/python -m pytest'
    assert run.startswith("python3 -m venv .venv && .venv/bin/pip install -e . && .venv/bin/carboy vet ")
    assert (ROOT / run.split()[-1]).is_file()


def test_the_check_script_takes_the_test_command_from_here():
    text = README.read_text(encoding="utf-8")
    assert text.count(TEST_MARK) == 1
    below = text.split(TEST_MARK)[1].lstrip()
    assert below.startswith('```sh\npython3 -m venv .venv && .venv/bin/pip install -e ".[test]"')
    assert TEST_MARK in (ROOT / ".ci" / "run").read_text(encoding="utf-8")


def test_every_command_has_a_line_here():
    from carboy.cli.main import application

    text = README.read_text(encoding="utf-8")
    for command in application().registered_commands:
        assert f"carboy {command.name}" in text
    assert "carboy kb check" in text


def test_the_first_paragraph_states_the_job():
    first = README.read_text(encoding="utf-8").split("\n\n")[1]
    assert not first.startswith(("#", "`", "-"))
    for words in ("technician", "before a cap is opened", "what happens"):
        assert words in " ".join(first.split())


def rewrite() -> None:
    """Put today's output below the commands of the console blocks."""

    def renewed(found: re.Match[str]) -> str:
        if found["language"] != "console":
            return found[0]
        command = found["body"].splitlines()[0]
        return "```console\n" + "\n".join([command, *output_of(command[2:])]) + "\n```"

    README.write_text(_BLOCK.sub(renewed, README.read_text(encoding="utf-8")), encoding="utf-8")


if __name__ == "__main__":
    rewrite()
