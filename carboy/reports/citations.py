"""Sources as numbers in the text and a list at its end."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping

from carboy.model.knowledge import Source
from carboy.reports.style import Style, wrapped


class Citations:
    """Numbers sources in the order in which they are first cited. ``sources`` has what their keys stand for."""

    def __init__(self, sources: Mapping[str, Source]) -> None:
        self._sources = sources
        self._order: dict[str, int] = {}

    def marks(self, keys: Iterable[str]) -> str:
        """``[1, 3]`` for the keys, ascending; empty for none."""
        numbers = sorted(self._order.setdefault(key, len(self._order) + 1) for key in dict.fromkeys(keys))
        return f"[{', '.join(map(str, numbers))}]" if numbers else ""

    def lines(self, style: Style, *, full: bool) -> Iterator[str]:
        """The list of what was cited, shortened unless ``full``."""
        if not self._order:
            return
        yield ""
        yield style.strong("Sources")
        margin = len(str(len(self._order))) + 4
        for key, number in self._order.items():
            source = self._sources.get(key)
            lead = f"[{number}]".rjust(margin) + " "
            text = key if source is None else source.citation
            yield from wrapped(text if full else short(text, style.width - len(lead)), style.width, lead)


def short(citation: str, most: int) -> str:
    """The citation cut at a word, so that it takes at most so many columns (an ellipsis is three of them in ASCII)."""
    if len(citation) <= most:
        return citation
    return citation[: most - len(" ...")].rsplit(" ", 1)[0].rstrip(" ,;:.") + " …"
