"""A place in a text: file, line, column, and the line itself with a caret under the place."""

from __future__ import annotations

from msgspec import Struct


class Span(Struct, frozen=True):
    """Characters ``start`` to ``end`` (0-based, end exclusive) of ``text``, which came from ``file``."""

    text: str
    start: int
    end: int
    file: str = ""

    @property
    def line(self) -> int:
        """Line number, from 1."""
        return self.text.count("\n", 0, self.start) + 1

    @property
    def column(self) -> int:
        """Column number, from 1."""
        return self.start - (self.text.rfind("\n", 0, self.start) + 1) + 1

    @property
    def place(self) -> str:
        """``file:line:column``, or ``column N`` for a bare text."""
        return f"{self.file}:{self.line}:{self.column}" if self.file else f"column {self.column}"

    def excerpt(self) -> str:
        """The line with carets under the span."""
        begin = self.text.rfind("\n", 0, self.start) + 1
        stop = self.text.find("\n", self.start)
        line = self.text[begin : stop if stop >= 0 else len(self.text)]
        width = max(1, min(self.end, begin + len(line)) - self.start)
        return f"  {line}\n  {' ' * (self.start - begin)}{'^' * width}"
