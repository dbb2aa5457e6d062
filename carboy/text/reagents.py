"""A reagent named without its amount: ``0.5 M sodium sulfide``, ``sodium bicarbonate``, ``household bleach``."""

from __future__ import annotations

from carboy.errors import InputError
from carboy.model.knowledge import Index
from carboy.model.plan import Interval, Portion
from carboy.text.passages import Passage
from carboy.text.portions import AMOUNT_DIMENSIONS, NameLookup, parse_portion
from carboy.text.quantities import read_quantity

ONE_LITRE, ONE_KILOGRAM = "1 L of ", "1000 g of "


def read_reagent(text: str, names: NameLookup, index: Index) -> tuple[Portion, float | None]:
    """The reagent as a portion of one litre, or of one kilogram where it is a dry solid; and the most of it that is at hand, in L or g,
    where the text begins with an amount. Raises InputError."""
    plain = Passage(text)
    start = len(text) - len(text.lstrip())
    stated = read_quantity(plain, start, len(text), AMOUNT_DIMENSIONS, "an amount", optional=True)
    if stated is not None:
        portion = parse_portion(text, names)
        if portion.unit == "mol":
            raise InputError(
                "an amount in mol is no dose; give the reagent in mL or g", span=plain.span(stated.start, stated.end)
            )
        whole = 1.0 if portion.unit == "L" else 1000.0
        words = text[stated.end :].strip().removeprefix("of").strip()
        return _of(portion, words, whole), portion.amount.high
    portion = parse_portion(_led(ONE_LITRE, text), names)
    if _dry(portion, index):
        portion = parse_portion(_led(ONE_KILOGRAM, text), names)
    return _of(portion, text.strip(), portion.amount.high), None


def dosed(reagent: Portion, amount: float, words: str) -> Portion:
    """``amount`` (L or g, as the reagent's own unit) of a reagent that :func:`read_reagent` has read."""
    text = f"{words} of {reagent.text}"
    return reagent.model_copy(update={"amount": Interval(low=amount, high=amount), "text": text})


def _of(portion: Portion, words: str, amount: float) -> Portion:
    return portion.model_copy(update={"amount": Interval(low=amount, high=amount), "text": words})


def _led(lead: str, text: str) -> Passage:
    """The text after an amount; a place in it is shown in the text alone."""
    return Passage(lead + text, "", text, [0] * len(lead) + list(range(len(text) + 1)))


def _dry(portion: Portion, index: Index) -> bool:
    if len(portion.ingredients) != 1 or portion.ingredients[0].strength.unit != "neat":
        return False
    kind, _, identity = portion.ingredients[0].reference.partition(":")
    thing = index.substances.get(identity) if kind == "substance" else index.materials.get(identity)
    return thing is not None and thing.state == "s"
