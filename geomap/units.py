"""Units of length and density, and what their names may look like in a heading.

Values inside geomap are in the unit that the column name states (``_m``, ``_mm``, ``_pct``, ``_kpa``).
Readers find the unit of each input column here; intake multiplies by the factor once; exports divide by it
for display. No other module converts.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from types import MappingProxyType

INTERNATIONAL_FOOT_M = 0.3048  # exact; international yard and pound agreement, 1959
US_SURVEY_FOOT_M = 1200 / 3937  # exact; Mendenhall order of 1893, retired by NIST at the end of 2022
INCH_MM = 25.4  # exact, from the international foot
POUND_KG = 0.45359237  # exact, 1959 agreement
STANDARD_GRAVITY_M_S2 = 9.80665  # exact; 3rd CGPM, 1901
POUND_FORCE_N = POUND_KG * STANDARD_GRAVITY_M_S2

_PCF_KG_M3 = POUND_KG / INTERNATIONAL_FOOT_M**3
_PSF_KPA = POUND_FORCE_N / INTERNATIONAL_FOOT_M**2 / 1000
_PSI_KPA = 144 * _PSF_KPA

# house unit -> {spelling, lower case without spaces: factor to the house unit}
SPELLINGS: Mapping[str, Mapping[str, float]] = MappingProxyType(
    {
        "m": {
            "m": 1.0,
            "meter": 1.0,
            "meters": 1.0,
            "metre": 1.0,
            "metres": 1.0,
            "mm": 0.001,
            "cm": 0.01,
            "km": 1000.0,
            "ft": INTERNATIONAL_FOOT_M,
            "feet": INTERNATIONAL_FOOT_M,
            "foot": INTERNATIONAL_FOOT_M,
            "us-ft": US_SURVEY_FOOT_M,
            "usft": US_SURVEY_FOOT_M,
            "ussurveyfoot": US_SURVEY_FOOT_M,
            "ussurveyfeet": US_SURVEY_FOOT_M,
            "ftus": US_SURVEY_FOOT_M,
        },
        "mm": {
            "mm": 1.0,
            "um": 0.001,
            "µm": 0.001,
            "μm": 0.001,
            "micron": 0.001,
            "microns": 0.001,
            "in": INCH_MM,
            "inch": INCH_MM,
            "inches": INCH_MM,
        },
        "pct": {"%": 1.0, "pct": 1.0, "percent": 1.0},
        "kg_m3": {
            "kg/m3": 1.0,
            "kg/m³": 1.0,
            "mg/m3": 1000.0,
            "mg/m³": 1000.0,
            "t/m3": 1000.0,
            "g/cm3": 1000.0,
            "g/cc": 1000.0,
            "pcf": _PCF_KG_M3,
            "lb/ft3": _PCF_KG_M3,
        },
        "kpa": {
            "kpa": 1.0,
            "kn/m2": 1.0,
            "mpa": 1000.0,
            "psi": 144 * _PSF_KPA,
            "psf": _PSF_KPA,
            "ksf": 1000 * _PSF_KPA,
            "tsf": 2000 * _PSF_KPA,
        },
        "mg_kg": {"mg/kg": 1.0, "ppm": 1.0},
        "ohm_cm": {"ohm-cm": 1.0, "ohmcm": 1.0, "ohm.cm": 1.0, "ohm-m": 100.0, "ohmm": 100.0},
        "mv": {"mv": 1.0, "v": 1000.0},
    }
)

LENGTH_UNITS = ("m", "ft", "us-ft")


def factor_from_spelling(house_unit: str, spelling: str) -> float | None:
    """Return the factor from a spelled unit to the house unit, or None where the spelling is not known.

    Parameters
    ----------
    house_unit
        A key of :data:`SPELLINGS`, for example ``"m"``.
    spelling
        The unit as written, in any case, with or without spaces.

    Examples
    --------
    >>> factor_from_spelling("m", "ft")
    0.3048
    >>> round(factor_from_spelling("m", "US-ft") * 2_000_000 - 0.3048 * 2_000_000, 3)  # meters at 2,000,000 ft
    1.219
    >>> factor_from_spelling("m", "stone") is None
    True
    """
    key = re.sub(r"\s+", "", spelling).lower().strip("()[]")
    return SPELLINGS.get(house_unit, {}).get(key)
