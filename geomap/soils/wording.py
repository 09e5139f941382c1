"""Wording: columns of text made from codes, so that a million rows cost no more than their distinct texts."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray


def categories(codes: NDArray[Any], texts: Sequence[str]) -> pd.Categorical:
    """Return a column of text: code k is ``texts[k - 1]``, code 0 is missing.

    Examples
    --------
    >>> list(categories(np.array([2, 0, 1]), ["GW", "GP"]))
    ['GP', nan, 'GW']
    """
    places = np.asarray(codes, dtype=np.int32) - 1
    kind = pd.CategoricalDtype(pd.Index(list(texts)))
    return pd.Categorical.from_codes(places, dtype=kind, validate=False)


def used_categories(codes: NDArray[Any], texts: Sequence[str]) -> pd.Categorical:
    """Return `categories` with only those texts that occur."""
    is_used = np.bincount(codes, minlength=len(texts) + 1) > 0
    is_used[0] = False
    shorter = np.where(is_used, np.cumsum(is_used), 0)
    return categories(shorter[codes], [text for k, text in enumerate(texts, start=1) if is_used[k]])


def texts_from(codes: NDArray[Any], text: Callable[[int], str]) -> pd.Categorical:
    """Return a column of text made by `text` from each distinct code; code 0, and a blank text, are missing.

    Parameters
    ----------
    codes
        Whole numbers from 0, for example sets of bits.
    text
        What a code says.
    """
    result = np.zeros(len(codes), dtype=np.int32)
    rows = np.flatnonzero(codes)
    numbers, distinct = pd.factorize(codes[rows], sort=True)
    said = [text(int(code)) for code in distinct]
    places = {name: place for place, name in enumerate(dict.fromkeys(filter(None, said)), start=1)}
    result[rows] = np.array([places.get(name, 0) for name in said], dtype=np.int32)[numbers]
    return categories(result, list(places))


def sentences(bits: NDArray[Any], phrases: Sequence[str]) -> pd.Categorical:
    """Return a column of reasons: bit k set says ``phrases[k]``; several are joined with a semicolon.

    Examples
    --------
    >>> list(sentences(np.array([0, 3]), ["no liquid limit", "no sieve"]))
    [nan, 'no liquid limit; no sieve']
    """
    return texts_from(bits, lambda code: "; ".join(phrase for k, phrase in enumerate(phrases) if code >> k & 1))


def candidates(masks: NDArray[Any], symbols: Sequence[str]) -> pd.Categorical:
    """Return a column of possible symbols: bit k set lists ``symbols[k]``; blank where only one or none is left.

    Examples
    --------
    >>> list(candidates(np.array([1, 3]), ["GW", "GP"]))
    [nan, 'GW;GP']
    """

    def listed(code: int) -> str:
        found = [symbol for k, symbol in enumerate(symbols) if code >> k & 1]
        return ";".join(found) if len(found) > 1 else ""

    return texts_from(masks, listed)
