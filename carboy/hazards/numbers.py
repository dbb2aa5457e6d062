"""Numbers as one says them at the bench."""

from __future__ import annotations


def figures(value: float, digits: int = 2) -> str:
    """A number with few figures and no exponent where that reads well."""
    if value == 0:
        return "0"
    if 1e-3 <= abs(value) < 1e5:
        text = f"{float(f'{value:.{digits}g}'):,.6f}".rstrip("0").rstrip(".")
        return text.replace(",", " ")
    return f"{value:.{digits}g}"


def amount_words(mol: float) -> str:
    """mol, mmol or µmol."""
    for size, unit in ((1.0, "mol"), (1e-3, "mmol"), (1e-6, "µmol")):
        if mol >= 0.0995 * size or unit == "µmol":
            return f"{figures(mol / size)} {unit}"
    return f"{mol:.2g} mol"


def litres_words(litres: float) -> str:
    """mL, L or m3."""
    if litres >= 1000:
        return f"{figures(litres / 1000)} m³"
    return f"{figures(litres)} L" if litres >= 1 else f"{figures(litres * 1000)} mL"
