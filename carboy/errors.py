"""The one exception tree of carboy.

Everything that a user's input can bring about is a :class:`CarboyError`; the command line turns it into a
sentence and exit status 2, and no traceback is shown.
"""

from __future__ import annotations

from carboy.span import Span


class CarboyError(Exception):
    """Base of every error that carboy raises on purpose.

    ``message`` is one sentence; ``span`` says where in which text (with the line and a caret when shown);
    ``suggestions`` are words that may have been meant; ``other`` is a second place, for two facts that disagree.
    """

    def __init__(
        self,
        message: str,
        *,
        span: Span | None = None,
        suggestions: tuple[str, ...] = (),
        other: Span | None = None,
    ) -> None:
        self.message = message
        self.span = span
        self.suggestions = suggestions
        self.other = other
        super().__init__(self.render())

    def render(self) -> str:
        """The message with its place, the line, a caret and the suggestions."""
        parts = [self.message if self.span is None else f"{self.span.place}: {self.message}"]
        parts += [place.excerpt() for place in (self.span, self.other) if place is not None]
        if self.suggestions:
            parts.append("Did you mean " + " or ".join(f"'{word}'" for word in self.suggestions) + "?")
        return "\n".join(parts)


class InputError(CarboyError):
    """What the user typed or wrote in a case file cannot be read (exit status 2)."""


class KnowledgeError(CarboyError):
    """A file of kb/ is wrong: unknown term, unbalanced equation, missing source."""


class RuleError(CarboyError):
    """A file of rules/ is wrong."""


class DataFilesMissing(CarboyError):
    """kb/ or rules/ cannot be found beside the package."""
