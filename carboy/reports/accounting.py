"""Where every gram of an element went, for a tired reader: the end first, then each step."""

from __future__ import annotations

from collections.abc import Iterator

from carboy.model.report import ElementAccount, Share
from carboy.reports.figures import number, runs
from carboy.reports.style import Style, wrapped
from carboy.reports.table import table

_LEAST_PERCENT = 1e-3  # less is shown as "under 0.001 %"
_NO_GAP = 1e-9  # of what was put in: the rounding of a calculation
_LEAST_SHARE = 1e-9  # of what was put in: a smaller share is not worth a line
_GRAMS = ((1.0, 1.0, "g"), (1e-3, 1e-3, "mg"), (1e-6, 1e-6, "µg"))


def account_lines(account: ElementAccount, style: Style) -> Iterator[str]:
    """The account of one element: what was put in, where it is at the end, whether it closes, and what each step moved."""
    name, put_in = account.name, account.put_in_g
    yield style.strong(f"Where the {name} went")
    if put_in[1] <= 0:
        yield from wrapped(f"There is no {name} in this procedure.", style.width, "  ")
        return
    whole = account.steps[-1].put_in_g
    words = f"{grams_text(whole)} of {name} was put in"
    if put_in[0] < put_in[1] * (1 - 1e-9):
        words += (
            f" (by the labels {grams_text(put_in[0])} to {grams_text(put_in[1])}; the figures below are for the middle)"
        )
    yield from wrapped(f"{words}. At the end:", style.width, "  ")
    worth = [one for one in account.shares if one.grams[1] > _LEAST_SHARE * whole]
    rows = [[grams_text(one.nominal_g), _percent(one.percent), _where(one, style)] for one in worth]
    yield from table(rows, style.width, indent=2)
    yield from wrapped(_closing(account), style.width, "  ")
    yield ""
    yield style.strong(f"What moved the {name}, step by step")
    yield from _moves(account, whole, style)


def _moves(account: ElementAccount, whole: float, style: Style) -> Iterator[str]:
    """Each step that moved something, with what is then in the places that it touched; runs of steps that moved nothing in one line."""
    before: dict[str, str] = {}
    still: list[int] = []
    for step in account.steps:
        now = {place: grams_text(grams) for place, grams in step.grams.items() if grams > _LEAST_SHARE * whole}
        touched = [place for place in now if before.get(place) != now[place]]
        emptied = [place for place in before if place not in now]
        if not (touched or emptied):
            still.append(step.step)
            continue
        yield from _unmoved(still)
        still = []
        head = f"{step.step}  " if step.step else ""
        yield from wrapped(style.words(f"{head}{step.action}"), style.width, "  ", "     ")
        touched.sort(key=lambda place: -step.grams[place])
        rows = [[now[place], _percent(100 * step.grams[place] / whole), f"in {place}"] for place in touched]
        rows += [["0 g", "0 %", f"in {place}"] for place in emptied]
        yield from table(rows, style.width, indent=5)
        before = now
    yield from _unmoved(still)


def _unmoved(steps: list[int]) -> Iterator[str]:
    if steps:
        yield f"  {runs(steps)}  moved none of it"


def grams_text(value: float) -> str:
    """g, mg or µg, to three figures."""
    for least, size, unit in _GRAMS:
        if abs(value) >= 0.9995 * least:
            return f"{number(value / size)} {unit}"
    return "0 g" if value == 0 else f"{number(value / 1e-9)} ng"


def _closing(account: ElementAccount) -> str:
    if account.gap_share <= _NO_GAP:
        return "Put in and found agree to less than a billionth: nothing is missing."
    sort = "is not found again" if account.gap_g > 0 else "is found beyond what was put in"
    return (
        f"The balance does not close: {grams_text(abs(account.gap_g))} {sort}, {number(100 * account.gap_share)} % of it. "
        "Do not rely on this account."
    )


def _percent(value: float | None) -> str:
    if value is None:
        return ""
    return f"{number(value)} %" if abs(value) >= _LEAST_PERCENT else "under 0.001 %"


def _where(share: Share, style: Style) -> str:
    if share.stream == "gas":
        return f"{share.place}, as {style.formula(share.form)} gas"
    about: list[str] = [share.stream] if share.stream != "vessel" and share.stream not in share.place else []
    about += [f"with {share.carrier}"] if share.carrier else []
    kind = f" ({', '.join(about)})" if about else ""
    form = f", as {style.formula(share.form)}" if share.form else ""
    return f"{share.place}{kind}: {'gas over it' if share.state == 'gas' else share.state}{form}"
