"""A reaction path drawn from left to right: labels on the left, what they bring, where it meets, what comes of it."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from itertools import count, product
from string import ascii_lowercase

from msgspec import Struct

from carboy.model.report import PathStep
from carboy.reports.style import Style, columns_of, wrapped

_LABEL_WIDTHS = (38, 28, 20)
_MOST_NAMED = 3


@dataclass(slots=True)
class Link:
    """One event of a path with the events that supplied it. ``brings`` is what it hands on."""

    event: PathStep
    mark: str  # of the equation, empty for a label
    brings: list[str] = field(default_factory=list)
    suppliers: list[Link] = field(default_factory=list)


class Block(Struct, frozen=True):
    """Drawn lines and the row from which the tree goes on."""

    lines: list[str]
    row: int

    @property
    def width(self) -> int:
        return max(map(columns_of, self.lines))


def _marks() -> Iterator[str]:
    """``a``, ``b`` ... ``z``, ``aa`` ...: letters, since numbers stand for findings."""
    for size in count(1):
        yield from map("".join, product(ascii_lowercase, repeat=size))


def linked(path: Sequence[PathStep], goal: Sequence[str] = ()) -> Link:
    """The events of a path as a tree whose root is the last event.

    An event belongs to the first later one that uses something of what it made; to the last if there is none.
    """
    marks = _marks()
    links = [Link(event, "" if event.rule == "label" else next(marks)) for event in path]
    root = links[-1]
    wanted = [token for token in root.event.to if token in goal or token.removesuffix("(g)") in goal]
    root.brings = wanted or root.event.to[:_MOST_NAMED]
    for place, link in enumerate(links[:-1]):
        user, used = root, list(link.event.to)
        for later in links[place + 1 :]:
            shared = [token for token in link.event.to if token in later.event.from_]
            if shared:
                user, used = later, shared
                break
        link.brings = list(dict.fromkeys(used))[:_MOST_NAMED]
        user.suppliers.append(link)
    return root


def drawn(path: Sequence[PathStep], goal: Sequence[str], style: Style, indent: int = 0) -> list[str]:
    """The tree, and below it the equations by letter. Falls back to a list where the width does not do."""
    root = linked(path, goal)
    room = style.width - indent
    lines: list[str] | None = None
    for label_width in (
        _LABEL_WIDTHS if root.suppliers or not root.mark else ()
    ):  # an event of which no cause is known is told, not drawn
        block = _draw(root, style, label_width)
        if block.width <= room:
            lines = block.lines
            break
    lines = [*(lines or []), *_equations(path, style, room)]
    return [(" " * indent + line).rstrip() for line in lines]


def _draw(link: Link, style: Style, label_width: int) -> Block:
    made = ", ".join(style.formula(token) for token in link.brings if token)
    if not link.suppliers:
        words = _label_lines(link, label_width)
        return _extended(Block(words, len(words) - 1), made, " ── ")
    joined = _joined([_draw(supplier, style, label_width) for supplier in link.suppliers])
    step = f"({link.mark})─" if link.mark else ""
    return _extended(joined, made, f"─{step} ")


def _label_lines(link: Link, width: int) -> list[str]:
    text = " + ".join(link.event.from_) if link.event.rule == "label" else f"({link.mark})"
    return list(wrapped(text, width)) or [""]


def _extended(block: Block, text: str, bridge: str) -> Block:
    lines = [
        line + " " * (block.width - columns_of(line)) if place == block.row else line
        for place, line in enumerate(block.lines)
    ]
    lines[block.row] += f"{bridge}{text}" if text else bridge.rstrip()
    return Block(lines, block.row)


def _joined(blocks: list[Block]) -> Block:
    """Blocks one below the other, their rows led to one line."""
    if len(blocks) == 1:
        block = blocks[0]
        single = list(block.lines)
        single[block.row] += " ──"
        return Block(single, block.row)
    width = max(block.width for block in blocks)
    lines: list[str] = []
    rows: list[int] = []
    for block in blocks:
        rows.append(len(lines) + block.row)
        lines += block.lines
    row = (rows[0] + rows[-1]) // 2
    for place, line in enumerate(lines):
        blank = width - columns_of(line)
        feeds = place in rows
        led = line + (" " + "─" * blank + "─" if feeds else " " * (blank + 2))
        if place < rows[0] or place > rows[-1]:
            lines[place] = led.rstrip()
            continue
        if place == rows[0]:
            corner = "┐" if place != row else "┬"
        elif place == rows[-1]:
            corner = "┘" if place != row else "┴"
        elif feeds:
            corner = "┼" if place == row else "┤"
        else:
            corner = "├" if place == row else "│"
        lines[place] = led + corner
    return Block(lines, row)


def _equations(path: Sequence[PathStep], style: Style, room: int) -> list[str]:
    lines: list[str] = []
    several = len({event.step for event in path}) > 1
    events = [event for event in path if event.rule != "label"]
    for mark, event in zip(_marks(), events, strict=False):
        lead = f"({mark}) "
        lines += wrapped(style.equation(event.equation), room, lead)
        by = "" if event.rule == "equilibrium" else f"by {event.rule}"
        notes = [by] if by else []
        if several:
            notes.append(f"step {event.step}")
        if notes:
            words = ", ".join(notes)
            if columns_of(lines[-1]) + 3 + columns_of(words) <= room:
                lines[-1] += "   " + style.faint(words)
            else:
                lines += [style.faint(line) for line in wrapped(words, room, " " * len(lead))]
    return lines
