"""A small list of names with the protocol that the readers need, so that their tests do not depend on the graph."""

from __future__ import annotations

from dataclasses import dataclass

from msgspec.structs import replace
from rapidfuzz import process


@dataclass(frozen=True)
class Found:
    kind: str
    id: str
    extra_water: float = 0.0
    dropped: tuple[str, ...] = ()


_SUBSTANCES = {
    "acetone": ("propanone", "67-64-1"),
    "methanol": (),
    "ethanol": ("ethyl alcohol",),
    "water": ("deionised water", "DI water", "H2O"),
    "sodium-hypochlorite": ("NaOCl",),
    "sodium-sulfide": ("Na2S", "1313-82-2"),
    "sodium-hydroxide": ("NaOH", "caustic soda"),
    "sodium-chloride": ("NaCl",),
    "sodium-bicarbonate": ("NaHCO3", "sodium hydrogen carbonate"),
    "hydrochloric-acid": ("HCl",),
    "nitric-acid": ("HNO3",),
    "sulfuric-acid": ("H2SO4",),
    "copper-sulfate": ("copper(II) sulfate", "CuSO4"),
    "mercury(II)-nitrate": ("Hg(NO3)2",),
    "hydrogen-peroxide": ("H2O2",),
    "zinc": ("Zn", "zinc metal"),
    "1,2-dichloroethane": (),
    "n,n-dimethylformamide": ("DMF",),
    "ammonium-sulfide": ("(NH4)2S",),
    "potassium-permanganate": ("KMnO4",),
    "cobalt-blue-tablets": ("N+ salt tablets",),
}
_MATERIALS = {
    "household-bleach": ("bleach",),
    "household-ammonia": (),
    "sodium-dispersion": ("sodium dispersion in oil",),
    "fine-zinc": ("zinc dust",),
}
_CONTAINERS = {"hdpe": "hdpe", "glass": "glass"}
_KEYS = {
    "mercury": ("Hg",),
    "copper": ("Cu",),
    "chromium(vi)": ("Cr(VI)",),
    "chromium": ("Cr(III)", "Cr(VI)"),
    "cyanide": ("CN",),
    "sulfide": ("S(-II)", "S(polysulfide)"),
    "sulfur": ("S(-II)", "S(VI)", "S(polysulfide)"),
    "heavy metal": ("Cu", "Hg"),
}
_HYDRATES = {
    "sodium sulfide nonahydrate": ("sodium-sulfide", 9.0),
    "na2s·9h2o": ("sodium-sulfide", 9.0),
    "copper sulfate pentahydrate": ("copper-sulfate", 5.0),
}


class StandInNames:
    """Resolves the names above; folds case, and ``.`` and ``*`` in hydrates."""

    def __init__(self) -> None:
        self.known: dict[str, Found] = {}
        for kind, table in (("substance", _SUBSTANCES), ("material", _MATERIALS)):
            for key, others in table.items():
                for name in (key.replace("-", " ") if "," not in key else key, *others):
                    self.known[name.casefold()] = Found(kind, key)
        for name, (key, water) in _HYDRATES.items():
            self.known[name] = Found("substance", key, water)

    def resolve(self, text: str) -> Found:
        folded = " ".join(text.casefold().split())
        if folded not in self.known and any(sign in folded for sign in ".*"):
            folded = folded.replace(".", "·").replace("*", "·")
        if folded not in self.known and folded.endswith(" metal") and folded.removesuffix(" metal") in self.known:
            return replace(self.known[folded.removesuffix(" metal")], dropped=("metal",))
        return self.known.get(folded, Found("unrecognised", ""))

    def suggest(self, text: str, n: int = 3) -> tuple[str, ...]:
        found = process.extract(text.casefold(), list(self.known), limit=n, score_cutoff=80)
        return tuple(name for name, _, _ in found)

    def container(self, text: str) -> str | None:
        return _CONTAINERS.get(text.casefold())

    def chemical_class(self, text: str) -> str | None:
        return {"strong oxidiser": "strong-oxidiser"}.get(text.casefold())

    def published_limits(self, text: str) -> dict[str, dict[str, float]]:
        folded = text.casefold()
        if "toxicity" in folded or "261.24" in folded:
            return {"toxicity-characteristic": {"Hg": 0.2}}
        if "268.48" in folded:
            return {"universal-treatment-wastewater": {"Hg": 0.15}, "universal-treatment-leachate": {"Hg": 0.025}}
        return {}

    def no_longer_seen(self) -> float:
        return 1e-5

    def report_keys(self, text: str) -> tuple[str, ...]:
        folded = text.casefold()
        exact = {key.casefold(): (key,) for keys in _KEYS.values() for key in keys}
        element = {"cr": "chromium", "s": "sulfur"}.get(folded, folded)
        return _KEYS.get(element) or exact.get(folded) or ()
