"""Text of users made safe for file names, spreadsheets and databases.

Boring names, remarks and corridor names come from outside and may hold anything: formulas, markup, control
characters, marks that turn the writing direction. Outputs keep the words and take the sting out.
"""

from __future__ import annotations

import hashlib
import re
import unicodedata

LONGEST_STEM = 60  # characters; leaves room for folder and ending within the 260 that some systems allow

# names that some systems keep for devices, whatever the ending
_DEVICES = frozenset({"con", "prn", "aux", "nul", *(f"{port}{n}" for port in ("com", "lpt") for n in range(1, 10))})
# Unicode 15, UAX 9: marks, embeddings, overrides and isolates that alter the order in which letters are shown
_DIRECTION = re.compile("[\u061c\u200e\u200f\u202a-\u202e\u2066-\u2069]")
_CONTROL = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f]")  # all but tab, line feed and carriage return
_SURROGATE = re.compile("[\ud800-\udfff]")
_FORMULA = re.compile(r"[\s\ufeff]*[=+\-@\uff1d\uff0b\uff0d\uff20]|[\t\r\n]")
_NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?")


def file_stem(name: str) -> str:
    """Return a file name, without ending, for the name of a corridor.

    The rule: accents go, ASCII letters and digits stay, in lower case; anything else becomes one underscore,
    none at either end. Where that loses letters (another script) or the name is longer than `LONGEST_STEM`,
    eight digits of its SHA-256 keep two such names apart. Device names of Windows get an underscore.

    Examples
    --------
    >>> file_stem("Harrow Fen link"), file_stem("A1 (Süd), Los 3"), file_stem("../../etc/passwd")
    ('harrow_fen_link', 'a1_sud_los_3', 'etc_passwd')
    >>> file_stem("Дорога 7"), file_stem("nul")
    ('7_98144cca', 'nul_')
    """
    plain = [c for c in unicodedata.normalize("NFKD", name) if not unicodedata.combining(c)]
    stem = re.sub("[^a-z0-9]+", "_", "".join(plain).lower()).strip("_")
    lost = any(c.isalnum() and not c.isascii() for c in plain)
    if lost or len(stem) > LONGEST_STEM or not stem:
        digits = hashlib.sha256(name.encode("utf-8", "replace")).hexdigest()[:8]
        stem = f"{stem[: LONGEST_STEM - 9].rstrip('_') or 'corridor'}_{digits}"
    return f"{stem}_" if stem in _DEVICES else stem


def stored_text(text: str) -> str:
    r"""Return text that a database takes whole: without NUL, which ends a text, and without half characters.

    Examples
    --------
    >>> stored_text("BH-1\x00; drop table borings")
    'BH-1; drop table borings'
    """
    return _SURROGATE.sub("\ufffd", text.replace("\x00", ""))


def spreadsheet_cell(text: str) -> str:
    """Return text that a spreadsheet shows and does not run.

    Text that would start a formula (``=``, ``+``, ``-``, ``@``, their full-width forms, tab, line break, also after
    blanks) gets a leading apostrophe; a plain number stays a number. Control characters and marks of writing
    direction are dropped, because they make a cell show something else than it holds.

    Examples
    --------
    >>> spreadsheet_cell("=cmd|' /C calc'!A0"), spreadsheet_cell("-0+050"), spreadsheet_cell("-0.5")
    ("'=cmd|' /C calc'!A0", "'-0+050", '-0.5')
    """
    shown = _DIRECTION.sub("", _CONTROL.sub("", stored_text(text)))
    if _FORMULA.match(shown) and not _NUMBER.fullmatch(shown):
        return f"'{shown}"
    return shown
