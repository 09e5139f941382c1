"""geomap: soil groups and subgrade suitability along a corridor, with stated certainty between borings."""

from __future__ import annotations

import importlib
from typing import TYPE_CHECKING

__version__ = "0.1.0"

# Loaded when first asked for, so that `import geomap` and `geomap --help` stay quick.
_HOMES = {
    "check": "geomap.gate",
    "run": "geomap.pipeline",
    "run_and_write": "geomap.pipeline",
    "Results": "geomap.results",
    "classify_samples": "geomap.soils.classification",
    "group_index": "geomap.soils.systems.aashto_m145",
    "GeomapError": "geomap.errors",
    "InputError": "geomap.errors",
    "UsageError": "geomap.errors",
    "OutputInUseError": "geomap.errors",
}
__all__ = [
    "GeomapError",
    "InputError",
    "OutputInUseError",
    "Results",
    "UsageError",
    "__version__",
    "check",
    "classify_samples",
    "group_index",
    "run",
    "run_and_write",
]

if TYPE_CHECKING:
    from geomap.errors import GeomapError, InputError, OutputInUseError, UsageError
    from geomap.gate import check
    from geomap.pipeline import run, run_and_write
    from geomap.results import Results
    from geomap.soils.classification import classify_samples
    from geomap.soils.systems.aashto_m145 import group_index


def __getattr__(name: str) -> object:
    if name not in _HOMES:
        raise AttributeError(f"module 'geomap' has no attribute {name!r}")
    return getattr(importlib.import_module(_HOMES[name]), name)
