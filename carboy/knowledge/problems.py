"""What is wrong with the knowledge files: one record for each fault, and the error that carries them all."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Literal

from msgspec import Struct

from carboy.errors import KnowledgeError
from carboy.span import Span


class Problem(Struct, frozen=True):
    """One fault. ``file`` is relative to kb/; ``node`` names the thing (``sub:acetone``); ``span`` its place, where
    known.

    An "error" makes the graph unusable; a "note" is worth a look (an unused source).
    """

    file: str
    node: str
    message: str
    severity: Literal["error", "note"] = "error"
    span: Span | None = None

    @property
    def place(self) -> str:
        """``file:line`` or ``file``."""
        return f"{self.file}:{self.span.line}" if self.span else self.file

    def __str__(self) -> str:
        about = f"{self.node}: " if self.node else ""
        return f"{self.place}: {about}{self.message}"


def in_order(problems: Iterable[Problem]) -> list[Problem]:
    """Errors before notes, then by file and place."""
    return sorted(
        problems, key=lambda item: (item.severity, item.file, item.span.start if item.span else -1, item.message)
    )


class KnowledgeProblems(KnowledgeError):
    """All errors that were found in kb/, in the order of files. ``problems`` has them one by one."""

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems = problems = tuple(in_order(problems))
        count = f"{len(problems)} errors" if len(problems) > 1 else "1 error"
        super().__init__(f"the knowledge files have {count}\n" + "\n".join(str(problem) for problem in problems))
