"""carboy: vets the mixing and treatment of laboratory chemical waste before a cap is opened.

``combine`` and ``vet`` are the two calls; both give a :class:`Report`. They are imported on first use, so that
``import carboy`` costs next to nothing.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

__version__ = "0.1.0"

if TYPE_CHECKING:
    from carboy.errors import CarboyError as CarboyError
    from carboy.errors import InputError as InputError
    from carboy.model.dosing import DoseReport as DoseReport
    from carboy.model.plan import Case as Case
    from carboy.model.plan import Setting as Setting
    from carboy.model.plan import VesselSpec as VesselSpec
    from carboy.model.report import Report as Report
    from carboy.model.treatment import TreatReport as TreatReport
    from carboy.planning.repair import Mending as Mending
    from carboy.vetting import combine as combine
    from carboy.vetting import dose as dose
    from carboy.vetting import mend as mend
    from carboy.vetting import treat as treat
    from carboy.vetting import vet as vet

# public name -> the module that holds it
_HOMES = {
    "Case": "carboy.model.plan",
    "CarboyError": "carboy.errors",
    "DoseReport": "carboy.model.dosing",
    "InputError": "carboy.errors",
    "Mending": "carboy.planning.repair",
    "Report": "carboy.model.report",
    "Setting": "carboy.model.plan",
    "TreatReport": "carboy.model.treatment",
    "VesselSpec": "carboy.model.plan",
    "combine": "carboy.vetting",
    "dose": "carboy.vetting",
    "mend": "carboy.vetting",
    "treat": "carboy.vetting",
    "vet": "carboy.vetting",
}

__all__ = [
    "CarboyError",
    "Case",
    "DoseReport",
    "InputError",
    "Mending",
    "Report",
    "Setting",
    "TreatReport",
    "VesselSpec",
    "__version__",
    "combine",
    "dose",
    "mend",
    "treat",
    "vet",
]


def __getattr__(name: str) -> Any:
    home = _HOMES.get(name)
    if home is None:
        raise AttributeError(f"module 'carboy' has no attribute '{name}'")
    from importlib import import_module

    value = getattr(import_module(home), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted({*globals(), *_HOMES})
