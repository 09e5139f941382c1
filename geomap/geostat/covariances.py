"""Correlation by distance, and the covariance model made of it.

Every correlation here takes the *scaled lag*: distance over the **practical range**, coordinate by coordinate, so that
one number stands for direction and distance (geometric anisotropy). At the practical range the correlation is

================  ===============================  ==========================
model             correlation of the scaled lag h  at h = 1
================  ===============================  ==========================
``exponential``   exp(-3 h)                        0.0498
``spherical``     1 - 1.5 h + 0.5 h^3, then 0      0 (the true range)
``gaussian``      exp(-3 h^2)                      0.0498
``matern32``      (1 + c h) exp(-c h), c = 4.744   0.05
================  ===============================  ==========================

The factor 3 of the first and third is the convention of Isaaks & Srivastava 1989, An Introduction to Applied
Geostatistics, chapters 12 and 16 (from memory). Books and programs that write exp(-h / a) state a length and not a
range; :func:`range_from_length` converts. Random-field papers state the scale of fluctuation (Vanmarcke 1977,
J. Geotech. Eng. Div. ASCE 103:1227; from memory); :func:`range_from_fluctuation` converts.

All four are valid in up to three dimensions. ``gaussian`` without a nugget gives nearly singular systems.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geomap.errors import InputError, problem

Floats = NDArray[np.float64]
Correlation = Callable[[ArrayLike], Floats]

MATERN32_LENGTHS = 4.743864518390577  # root of (1 + c) exp(-c) = 0.05


def exponential(lag: ArrayLike) -> Floats:
    """Return exp(-3 h) for scaled lags h >= 0, any shape."""
    result: Floats = np.exp(-3.0 * np.asarray(lag, dtype=float))
    return result


def spherical(lag: ArrayLike) -> Floats:
    """Return 1 - 1.5 h + 0.5 h^3 for scaled lags h from 0 to 1, and 0 beyond; any shape."""
    near: Floats = np.minimum(np.asarray(lag, dtype=float), 1.0)
    return 1.0 - near * (1.5 - 0.5 * near * near)


def gaussian(lag: ArrayLike) -> Floats:
    """Return exp(-3 h^2) for scaled lags h >= 0, any shape."""
    result: Floats = np.exp(-3.0 * np.square(np.asarray(lag, dtype=float)))
    return result


def matern32(lag: ArrayLike) -> Floats:
    """Return (1 + c h) exp(-c h), c = 4.744, for scaled lags h >= 0: Matern of smoothness 3/2; any shape."""
    lengths: Floats = MATERN32_LENGTHS * np.asarray(lag, dtype=float)
    result: Floats = (1.0 + lengths) * np.exp(-lengths)
    return result


MODELS: Mapping[str, Correlation] = MappingProxyType(
    {"exponential": exponential, "spherical": spherical, "gaussian": gaussian, "matern32": matern32}
)

# How many lengths a, as in exp(-h / a), exp(-h^2 / a^2), (1 + h / a) exp(-h / a), make one practical range.
_LENGTHS = {"exponential": 3.0, "spherical": 1.0, "gaussian": np.sqrt(3.0), "matern32": MATERN32_LENGTHS}
# Scale of fluctuation, 2 x integral of the correlation from 0 to infinity, for a practical range of 1.
_FLUCTUATIONS = {
    "exponential": 2 / 3,
    "spherical": 3 / 4,
    "gaussian": np.sqrt(np.pi / 3),
    "matern32": 4 / MATERN32_LENGTHS,
}
# Scaled lag at which the correlation has fallen to 0.001.
_REACHES = {"exponential": 2.3026, "spherical": 1.0, "gaussian": 1.5174, "matern32": 1.9464}


def correlation_named(name: str) -> Correlation:
    """Return the correlation function called `name`.

    Raises
    ------
    InputError
        There is no such model; the text lists the choices.
    """
    if name not in MODELS:
        raise InputError(problem("covariance model", name, ", ".join(MODELS), "choose one of these"))
    return MODELS[name]


def range_from_length(name: str, length: float) -> float:
    """Return the practical range of a model stated by its length, as in exp(-h / length).

    Examples
    --------
    >>> range_from_length("exponential", 100.0)
    300.0
    """
    correlation_named(name)
    return float(_LENGTHS[name] * length)


def range_from_fluctuation(name: str, fluctuation: float) -> float:
    """Return the practical range of a model stated by its scale of fluctuation.

    Examples
    --------
    >>> round(range_from_fluctuation("exponential", 2.0), 6)
    3.0
    """
    correlation_named(name)
    return float(fluctuation / _FLUCTUATIONS[name])


def reach(name: str) -> float:
    """Return the scaled lag at which the correlation has fallen to 0.001 (spherical: to 0)."""
    correlation_named(name)
    return _REACHES[name]


@dataclass(frozen=True)
class Model:
    """A covariance: correlation, nugget, sill and one practical range for each coordinate.

    C(0) = sill and C(h) = (sill - nugget) x correlation(h) for h > 0: the nugget is *part* of the sill. A
    variogram stated as nugget plus partial sill has sill = nugget + partial sill.

    Attributes
    ----------
    correlation
        Function of the scaled lag, one of :data:`MODELS` or of that kind.
    nugget
        Variance between two samples at nearly the same place, 0 <= nugget <= sill.
    sill
        Variance of the variable, > 0.
    ranges
        Practical range in each coordinate, in the unit of that coordinate, > 0; one value serves all
        coordinates. The default 1 is for coordinates that are scaled already.

    Raises
    ------
    InputError
        A parameter is out of its range.

    Examples
    --------
    >>> model = Model(exponential, nugget=0.2, sill=1.0, ranges=(300.0, 3.0))
    >>> model.covariance([0.0, 1e-9, 1.0]).round(4).tolist()
    [1.0, 0.8, 0.0398]
    """

    correlation: Correlation
    nugget: float = 0.0
    sill: float = 1.0
    ranges: tuple[float, ...] = (1.0,)

    def __post_init__(self) -> None:
        if not (np.isfinite(self.sill) and self.sill > 0):
            raise InputError(problem("covariance model, sill", self.sill, "more than 0", "give a positive variance"))
        if not 0 <= self.nugget <= self.sill:
            raise InputError(
                problem("covariance model, nugget", self.nugget, f"0 to the sill, {self.sill:g}", "correct it")
            )
        if not self.ranges or not all(np.isfinite(r) and r > 0 for r in self.ranges):
            raise InputError(
                problem("covariance model, ranges", self.ranges, "more than 0 each", "give positive ranges")
            )

    def scaled(self, points: ArrayLike, place: str = "points") -> Floats:
        """Return coordinates over ranges, shape (points, coordinates).

        Parameters
        ----------
        points
            Shape (points, coordinates), for example distance, offset and depth.
        place
            What they are, for the message.

        Raises
        ------
        InputError
            The shape does not fit the ranges, or a coordinate is not finite.
        """
        array = np.asarray(points, dtype=float)
        if array.ndim != 2 or (len(self.ranges) > 1 and array.shape[1] != len(self.ranges)):
            columns = len(self.ranges) if len(self.ranges) > 1 else "coordinates"
            raise InputError(problem(place, array.shape, f"shape (points, {columns})", "reshape the array"))
        if not np.isfinite(array).all():
            found = int((~np.isfinite(array).all(axis=1)).sum())
            raise InputError(
                problem(place, f"{found} without coordinates", "finite coordinates", "leave those points out")
            )
        scaled: Floats = array / np.asarray(self.ranges)
        return scaled

    def covariance(self, lag: ArrayLike) -> Floats:
        """Return the covariance at scaled lags, any shape; the sill at lag 0."""
        lags = np.asarray(lag, dtype=float)
        result: Floats = (self.sill - self.nugget) * self.correlation(lags)
        return np.where(lags > 0, result, self.sill)
