"""Spellings made alike, so that headings and units can be compared."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Mapping
from functools import cache
from types import MappingProxyType

from geomap.units import SPELLINGS

# Signs that hands, fonts and spreadsheets put in place of plain ones, by code point. Double primes go before the
# compatibility form of Unicode, which would break them into two single primes.
_PLAIN_SIGNS = {
    0x2033: '"',  # double prime
    0x201C: '"',  # quotation marks
    0x201D: '"',
    0x2018: "'",
    0x2019: "'",
    0x2032: "'",  # prime
    0x2010: "-",  # hyphen
    0x2011: "-",  # non-breaking hyphen
    0x2013: "-",  # dashes
    0x2014: "-",
    0x2212: "-",  # minus
    0x2044: "/",  # fraction slash
}
_VULGAR_FRACTION = re.compile("([¼½¾⅛⅜⅝⅞])")
_BETWEEN_WORDS = re.compile(r"[\s._\-,()\[\]*:;]+")
_IN_UNITS = re.compile(r"[\s._\-/^()\[\]]+")


def plain(text: str) -> str:
    """Return `text` in small letters with plain signs, single spaces and no footnote mark.

    Examples
    --------
    >>> plain("  Passing  1½″ Sieve* "), plain("Density, kg/m³")
    ('passing 1 1/2" sieve', 'density, kg/m3')
    """
    text = _VULGAR_FRACTION.sub(r" \1", text).translate(_PLAIN_SIGNS)
    text = unicodedata.normalize("NFKC", text).translate(_PLAIN_SIGNS).casefold()
    return " ".join(text.split()).strip(" *:")


def key(text: str) -> str:
    """Return what is left of a heading when case and everything between words is taken out.

    Examples
    --------
    >>> key("Top_Depth"), key("top depth"), key("CBR (soaked)"), key("Boring #")
    ('topdepth', 'topdepth', 'cbrsoaked', 'boringno')
    """
    return _BETWEEN_WORDS.sub("", plain(text)).replace("#", "no")


def unit_key(text: str) -> str:
    """Return a unit without case, spaces, dots, strokes and brackets.

    Examples
    --------
    >>> unit_key("[US-ft]"), unit_key("kg/m³"), unit_key("Mg m-3")
    ('usft', 'kgm3', 'mgm3')
    """
    return _IN_UNITS.sub("", plain(text))


@cache
def _factors() -> Mapping[str, Mapping[str, float]]:
    return MappingProxyType(
        {house: {unit_key(name): factor for name, factor in names.items()} for house, names in SPELLINGS.items()}
    )


def unit_factor(house_unit: str, spelling: str) -> float | None:
    """Return the factor to the house unit, or None where the spelling is not known for it.

    Examples
    --------
    >>> unit_factor("m", "[ft]"), unit_factor("mg_kg", "mg kg"), unit_factor("m", "kPa") is None
    (0.3048, 1.0, True)
    """
    return _factors().get(house_unit, {}).get(unit_key(spelling))


def is_unit(spelling: str) -> bool:
    """Return whether `spelling` is a unit of any kind that geomap knows."""
    return any(unit_key(spelling) in names for names in _factors().values())
