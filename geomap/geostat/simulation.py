"""Simulated fields: standard Gaussian on a regular grid, unconditional, by circulant embedding and FFT.

The grid is laid on a torus, and white noise is given the wanted covariance by a fast Fourier transform (Dietrich &
Newsam 1997, SIAM Journal on Scientific Computing 18:1088; volume confirmed, page from memory). The covariance on the
torus is the sum of the model over all its periodic images, whose spectrum is nowhere negative, in place of the nearest
image alone, whose spectrum can be. What the images add inside the grid is kept near 0.001 by the size of the torus and
reported in `correlation_error_`.

Realization k of a seed depends on the seed, on k and on the grid, not on how many are drawn nor in which order.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator, Sequence
from typing import Self

import numpy as np
from numpy.typing import NDArray
from scipy import fft
from scipy.special import ndtr

from geomap.errors import InputError, problem
from geomap.geostat.covariances import Floats, correlation_named, reach

Singles = NDArray[np.float32]

TORUS_CELLS = 2**23  # largest torus: 64 MB in double precision
TAIL = 1.5  # images are summed out to this many times the reach of the correlation (0.00003 or less is left)
LEAST_UNIFORM = np.finfo(np.float32).tiny
LARGEST_UNIFORM = np.nextafter(np.float32(1.0), np.float32(0.0))


class GaussianField:
    """Standard Gaussian field with a given correlation on a regular grid.

    Parameters
    ----------
    correlation
        Name of a model in `geomap.geostat.covariances.MODELS`.
    ranges
        Practical range along each axis of the grid, > 0.
    spacing
        Distance of grid points along each axis, in the unit of its range, > 0.
    nugget
        Share of the variance without correlation between cells, 0 to 1.

    Attributes
    ----------
    shape_, torus_
        Shape of the grid, and of the torus under its axes longer than 1.
    clipped_share_
        Share of the spectrum that was negative, set to zero, the rest scaled back to a variance of 1. Only
        rounding error as long as the model is valid.
    correlation_error_
        Largest difference between the correlation of the field and the model over all lags of the grid.

    Examples
    --------
    >>> field = GaussianField("exponential", ranges=(300.0, 3.0), spacing=(10.0, 0.25)).fit((50, 24))
    >>> field.draw(seed=1, realization=7).shape
    (50, 24)
    >>> field.correlation_error_ < 0.002
    True
    """

    shape_: tuple[int, ...]
    torus_: tuple[int, ...]
    clipped_share_: float
    correlation_error_: float

    def __init__(
        self, correlation: str, ranges: Sequence[float], spacing: Sequence[float], nugget: float = 0.0
    ) -> None:
        self.correlation = correlation
        self.ranges = ranges
        self.spacing = spacing
        self.nugget = nugget

    def fit(self, shape: Sequence[int]) -> Self:
        """Prepare drawing on a grid of `shape` and return self.

        Raises
        ------
        InputError
            A parameter is out of its range, or the ranges are so long against the grid that the torus would
            have more than ``TORUS_CELLS`` cells.
        """
        self._check(shape)
        self.shape_ = tuple(int(n) for n in shape)
        # An axis of one cell has no lags; it is left off the torus and put back by reshaping.
        self._axes = [axis for axis, n in enumerate(self.shape_) if n > 1]
        self._grid = tuple(self.shape_[axis] for axis in self._axes) or (1,)
        steps = [self.ranges[axis] / self.spacing[axis] for axis in self._axes] or [1.0]
        self.torus_ = _torus(self._grid, steps, reach(self.correlation))
        wanted = self._wanted(steps)
        spectrum: Floats = fft.fftn(wanted).real
        kept = np.maximum(spectrum, 0.0)
        self.clipped_share_ = float((kept - spectrum).sum() / np.abs(spectrum).sum())
        kept *= kept.size / kept.sum()  # mean of the spectrum = variance of a cell
        inside = tuple(slice(0, n) for n in self._grid)
        lags = np.meshgrid(*(np.arange(n) / s for n, s in zip(self._grid, steps, strict=True)), indexing="ij")
        model = self._with_nugget(correlation_named(self.correlation)(np.sqrt(sum(np.square(g) for g in lags))))
        self.correlation_error_ = float(np.abs(fft.ifftn(kept).real[inside] - model).max())
        half = self.torus_[-1] // 2 + 1
        self._amplitude: Singles = np.sqrt(kept[..., :half]).astype(np.float32)
        return self

    def draw(self, seed: int, realization: int) -> Singles:
        """Return one realization, shape of the grid, float32.

        Parameters
        ----------
        seed
            Any whole number >= 0.
        realization
            Its number, from 0.
        """
        source = np.random.SeedSequence(seed, spawn_key=(realization,))
        noise = np.random.Generator(np.random.PCG64(source)).standard_normal(self.torus_, dtype=np.float32)
        field = fft.irfftn(fft.rfftn(noise) * self._amplitude, s=self.torus_)
        inside = tuple(slice(0, n) for n in self._grid)
        result: Singles = np.ascontiguousarray(field[inside], dtype=np.float32).reshape(self.shape_)
        return result

    def _check(self, shape: Sequence[int]) -> None:
        place = "simulated field"
        correlation_named(self.correlation)
        if not 0.0 <= self.nugget <= 1.0:
            raise InputError(problem(f"{place}, nugget", self.nugget, "0 to 1", "give a share of the variance"))
        for name, entry in (("ranges", self.ranges), ("spacing", self.spacing), ("shape", shape)):
            if len(entry) != len(shape) or not all(math.isfinite(e) and e > 0 for e in entry):
                allowed = f"{len(shape)} positive numbers"
                raise InputError(problem(f"{place}, {name}", tuple(entry), allowed, "give one for each axis"))

    def _wanted(self, steps: Sequence[float]) -> Floats:
        """Return the correlation on the torus: the model summed over its periodic images."""
        tail = TAIL * reach(self.correlation)
        along = []
        for n, s in zip(self.torus_, steps, strict=True):
            lag = np.arange(n)
            lag[lag > n // 2] -= n
            images = max(0, math.ceil(tail * s / n - 0.5))
            along.append([(lag + image * n) / s for image in range(-images, images + 1)])
        total = np.zeros(self.torus_)
        for images_at in itertools.product(*along):
            squared = sum(np.square(g) for g in np.meshgrid(*images_at, indexing="ij", sparse=True))
            total += correlation_named(self.correlation)(np.sqrt(squared))
        return self._with_nugget(total / total.flat[0])

    def _with_nugget(self, correlation: Floats) -> Floats:
        mixed: Floats = (1.0 - self.nugget) * correlation
        mixed.flat[0] = 1.0
        return mixed


def probability_field(
    shape: Sequence[int],
    spacing: Sequence[float],
    ranges: Sequence[float],
    realizations: int,
    seed: int,
    correlation: str = "exponential",
) -> Iterator[Singles]:
    """Return an iterator over uniform fields, one realization at a time, float32, strictly between 0 and 1.

    Each is the standard normal distribution function of a :class:`GaussianField`. Read against the cumulative
    probabilities of each cell, it draws whole pictures whose cells agree with their neighbors (probability-field
    simulation: Srivastava 1992, SPE 24753; from memory).

    Parameters
    ----------
    shape, spacing, ranges
        Of the grid, axis by axis, for example steps by thicknesses.
    realizations
        How many.
    seed, correlation
        As in :class:`GaussianField`; a field with a nugget is drawn from one, through :func:`uniform`.

    Raises
    ------
    InputError
        As :meth:`GaussianField.fit`, at once and not on the first draw.

    Examples
    --------
    >>> few = list(probability_field((40, 12), (10.0, 0.5), (200.0, 2.0), realizations=2, seed=1))
    >>> many = list(probability_field((40, 12), (10.0, 0.5), (200.0, 2.0), realizations=5, seed=1))
    >>> all((a == b).all() for a, b in zip(few, many))
    True
    """
    field = GaussianField(correlation, ranges, spacing).fit(shape)
    return (uniform(field.draw(seed, realization)) for realization in range(realizations))


def uniform(field: Singles) -> Singles:
    """Return the standard normal distribution function of a field, kept off 0 and 1; any shape.

    Examples
    --------
    >>> uniform(np.array([-40.0, 0.0, 40.0], dtype=np.float32)).tolist()
    [1.1754943508222875e-38, 0.5, 0.9999999403953552]
    """
    result: Singles = np.clip(ndtr(np.asarray(field, dtype=np.float32)), LEAST_UNIFORM, LARGEST_UNIFORM)
    return result


def _torus(grid: Sequence[int], steps: Sequence[float], far: float) -> tuple[int, ...]:
    """Return the torus: the grid and, on each axis of more than one cell, the reach of the correlation."""
    need = [n + far * s if n > 1 else 1 for n, s in zip(grid, steps, strict=True)]
    if math.prod(need) > TORUS_CELLS:
        raise InputError(
            problem(
                "simulated field, ranges",
                " x ".join(f"{s:.3g}" for s in steps) + f" cells for a grid of {' x '.join(map(str, grid))}",
                f"ranges for which grid and ranges together have {TORUS_CELLS:,} cells or fewer",
                "shorten the ranges or use larger steps",
            )
        )
    return tuple(fft.next_fast_len(math.ceil(n), real=True) for n in need)
