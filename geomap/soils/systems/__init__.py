"""Classification systems: what a system offers, and which there are."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, Protocol

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.soils.systems import aashto_m145, astm_d2487, usda_texture


class System(Protocol):
    """A classification system: in practice a module."""

    @property
    def NAME(self) -> str:  # noqa: N802 - a module constant
        """Name by which a corridor file asks for it."""

    @property
    def TITLE(self) -> str:  # noqa: N802
        """Name for people."""

    @property
    def SOURCE(self) -> str:  # noqa: N802
        """Body and designation."""

    @property
    def EDITION(self) -> str:  # noqa: N802
        """Year or number of the edition."""

    @property
    def COLUMN(self) -> str:  # noqa: N802
        """Column of the class; ``_reason``, ``_candidates``, ``_basis`` and ``_near_limit`` follow it."""

    @property
    def NEEDS(self) -> tuple[str, ...]:  # noqa: N802
        """Record columns that `codes` reads."""

    @property
    def SYMBOLS(self) -> tuple[str, ...]:  # noqa: N802
        """Classes in standard order; code k is ``SYMBOLS[k - 1]``, code 0 is not determined."""

    @property
    def SYMBOL_NAMES(self) -> Mapping[str, str]:  # noqa: N802
        """Plain name of each class."""

    def codes(self, records: Mapping[str, NDArray[Any]]) -> NDArray[np.int8]:
        """Return the class of each record as a code."""

    def classify(self, records: pd.DataFrame, *, with_reasons: bool = True) -> pd.DataFrame:
        """Return the class of each record and what stands behind it, on the same index."""


SYSTEMS: tuple[System, ...] = (astm_d2487, aashto_m145, usda_texture)
