"""What is wrong with a rule: one record for each fault."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from carboy.model.rule import Place

Severity = Literal["error", "warning", "note"]


@dataclass(frozen=True, slots=True)
class Problem:
    """One fault of the rule ``rule``.

    An "error" makes the rule unfit for use, a "warning" is likely a slip, a "note" is worth knowing.
    """

    place: Place | None
    message: str
    severity: Severity = "error"
    suggestions: tuple[str, ...] = ()
    rule: str = ""

    def __str__(self) -> str:
        where = f"{self.place.file}:{self.place.line}:{self.place.column}: " if self.place else ""
        about = f"rule '{self.rule}': " if self.rule else ""
        words = " or ".join(f"'{word}'" for word in self.suggestions)
        meant = f" Did you mean {words}?" if words else ""
        return f"{where}{about}{self.message}.{meant}"
