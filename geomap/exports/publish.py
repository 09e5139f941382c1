"""Put finished outputs in place: all of them, or none.

Every file of a run is written to a staging folder inside the target folder, so on the same file system. When
all are complete, `publish` asks whether each old file is free and only then moves the new ones over them. A
reader sees the old file or the new one, never a part. If a move fails after all, those already made are undone.

A GeoPackage is an SQLite database, and moving a file over one that a GIS holds open is not enough: its
write-ahead log (``-wal``) would be replayed over the new file. So a held GeoPackage is an error, not a race.
"""

from __future__ import annotations

import contextlib
import errno
import os
import shutil
import sqlite3
import tempfile
import time
from collections.abc import Iterator, Sequence
from pathlib import Path

from geomap.errors import OutputInUseError

STAGING_PREFIX = ".geomap_staging_"
KEPT = "replaced"  # folder inside staging for the old files until all moves are made
_CLAIM = "in_use.sqlite"  # held under an exclusive lock while its run lives; the system lets go when it dies
_UNCLAIMED_S = 60.0  # a staging folder without a claim may be one that is just being made
_SIDE_FILES = ("-wal", "-shm", "-journal")
_PROBE_S = 0.2  # how long a lock may be busy before the file counts as held
_HELD = "another program has this GeoPackage open; close it there, or remove it from the project, and run again"
_ORPHAN = "belongs to a GeoPackage that is gone; close the program that had it open, or delete this file, and run again"

# how a disk says no; anything else is a defect of geomap and must not pass for one
_REFUSAL_NAMES = (
    *("EACCES", "EBUSY", "EDQUOT", "EEXIST", "EFBIG", "EIO", "EISDIR"),
    *("ENAMETOOLONG", "ENOSPC", "ENOTDIR", "EPERM", "EROFS", "ETXTBSY"),
)
_REFUSALS = frozenset(getattr(errno, name) for name in _REFUSAL_NAMES if hasattr(errno, name))
_DATABASE_REFUSALS = frozenset(  # busy: in a folder of our own, a file system that cannot lock
    {
        *(sqlite3.SQLITE_BUSY, sqlite3.SQLITE_CANTOPEN, sqlite3.SQLITE_FULL),
        *(sqlite3.SQLITE_IOERR, sqlite3.SQLITE_PERM, sqlite3.SQLITE_READONLY),
    }
)


@contextlib.contextmanager
def staging(target_folder: Path) -> Iterator[Path]:
    """Give an empty folder on the file system of `target_folder`; it is gone afterwards, whatever happens.

    Staging folders left by killed runs are removed first; those of runs that still live are not touched.
    A target folder that does not exist is made, and removed again if nothing was published.

    Raises
    ------
    OutputInUseError
        The folder cannot be made, or the disk refuses what is written inside the ``with`` block.
    """
    made = _made(target_folder)
    try:
        _remove_left_behind(target_folder)
        with _claimed(target_folder) as folder:
            yield folder
    except (OSError, sqlite3.Error) as cause:
        if not _is_refusal(cause):
            raise
        raise _refused(target_folder, cause) from cause
    finally:
        _remove_empty(made)


def _made(folder: Path) -> list[Path]:
    """Make a folder with those above it and return which are new, the deepest first; try whether it takes anything.

    Whatever the system says here is about the name that the user chose, not a defect: a part of it too long, a
    folder of the system that takes no folders, a file in the way.
    """
    new: list[Path] = []
    try:
        new += [part for part in (folder, *folder.parents) if not os.path.lexists(part)]
        folder.mkdir(parents=True, exist_ok=True)
        Path(tempfile.mkdtemp(prefix=STAGING_PREFIX, dir=folder)).rmdir()
    except (OSError, ValueError) as cause:  # ValueError: a null character in the name
        _remove_empty(new)
        raise _refused(folder, cause) from cause
    return new


def _remove_empty(folders: Sequence[Path]) -> None:
    for folder in folders:
        with contextlib.suppress(OSError, ValueError):  # not empty: something was published; or no name at all
            folder.rmdir()


def publish(staged: Sequence[Path], target_folder: Path) -> list[Path]:
    """Move finished files from their staging folder over the old ones and return their new paths.

    Parameters
    ----------
    staged
        Files inside a folder that `staging` gave, complete and closed. A file in a subfolder keeps it.
    target_folder
        Where they belong.

    Raises
    ------
    OutputInUseError
        An old file is held by another program or cannot be replaced; every old file is then as it was.
    """
    moves = [(new, target_folder / new.relative_to(_root(new))) for new in staged]
    try:
        for new, _ in moves:
            _flush(new)
        for _, old in moves:
            old.parent.mkdir(parents=True, exist_ok=True)
            _probe(old)
        _replace_all(moves)
    except OSError as cause:
        if not _is_refusal(cause):
            raise
        raise _refused(Path(cause.filename2 or cause.filename or target_folder), cause) from cause
    return [old for _, old in moves]


def _replace_all(moves: Sequence[tuple[Path, Path]]) -> None:
    """Move every new file over its old one; on any failure put the old ones back."""
    done: list[tuple[Path, Path | None]] = []
    try:
        for number, (new, old) in enumerate(moves):
            kept = _keep(old, _root(new) / KEPT / str(number)) if old.exists() else None
            done.append((old, kept))
            new.replace(old)
    except BaseException:
        for old, kept in reversed(done):
            with contextlib.suppress(OSError):
                if kept is None:
                    old.unlink(missing_ok=True)
                else:
                    kept.replace(old)
        raise


def _keep(old: Path, kept: Path) -> Path:
    """Give the old file a second name, or copy it where the file system has no second names."""
    kept.parent.mkdir(exist_ok=True)
    try:
        os.link(old, kept)
    except OSError:
        shutil.copy2(old, kept)
    return kept


def _probe(old: Path) -> None:
    """Raise `OutputInUseError` unless `old` is absent or nobody holds it."""
    if old.is_dir():
        raise OutputInUseError(f"{old}: a folder has the name of an output; rename or remove it")
    if not os.access(old.parent, os.W_OK):
        raise OutputInUseError(f"{old.parent}: the folder takes no new files; ask for the permission to write there")
    if old.suffix == ".gpkg":
        _probe_geopackage(old)
    elif old.exists():
        with old.open("r+b"):  # refused where a program has the file open for itself
            pass


def _probe_geopackage(old: Path) -> None:
    if old.exists():
        with old.open("r+b"):
            pass
        try:
            _take_all_locks(old)
        except sqlite3.OperationalError as cause:
            raise OutputInUseError(f"{old}: {_HELD}") from cause
        except sqlite3.DatabaseError:
            pass  # not a database at all: nobody can hold it as one
    left = [side for side in (old.with_name(old.name + ending) for ending in _SIDE_FILES) if side.exists()]
    if left and old.exists():
        raise OutputInUseError(f"{old}: {_HELD} ({left[0].name} is beside it)")
    if left:
        raise OutputInUseError(f"{left[0]}: {_ORPHAN}")


def _take_all_locks(old: Path) -> None:
    """Take every lock there is and let go; fails while any other connection is at work.

    Leaving write-ahead mode needs the only connection. It also folds a log that a crashed program left
    behind into the old file, so nothing of it can reach the new one.
    """
    connection = sqlite3.connect(old, timeout=_PROBE_S, isolation_level=None)
    try:
        connection.execute("pragma journal_mode = delete").fetchall()
        connection.execute("begin exclusive")
        connection.execute("rollback")
    finally:
        connection.close()


@contextlib.contextmanager
def _claimed(target_folder: Path) -> Iterator[Path]:
    """Give a new staging folder under a lock that says that its run lives."""
    folder = Path(tempfile.mkdtemp(prefix=STAGING_PREFIX, dir=target_folder))
    claim = sqlite3.connect(folder / _CLAIM, timeout=_PROBE_S, isolation_level=None)
    try:
        claim.execute("begin exclusive")
        yield folder
    finally:
        claim.close()
        shutil.rmtree(folder, ignore_errors=True)


def _remove_left_behind(target_folder: Path) -> None:
    """Remove what killed runs left in the target folder."""
    for left in target_folder.glob(f"{STAGING_PREFIX}*"):
        if _is_abandoned(left):
            shutil.rmtree(left, ignore_errors=True)


def _is_abandoned(folder: Path) -> bool:
    if not (folder / _CLAIM).exists():
        return time.time() - folder.stat().st_mtime > _UNCLAIMED_S
    claim = sqlite3.connect(folder / _CLAIM, timeout=0, isolation_level=None)
    try:
        claim.execute("begin exclusive")
    except sqlite3.Error:
        return False
    finally:
        claim.close()
    return True


def _root(staged: Path) -> Path:
    """Return the staging folder that a file lies in."""
    for folder in staged.parents:
        if folder.name.startswith(STAGING_PREFIX):
            return folder
    raise ValueError(f"{staged} is not in a staging folder")


def _flush(new: Path) -> None:
    """Make the system write the file out, so that a power cut cannot leave an empty one behind a good name."""
    with new.open("r+b") as file:
        os.fsync(file.fileno())


def _is_refusal(cause: Exception) -> bool:
    """Tell whether the disk refused, as against a defect or an error that already has its words."""
    if isinstance(cause, sqlite3.Error):
        return getattr(cause, "sqlite_errorcode", 0) & 0xFF in _DATABASE_REFUSALS  # the low byte is the primary code
    return isinstance(cause, OSError) and cause.errno in _REFUSALS


def _refused(place: Path, cause: Exception) -> OutputInUseError:
    """Return the error for a disk that refuses: full, read-only, no permission, held."""
    reason = getattr(cause, "strerror", None) or str(cause)
    return OutputInUseError(
        f"{place}: cannot be written ({reason}); free the disk or the file, or choose another folder under "
        "[outputs], and run again. The old outputs are as they were"
    )
