"""The palette is measured: families stay apart for color-blind readers, and letters can be read on every fill."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from numpy.typing import NDArray

from geomap.exports import palette
from geomap.soils.systems import SYSTEMS, System
from tests.unit.exports.sample import AASHTO, USCS, VERDICTS

# Machado, Oliveira and Fernandes 2009, "A Physiologically-based Model for Simulation of Color Vision Deficiency",
# matrices of severity 1.0, for linear RGB.
SIGHT = {
    "normal": np.eye(3),
    "protanopia": np.array(
        [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]]
    ),
    "deuteranopia": np.array(
        [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]]
    ),
    "tritanopia": np.array(
        [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602], [0.004733, 0.691367, 0.303900]]
    ),
}
# IEC 61966-2-1, linear sRGB to CIE XYZ (D65)
XYZ = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])
FAMILY = {"G": "gravel", "S": "sand", "M": "silt", "C": "clay", "O": "organic", "P": "organic"}
AASHTO_FAMILY = {"A-1": "gravel", "A-3": "sand", "A-2": "sand", "A-4": "silt", "A-5": "silt", "A-8": "organic"}
USDA = {
    "sand": ("sand", "loamy sand", "sandy loam"),
    "silt": ("silt", "silt loam", "loam"),
    "clay": ("sandy clay loam", "silty clay loam", "clay loam", "sandy clay", "silty clay", "clay"),
}


def lab(color: str, sight: str) -> NDArray[np.float64]:
    """Return CIE L*a*b* of a color as seen with one kind of sight."""
    coded = np.array([int(color[at : at + 2], 16) / 255 for at in (1, 3, 5)])
    linear = np.where(coded <= 0.04045, coded / 12.92, ((coded + 0.055) / 1.055) ** 2.4)
    seen = XYZ @ np.clip(SIGHT[sight] @ linear, 0, 1) / XYZ.sum(axis=1)
    f = np.where(seen > 216 / 24389, np.cbrt(seen), (24389 / 27 * seen + 16) / 116)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


def difference(one: NDArray[np.float64], other: NDArray[np.float64]) -> float:
    """Return the color difference CIEDE2000 (CIE 142-2001, all weights 1)."""
    chroma = (np.hypot(*one[1:]) + np.hypot(*other[1:])) / 2
    g = 0.5 * (1 - np.sqrt(chroma**7 / (chroma**7 + 25.0**7)))
    (l1, a1, b1), (l2, a2, b2) = one * [1, 1 + g, 1], other * [1, 1 + g, 1]
    c1, c2 = np.hypot(a1, b1), np.hypot(a2, b2)
    h1, h2 = np.degrees(np.arctan2(b1, a1)) % 360, np.degrees(np.arctan2(b2, a2)) % 360
    turn = (h2 - h1 + 180) % 360 - 180 if c1 * c2 else 0.0
    middle = (h1 + turn / 2) % 360 if c1 * c2 else h1 + h2
    lightness, c = (l1 + l2) / 2, (c1 + c2) / 2
    t = 1 - 0.17 * cos(middle - 30) + 0.24 * cos(2 * middle) + 0.32 * cos(3 * middle + 6) - 0.2 * cos(4 * middle - 63)
    dl = (l2 - l1) / (1 + 0.015 * (lightness - 50) ** 2 / np.sqrt(20 + (lightness - 50) ** 2))
    dc = (c2 - c1) / (1 + 0.045 * c)
    dh = 2 * np.sqrt(c1 * c2) * np.sin(np.radians(turn / 2)) / (1 + 0.015 * c * t)
    twist = np.sin(np.radians(60 * np.exp(-(((middle - 275) / 25) ** 2))))
    rotation = -2 * np.sqrt(c**7 / (c**7 + 25.0**7)) * twist
    return float(np.sqrt(dl**2 + dc**2 + dh**2 + rotation * dc * dh))


def cos(degrees: float) -> float:
    return float(np.cos(np.radians(degrees)))


def smallest(system: str, pairs: list[tuple[str, str]], sight: str) -> float:
    return min(
        difference(lab(palette.color(system, one), sight), lab(palette.color(system, other), sight))
        for one, other in pairs
    )


def families(system: str) -> dict[str, str]:
    """Return symbol -> family; soil that is not determined is a family of its own."""
    if system == "astm_d2487":
        of = {symbol: FAMILY[symbol[0]] for symbol in USCS}
    elif system == "aashto_m145":
        of = {symbol: AASHTO_FAMILY.get(symbol[:3], "clay") for symbol in AASHTO}
    else:
        of = {symbol: family for family, symbols in USDA.items() for symbol in symbols}
    return {**of, "n/d": "not determined"}


@pytest.mark.parametrize(
    ("one", "other", "expected"),
    [  # Sharma, Wu and Dalal 2005, "The CIEDE2000 color-difference formula", table 1 (rows from memory)
        ((50.0, 2.6772, -79.7751), (50.0, 0.0, -82.7485), 2.0425),
        ((50.0, 2.5, 0.0), (73.0, 25.0, -18.0), 27.1492),
        ((50.0, 2.5, 0.0), (61.0, -5.0, 29.0), 22.8977),
        ((50.0, 2.5, 0.0), (56.0, -27.0, -3.0), 31.9030),
        ((50.0, 2.5, 0.0), (58.0, 24.0, 15.0), 19.4535),
    ],
)
def test_the_measure_itself_agrees_with_published_differences(
    one: tuple[float, ...], other: tuple[float, ...], expected: float
) -> None:
    assert difference(np.array(one), np.array(other)) == pytest.approx(expected, abs=5e-5)


@pytest.mark.parametrize("sight", SIGHT)
@pytest.mark.parametrize("system", ["astm_d2487", "aashto_m145", "usda_texture"])
def test_any_two_families_look_different_to_every_kind_of_sight(system: str, sight: str) -> None:
    of = families(system)
    pairs = [(a, b) for a, b in itertools.combinations(of, 2) if of[a] != of[b]]
    assert smallest(system, pairs, sight) >= 12.0  # a difference of about 2 is just seen side by side


@pytest.mark.parametrize("sight", SIGHT)
def test_the_plain_symbols_of_one_family_can_be_told_apart(sight: str) -> None:
    plain = [("GW", "GP", "GM", "GC"), ("SW", "SP", "SM", "SC"), ("ML", "MH"), ("CL", "CH"), ("OL", "OH", "PT")]
    pairs = [pair for family in plain for pair in itertools.combinations(family, 2)]
    assert smallest("astm_d2487", pairs, sight) >= 5.0


@pytest.mark.parametrize("sight", SIGHT)
@pytest.mark.parametrize(
    ("system", "symbols"),
    [("suitability", (*VERDICTS, "not assessed")), ("evidence", ("observed", "inferred", "no data"))],
)
def test_verdicts_and_evidence_look_very_different(system: str, symbols: tuple[str, ...], sight: str) -> None:
    assert smallest(system, list(itertools.combinations(symbols, 2)), sight) >= 20.0


@pytest.mark.parametrize("system", palette._SIGNS)
def test_letters_can_be_read_on_every_fill(system: str) -> None:
    for symbol in [*palette._SIGNS[system], "n/d"]:
        assert palette.contrast(palette.color(system, symbol), palette.text_color(system, symbol)) >= 4.5


@pytest.mark.parametrize("system", palette._SIGNS)
def test_no_two_symbols_of_a_system_share_a_color_or_a_hatch(system: str) -> None:
    signs = palette._SIGNS[system]
    assert len({palette.color(system, symbol) for symbol in signs}) == len(signs)
    assert len({palette.hatch(system, symbol) for symbol in signs}) == len(signs)


@pytest.mark.parametrize("system", palette._SIGNS)
def test_every_hatch_can_be_drawn(system: str) -> None:
    for symbol in palette._SIGNS[system]:
        hatch = palette.hatch(system, symbol)
        assert palette.hatch_path(hatch).count("M") == sum(letter != "_" for letter in hatch)


@pytest.mark.parametrize("system", SYSTEMS, ids=lambda system: system.NAME)
def test_every_symbol_of_every_system_has_a_sign(system: System) -> None:
    assert set(palette._SIGNS[system.NAME]) == set(system.SYMBOLS)


def test_anything_unknown_is_gray_and_plain() -> None:
    for system, symbol in [("astm_d2487", None), ("astm_d2487", "ZZ"), ("no such system", "GW")]:
        assert palette.color(system, symbol) == palette.NOT_DETERMINED
        assert palette.hatch(system, symbol) == palette.NO_HATCH
