"""Errors that a user can act on.

Every error raised on purpose derives from :class:`GeomapError`. `cli` prints its text without a traceback
and turns ``exit_code`` into the exit status; anything else that escapes is a defect of geomap.
"""

from __future__ import annotations


class GeomapError(Exception):
    """Base of all errors that geomap raises on purpose."""

    exit_code = 1


class InputError(GeomapError, ValueError):
    """The input stops the job: nothing is written, old outputs stay.

    The text follows one pattern, ``place: found ...; allowed ...; what to do``.
    """

    exit_code = 1


class UsageError(GeomapError, ValueError):
    """The command line or the corridor file is wrong; the text names the line and the nearest valid word."""

    exit_code = 2


class OutputInUseError(GeomapError, OSError):
    """Another program holds an output file, or it cannot be written; the old file is untouched."""

    exit_code = 4


def problem(place: str, found: object, allowed: str, remedy: str) -> str:
    """Return one message in the house pattern.

    Parameters
    ----------
    place
        File, sheet, row and heading, or line and key, as far as they are known.
    found
        What stands there. Long values are shortened to 80 characters.
    allowed
        What may stand there.
    remedy
        What the reader of the message should do.

    Examples
    --------
    >>> problem("lab.xlsx, sheet Lab, row 14, LL", "N/P", "0 to 300 or NP", "write NP")
    "lab.xlsx, sheet Lab, row 14, LL: found 'N/P'; allowed: 0 to 300 or NP; write NP"
    """
    text = str(found)
    if len(text) > 80:
        text = text[:77] + "..."
    return f"{place}: found {text!r}; allowed: {allowed}; {remedy}"
