"""Colors and hatches of soil groups, verdicts and evidence: one set for the map, the layers and the sheets.

The palette is our own. Hue says the family (gravel, sand, silt, clay, organic), lightness the member. The hues
were found by a numeric search that kept the smallest difference between two families as large as possible for
normal sight and for the three kinds of color blindness; the unit test measures it again. Warm and cool, light
and dark carry the message twice: warm is coarse, cool is fine, dark is organic.

Color is never the only sign: every group also has a hatch, and letters drawn on a color are black or white,
whichever reads better (WCAG 2.2, success criterion 1.4.3, asks for a contrast of 4.5).

A hatch id is its own recipe: four letters, one for each quarter of a square tile (top left, top right, bottom
left, bottom right). ``R`` and ``r`` are a large and a small ring, ``D`` and ``d`` a large and a small dot, ``h``
a dash, ``s`` a slash, ``w`` a wave, ``x`` a cross, ``_`` nothing. Rings stand for gravel, dots for sand, dashes
for silt, slashes for clay, waves for organic soil, so that GM is rings with dashes.
"""

from __future__ import annotations

import functools
from collections.abc import Mapping
from types import MappingProxyType

NOT_DETERMINED = "#bebebe"  # any symbol that is missing or that no table below knows
NO_HATCH = "____"
BLACK, WHITE = "#000000", "#ffffff"
HATCH_TILE = 16  # units along the side of the square that hatch_path fills

_GRAVEL = ("#e27f67", "#d6775c", "#c96e51", "#bd6646", "#b05e3b", "#a45631", "#984e26", "#8c461b", "#803e0f")
_SAND = ("#fbfbdc", "#f5f3c9", "#f0ebb6", "#ece3a2", "#e8da8d", "#e5d177", "#e3c85f", "#e1be43", "#dfb417")
_SILT = ("#9aeefa", "#6ed3ec", "#38b6dd")
_CLAY = ("#966bd7", "#8269d3", "#6365c9", "#5864c4", "#4261ba", "#285eaf")
_ORGANIC = ("#473939", "#3b2835", "#261b36")

# system -> symbol -> (color, hatch)
_SIGNS: Mapping[str, Mapping[str, tuple[str, str]]] = MappingProxyType(
    {
        "astm_d2487": {
            "GW": (_GRAVEL[0], "R__r"),
            "GW-GM": (_GRAVEL[1], "Rh_r"),
            "GW-GC": (_GRAVEL[2], "Rs_r"),
            "GP": (_GRAVEL[3], "r__r"),
            "GP-GM": (_GRAVEL[4], "rh_r"),
            "GP-GC": (_GRAVEL[5], "rs_r"),
            "GM": (_GRAVEL[6], "rhhr"),
            "GC-GM": (_GRAVEL[7], "rhsr"),
            "GC": (_GRAVEL[8], "rssr"),
            "SW": (_SAND[0], "D__d"),
            "SW-SM": (_SAND[1], "Dh_d"),
            "SW-SC": (_SAND[2], "Ds_d"),
            "SP": (_SAND[3], "d__d"),
            "SP-SM": (_SAND[4], "dh_d"),
            "SP-SC": (_SAND[5], "ds_d"),
            "SM": (_SAND[6], "dhhd"),
            "SC-SM": (_SAND[7], "dhsd"),
            "SC": (_SAND[8], "dssd"),
            "ML": (_SILT[0], "h__h"),
            "MH": (_SILT[2], "hhhh"),
            "CL-ML": (_CLAY[0], "s__h"),
            "CL": (_CLAY[2], "s__s"),
            "CH": (_CLAY[5], "ssss"),
            "OL": (_ORGANIC[0], "w__w"),
            "OH": (_ORGANIC[1], "wwww"),
            "PT": (_ORGANIC[2], "wxxw"),
        },
        "aashto_m145": {
            "A-1-a": (_GRAVEL[0], "RrrR"),
            "A-1-b": (_GRAVEL[8], "R__d"),
            "A-3": (_SAND[0], "d__d"),
            "A-2-4": (_SAND[2], "dh_d"),
            "A-2-5": (_SAND[4], "dhhd"),
            "A-2-6": (_SAND[6], "ds_d"),
            "A-2-7": (_SAND[8], "dssd"),
            "A-4": (_SILT[0], "h__h"),
            "A-5": (_SILT[2], "hhhh"),
            "A-6": (_CLAY[0], "s__s"),
            "A-7-5": (_CLAY[2], "shhs"),
            "A-7-6": (_CLAY[5], "ssss"),
            "A-8": (_ORGANIC[2], "wxxw"),
        },
        "usda_texture": {
            "sand": (_SAND[0], "d__d"),
            "loamy sand": (_SAND[4], "ddhd"),
            "sandy loam": (_SAND[8], "dh_d"),
            "silt": (_SILT[0], "hhhh"),
            "silt loam": (_SILT[1], "hh_d"),
            "loam": (_SILT[2], "dhs_"),
            "sandy clay loam": (_CLAY[0], "dsd_"),
            "silty clay loam": (_CLAY[1], "shhs"),
            "clay loam": (_CLAY[2], "s_hs"),
            "sandy clay": (_CLAY[3], "dssd"),
            "silty clay": (_CLAY[4], "ssh_"),
            "clay": (_CLAY[5], "ssss"),
        },
        "suitability": {
            "suitable": ("#046b99", NO_HATCH),
            "treat": ("#febf43", "s__s"),
            "unsuitable": ("#602935", "xxxx"),
            "not assessed": ("#9e9e9e", "d__d"),
        },
        "evidence": {
            "observed": ("#2b3b55", NO_HATCH),
            "inferred": ("#8399be", "h__h"),
            "no data": ("#e4e8ef", "x__x"),
        },
    }
)

# one mark about (0, 0): SVG path commands, all relative
_MARKS = MappingProxyType(
    {
        "R": "m-3 0a3 3 0 1 0 6 0a3 3 0 1 0 -6 0",
        "r": "m-1.8 0a1.8 1.8 0 1 0 3.6 0a1.8 1.8 0 1 0 -3.6 0",
        "D": "m-1.2 0a1.2 1.2 0 1 0 2.4 0a1.2 1.2 0 1 0 -2.4 0",
        "d": "m-0.4 0a0.4 0.4 0 1 0 0.8 0a0.4 0.4 0 1 0 -0.8 0",
        "h": "m-3 0h6",
        "s": "m-3 3l6 -6",
        "w": "m-3 0q1.5 -3 3 0t3 0",
        "x": "m-2 -2l4 4m0 -4l-4 4",
    }
)


def color(system: str, symbol: str | None) -> str:
    """Return the fill of one symbol as ``#rrggbb``.

    Parameters
    ----------
    system
        Name of a classification system as in `Results.legend`, or ``"evidence"``.
    symbol
        Symbol of that system; any other text, or None, gives the gray of soil that is not determined.

    Examples
    --------
    >>> color("astm_d2487", "CL"), color("astm_d2487", "n/d")
    ('#6365c9', '#bebebe')
    """
    return _sign(system, symbol)[0]


def hatch(system: str, symbol: str | None) -> str:
    """Return the hatch id of one symbol; the module says how to read it.

    Examples
    --------
    >>> hatch("astm_d2487", "GM")
    'rhhr'
    """
    return _sign(system, symbol)[1]


def text_color(system: str, symbol: str | None) -> str:
    """Return black or white, whichever contrasts more with the fill of the symbol."""
    fill = color(system, symbol)
    return max((BLACK, WHITE), key=lambda ink: contrast(fill, ink))


@functools.cache
def hatch_path(hatch_id: str) -> str:
    """Return a hatch as SVG path data for a square tile of `HATCH_TILE` units, to be stroked, not filled.

    Parameters
    ----------
    hatch_id
        What `hatch` returns.

    Examples
    --------
    >>> hatch_path("h__h")
    'M4 4m-3 0h6M12 12m-3 0h6'
    """
    centers = ((4, 4), (12, 4), (4, 12), (12, 12))
    marks = zip(centers, hatch_id, strict=True)
    return "".join(f"M{x} {y}{_MARKS[letter]}" for (x, y), letter in marks if letter != "_")


def contrast(one: str, other: str) -> float:
    """Return the contrast ratio of two colors, 1 to 21 (WCAG 2.2, definition of contrast ratio).

    Examples
    --------
    >>> contrast("#000000", "#ffffff")
    21.0
    """
    low, high = sorted((_luminance(one), _luminance(other)))
    return (high + 0.05) / (low + 0.05)


def _luminance(fill: str) -> float:
    """Relative luminance, 0 to 1 (WCAG 2.2, definition of relative luminance)."""
    parts = [int(fill[at : at + 2], 16) / 255 for at in (1, 3, 5)]
    red, green, blue = (p / 12.92 if p <= 0.04045 else ((p + 0.055) / 1.055) ** 2.4 for p in parts)
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


def _sign(system: str, symbol: str | None) -> tuple[str, str]:
    return _SIGNS.get(system, {}).get(symbol or "", (NOT_DETERMINED, NO_HATCH))
