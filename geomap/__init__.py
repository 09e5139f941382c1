"""geomap: soil groups and subgrade suitability along a corridor, with stated certainty between borings."""

from __future__ import annotations

__version__ = "0.1.0"
