"""Numbers as people read them: three figures, ranges, thin groups of thousands, units of a handy size with proper signs."""

from __future__ import annotations

import math
from collections.abc import Sequence

_UNITS = {"m3": "m³", "degC": "°C", "m3/s": "m³/s", "dm3": "dm³", "1": ""}
_SUPERSCRIPT = str.maketrans("0123456789-+", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺")
# unit -> (from which size on, divided by, shown as), the largest first; below the last the figure stays as it is
_SIZES: dict[str, tuple[tuple[float, float, str], ...]] = {
    "mol": ((0.1, 1.0, "mol"), (1e-4, 1e-3, "mmol"), (1e-8, 1e-6, "µmol")),
    "L": ((1000.0, 1000.0, "m3"), (0.1, 1.0, "L"), (1e-4, 1e-3, "mL")),
    "m3": ((0.1, 1.0, "m3"), (1e-4, 1e-3, "L")),
    "kg": ((1.0, 1.0, "kg"), (1e-4, 1e-3, "g")),
    "g": ((1000.0, 1000.0, "kg"), (0.1, 1.0, "g"), (1e-4, 1e-3, "mg")),
    "min": ((2880.0, 1440.0, "d"), (120.0, 60.0, "h"), (1.0, 1.0, "min"), (1e-5, 1 / 60, "s")),
    "ppm": ((10_000.0, 10_000.0, "vol %"), (0.0, 1.0, "ppm")),
}
_NO_BREAK = "\u00a0"


def number(value: float, digits: int = 3) -> str:
    """``value`` to ``digits`` significant figures: ``0.0765``, ``12.3``, ``1000``, ``2.5×10⁻⁸``."""
    if not math.isfinite(value):
        return "unknown" if math.isnan(value) else ("no limit" if value > 0 else "below any figure")
    if value == 0:
        return "0"
    size = abs(value)
    if size >= 1e7 or size < 1e-3:
        mantissa, _, exponent = f"{value:.{digits - 1}e}".partition("e")
        mantissa = mantissa.rstrip("0").rstrip(".") if "." in mantissa else mantissa
        power = str(int(exponent)).translate(_SUPERSCRIPT)
        return f"{mantissa}×10{power}"
    places = max(0, digits - 1 - math.floor(math.log10(size)))
    text = f"{value:.{places}f}"
    if "." in text:
        text = text.rstrip("0").rstrip(".")
    elif size >= 10**digits:
        text = str(round(value, digits - 1 - math.floor(math.log10(size))) // 1).split(".", maxsplit=1)[0]
    whole, dot, rest = text.partition(".")
    sign, whole = ("−", whole[1:]) if whole.startswith("-") else ("", whole)
    if len(whole) > 4:
        head = len(whole) % 3
        groups = [whole[:head]] if head else []
        groups += [whole[i : i + 3] for i in range(head, len(whole), 3)]
        whole = _NO_BREAK.join(groups)
    return sign + whole + dot + rest


def span(values: Sequence[float], digits: int = 3) -> str:
    """One figure, or ``a to b`` where the ends differ as printed."""
    ends = [number(value, digits) for value in values]
    return ends[0] if len(set(ends)) == 1 else f"{ends[0]} to {ends[-1]}"


def unit_text(unit: str) -> str:
    """``m3`` as ``m³``, ``degC`` as ``°C``; others as they are."""
    return _UNITS.get(unit, unit)


def quantity(value: float | Sequence[float] | None, unit: str, digits: int = 3) -> str:
    """A figure or range with its unit; the unit alone where there is no figure."""
    shown = unit_text(unit)
    if value is None:
        return shown
    figures = span(value, digits) if isinstance(value, Sequence) else number(value, digits)
    return f"{figures}{_NO_BREAK}{shown}".rstrip(_NO_BREAK) if shown else figures


def handy(value: float | Sequence[float] | None, unit: str, digits: int = 3) -> str:
    """As :func:`quantity`, in the unit in which it reads best: ``3.6 g`` for 0.0036 kg, ``97 vol %`` for 970 000 ppm, ``1.4 d`` for 2016 min.

    A range is told in the unit of its larger end.
    """
    if value is None:
        return quantity(value, unit, digits)
    ends = list(value) if isinstance(value, Sequence) else [value]
    largest = max(map(abs, ends))
    for least, divisor, shown in _SIZES.get(unit, ()):
        if largest >= 0.9995 * least:  # what is rounded to it counts
            return quantity([one / divisor for one in ends], shown, digits)
    return quantity(ends, unit, digits)


def runs(numbers: Sequence[int]) -> str:
    """Whole numbers in order, as ``1, 3, 5 to 9``."""
    found: list[list[int]] = []
    for one in numbers:
        if found and one == found[-1][-1] + 1:
            found[-1].append(one)
        else:
            found.append([one])
    return ", ".join(f"{run[0]} to {run[-1]}" if len(run) > 2 else ", ".join(map(str, run)) for run in found)
