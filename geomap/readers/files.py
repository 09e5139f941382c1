"""Before a file is read: is it there, may it be read, is it what its name says, is it of a sane size."""

from __future__ import annotations

import difflib
import stat
from pathlib import Path

from geomap.errors import InputError, problem

MAX_FILE_BYTES = 1 << 30  # ours: 1 GiB; a text table of 1,000,000 rows by 12 columns is about a tenth of it

# How a file starts that is not what its name says -> what it is. From the formats' own definitions.
SIGNATURES = {
    b"PK\x03\x04": "a zip archive (an XLSX workbook is one)",
    b"\xd0\xcf\x11\xe0": "an old XLS workbook, or a workbook with a password",
    b"SQLite format 3\0": "a database (a GeoPackage is one)",
    b"%PDF": "a PDF document",
    b"\x00\x00\x27\x0a": "the geometry of a shapefile",
}


def first_bytes(path: Path, count: int = 64) -> bytes:
    """Return the first bytes of a file that is there, readable and not too large.

    Raises
    ------
    InputError
        The file is missing, is a folder, may not be read, is empty or is larger than `MAX_FILE_BYTES`.
    """
    try:
        status = path.stat()
        if not stat.S_ISREG(status.st_mode):
            what = "a folder" if stat.S_ISDIR(status.st_mode) else "a device"
            raise InputError(problem(path.name, what, "a file", "name a file"))
        with path.open("rb") as stream:
            start = stream.read(count)
    except FileNotFoundError:
        raise InputError(problem(path.name, "no such file", "a file", _nearest(path))) from None
    except PermissionError:
        remedy = "close the program that holds it, or ask for the right to read it"
        raise InputError(problem(path.name, "a file that may not be read", "a readable file", remedy)) from None
    except (OSError, ValueError) as error:
        raise InputError(problem(path.name[:80], str(error), "a readable file", "correct the name")) from None
    size = status.st_size
    if size > MAX_FILE_BYTES:
        allowed = f"at most {MAX_FILE_BYTES >> 20} MiB"
        raise InputError(problem(path.name, f"{size >> 20} MiB", allowed, "split the file or leave out columns"))
    if not start:
        raise InputError(problem(path.name, "an empty file", "a table", "save it again from where it came"))
    return start


def signature(start: bytes) -> str:
    """Return what a file is by its first bytes, or blank where they say nothing.

    Examples
    --------
    >>> signature(b"%PDF-1.7"), signature(b"boring,x,y")
    ('a PDF document', '')
    """
    return next((meaning for mark, meaning in SIGNATURES.items() if start.startswith(mark)), "")


def reason(error: BaseException, path: Path) -> str:
    """Return the first line of an error of a library, for a message, with the name of the file only."""
    lines = str(error).replace(str(path), path.name).strip().splitlines()
    return lines[0] if lines else type(error).__name__


def _nearest(path: Path) -> str:
    try:
        beside = sorted(item.name for item in path.parent.iterdir() if item.is_file())
    except OSError:
        return f"the folder {path.parent.name} is not there either"
    near = difflib.get_close_matches(path.name, beside, n=1, cutoff=0.6)
    return f"did you mean {near[0]}?" if near else "correct the name"
