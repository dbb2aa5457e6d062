"""What is not covered: lists of names under what they have in common, counted."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from carboy.reports.style import Style, wrapped


@dataclass(frozen=True, slots=True)
class Gap:
    """Names that lack something: ``title`` says what, ``remark`` why that may be in order."""

    title: str
    names: Sequence[str]
    remark: str = ""


def gaps_text(gaps: Sequence[Gap], style: Style) -> str:
    """The gaps one below the other, ending in a newline."""
    lines: list[str] = []
    for gap in gaps:
        lines += ["", style.strong(f"{gap.title}: {len(gap.names)}")]
        if gap.remark:
            lines += [style.faint(line) for line in wrapped(gap.remark, style.width, "  ")]
        lines += wrapped("; ".join(gap.names), style.width, "  ") if gap.names else []
    return style.finished("\n".join(lines[1:]) + "\n")
