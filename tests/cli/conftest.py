"""Runs the command line in this process, as the console entry does."""

from __future__ import annotations

import sys
from collections.abc import Callable
from dataclasses import dataclass

import pytest

from carboy.cli.main import run


@dataclass(frozen=True)
class Ran:
    """Exit status and what was written."""

    status: int
    out: str
    err: str


@pytest.fixture
def carboy(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> Callable[..., Ran]:
    """``carboy("combine", "...", "...")`` gives a :class:`Ran`."""

    def call(*arguments: str) -> Ran:
        monkeypatch.setattr(sys, "argv", ["carboy", *arguments])
        capsys.readouterr()
        with pytest.raises(SystemExit) as stopped:
            run()
        written = capsys.readouterr()
        code = stopped.value.code
        return Ran(code if isinstance(code, int) else 0 if code is None else 1, written.out, written.err)

    return call
