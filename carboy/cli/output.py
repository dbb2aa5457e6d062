"""What the commands share: exit status, writing to standard output, progress on anything over a second."""

from __future__ import annotations

import sys
import time
from collections.abc import Iterable, Mapping
from enum import IntEnum
from types import TracebackType
from typing import TYPE_CHECKING, Self

if TYPE_CHECKING:
    from carboy.model.report import Report, Verdict


FIRST_READING = "Reading the knowledge graph for the first time (some seconds)"


class Status(IntEnum):
    """Exit status of the contract."""

    NO_OBJECTION = 0
    OBJECTION = 1
    WRONG_INPUT = 2
    CANNOT_SAY = 3


# the gravest first: refuse outranks cannot say, which outranks conditional
_RANKED: Mapping[Verdict, Status] = {
    "refuse": Status.OBJECTION,
    "cannot say": Status.CANNOT_SAY,
    "conditional": Status.OBJECTION,
    "no objection": Status.NO_OBJECTION,
}


def status_of(reports: Iterable[Report]) -> Status:
    """The exit status of the gravest verdict."""
    verdicts = {report.verdict for report in reports}
    return next(status for verdict, status in _RANKED.items() if verdict in verdicts)


def write(text: str) -> None:
    """Text to standard output, with a newline at its end."""
    text = text if text.endswith("\n") else text + "\n"
    encoding = sys.stdout.encoding or "ascii"
    sys.stdout.write(text.encode(encoding, "replace").decode(encoding))
    sys.stdout.flush()


def counted_words(number: int, word: str) -> str:
    """``1 case``, ``2 cases``."""
    return f"{number} {word}" if number == 1 else f"{number} {word}s"


class Progress:
    """A line on standard error that says how far a long task is; nothing where that is no terminal, or within a second."""

    _PATIENCE = 1.0  # s
    _PACE = 0.1  # s between two updates

    def __init__(self, what: str) -> None:
        self._what = what
        self._begin = self._last = time.monotonic()
        self._shown = False

    def __call__(self, number: int, total: int, words: str = "") -> None:
        """Say that ``number`` of ``total`` is being worked on."""
        now = time.monotonic()
        if now - self._begin < self._PATIENCE or now - self._last < self._PACE or not sys.stderr.isatty():
            return
        self._last, self._shown = now, True
        sys.stderr.write(f"\r\033[K{self._what} {number} of {total}{' ' + words if words else ''}")
        sys.stderr.flush()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._shown:
            sys.stderr.write("\r\033[K")
            sys.stderr.flush()


class Waiting:
    """A line on standard error while something takes some seconds that cannot be counted; nothing where that is no terminal."""

    def __init__(self, words: str) -> None:
        self._words = words if sys.stderr.isatty() else ""

    def __enter__(self) -> Self:
        if self._words:
            sys.stderr.write(self._words)
            sys.stderr.flush()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._words:
            sys.stderr.write("\r\033[K")
            sys.stderr.flush()


def first_reading() -> Waiting:
    """To be waited in while the knowledge is loaded: says so where the graph must be compiled first."""
    words = ""
    if sys.stderr.isatty():
        from carboy.knowledge.index import is_compiled

        words = "" if is_compiled() else FIRST_READING
    return Waiting(words)
