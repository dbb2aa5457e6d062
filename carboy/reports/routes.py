"""Routes for a waste as text."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from carboy.model.knowledge import Source
from carboy.model.report import HoldPoint, Pair
from carboy.model.treatment import Route, Stream, TreatReport
from carboy.reports.citations import Citations
from carboy.reports.figures import number, span
from carboy.reports.style import Style, wrapped
from carboy.reports.table import table

_HEADS = {
    "routes found": "Routes that vet clean: {count}",
    "nothing to treat": "Nothing here asks for a treatment by the levels of the graph.",
    "no sound treatment": "No sound treatment on the bench",
    "cannot say": "Cannot say",
}
_MANY = 3  # reasons told of a rejected sequence


def routes_text(report: TreatReport, style: Style, sources: Mapping[str, Source]) -> str:
    """The whole answer; ``sources`` are those of the graph."""
    return style.finished("\n".join(_lines(report, style, Citations(sources))) + "\n")


def _lines(report: TreatReport, style: Style, citations: Citations) -> Iterator[str]:
    head = _HEADS[report.outcome].format(count=len(report.routes))
    yield style.alarm(head) if report.outcome == "no sound treatment" else style.strong(head)
    yield from wrapped(report.waste, style.width, "  ")
    if report.hazards:
        yield from wrapped(f"In the liquid: {', '.join(report.hazards)}.", style.width, "  ")
    if report.remains:
        yield from wrapped(f"Not taken out by any treatment here: {', '.join(report.remains)}.", style.width, "  ")
    for word in report.unrecognised:
        yield f"  Not known: {word}"
    for reason in report.reasons:
        yield ""
        yield from wrapped(style.words(reason), style.width, "  ")
    for place, route in enumerate(report.routes, start=1):
        yield ""
        yield from _route(place, route, style, citations)
    if report.rejected:
        yield ""
        yield style.strong("Tried and not offered")
        for item in report.rejected:
            yield from wrapped(style.words(", then ".join(item.names)), style.width, "  - ", "    ")
            for reason in item.reasons[:_MANY]:
                yield from wrapped(style.words(reason), style.width, "      ")
    yield ""
    yield style.strong("Before anything is treated")
    for caution in report.cautions:
        yield from wrapped(caution, style.width, "  - ", "    ")
    yield from citations.lines(style, full=False)


def _route(place: int, route: Route, style: Style, citations: Citations) -> Iterator[str]:
    yield from wrapped(style.strong(f"Route {place}: {', then '.join(route.names)}"), style.width, "", "  ")
    kept = f"HDPE, open, {number(route.vessel_L)} L, in a hood. Vetted: {route.report.verdict}."
    yield from wrapped(f"{kept} {citations.marks(route.sources)}".rstrip(), style.width, "  ")
    for step in route.steps:
        for hold in route.report.hold_points:
            if hold.step == step.step:
                yield from wrapped(f"Hold: {style.words(_told(hold))}", style.width, "        ")
        reached = "" if step.pH is None else f" (pH {_pH(step.pH)})"
        yield from wrapped(f"{style.words(step.action)}{reached}", style.width, f"  {step.step:>2}  ", "      ")
        if step.test:
            yield from wrapped(f"Go on when: {style.words(step.test)}", style.width, "        ")
    for finding in route.report.findings:
        if finding.signal == "warning":
            yield from wrapped(f"Mind, step {finding.step}: {style.words(finding.summary)}", style.width, "  ", "    ")
    for danger in route.dangers:
        yield from wrapped(f"Mind: {style.words(danger)}", style.width, "  ", "    ")
    for note in route.notes:
        yield from wrapped(style.words(note), style.width, "  ", "    ")
    yield "  What comes of it"
    yield from table([_stream(item, style) for item in route.streams], style.width, indent=4)


def _told(hold: HoldPoint) -> str:
    """What must be so, and how one sees it."""
    return ". ".join(part.rstrip(". ") for part in (hold.must, hold.test) if part) + "."


def _stream(item: Stream, style: Style) -> tuple[str, str, str]:
    volume = f"{span(item.volume_L)} L"
    if item.kind == "sludge":
        held = ", ".join(f"{style.formula(key)} {span(grams)} g" for key, grams in item.solids_g.items()) or "nothing"
        return item.vessel, f"{volume} moist", f"{held}; to: {item.goes_to}"
    held = (
        ", ".join(f"{key} {span(strength)} mg/L" for key, strength in item.mg_L.items())
        or "none of what was looked for"
    )
    reached = "" if item.pH is None else f"pH {_pH(item.pH)}; "
    return item.vessel, volume, f"{reached}{held}; to: {item.goes_to}"


def _pH(values: Pair) -> str:
    low, high = (f"{value:.1f}" for value in values)
    return low if low == high else f"{low} to {high}"
