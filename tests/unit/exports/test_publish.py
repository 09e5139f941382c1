"""Outputs are put in place all together or not at all, and what others hold is left alone."""

from __future__ import annotations

import errno
import os
import signal
import sqlite3
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator
from pathlib import Path

import pytest

from geomap.errors import OutputInUseError
from geomap.exports import publish
from geomap.exports.publish import STAGING_PREFIX, staging


def database(path: Path, word: str, journal: str = "delete") -> Path:
    """Make a small SQLite file that holds one word."""
    connection = sqlite3.connect(path, isolation_level=None)
    connection.execute(f"pragma journal_mode = {journal}")
    connection.execute("create table words (word text)")
    connection.execute("insert into words values (?)", (word,))
    connection.close()
    return path


def word_in(path: Path) -> str:
    connection = sqlite3.connect(path)
    try:
        return str(connection.execute("select word from words").fetchone()[0])
    finally:
        connection.close()


def left_in(folder: Path) -> list[str]:
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*"))


def run(folder: Path) -> list[Path]:
    """Publish a new GeoPackage, page and schedule, as a run does."""
    with staging(folder) as stage:
        (stage / "schedules").mkdir()
        staged = [stage / "page.html", stage / "line.gpkg", stage / "schedules" / "borings.csv"]
        staged[0].write_text("new")
        database(staged[1], "new")
        staged[2].write_text("new")
        return publish.publish(staged, folder)


@pytest.fixture
def outputs(tmp_path: Path) -> Iterator[Path]:
    """Give a folder with the outputs of an earlier run."""
    folder = tmp_path / "outputs"
    (folder / "schedules").mkdir(parents=True)
    (folder / "page.html").write_text("old")
    database(folder / "line.gpkg", "old")
    (folder / "schedules" / "borings.csv").write_text("old")
    (folder / "notes.txt").write_text("mine")
    yield folder
    assert not list(folder.glob(f"{STAGING_PREFIX}*"))
    assert (folder / "notes.txt").read_text() == "mine"


def assert_all_old(folder: Path) -> None:
    assert (folder / "page.html").read_text() == "old"
    assert (folder / "schedules" / "borings.csv").read_text() == "old"
    assert word_in(folder / "line.gpkg") == "old"


def test_a_folder_that_does_not_exist_is_made(tmp_path: Path) -> None:
    folder = tmp_path / "a" / "b"
    published = run(folder)
    assert published == [folder / "page.html", folder / "line.gpkg", folder / "schedules" / "borings.csv"]
    assert left_in(folder) == ["line.gpkg", "page.html", "schedules", "schedules/borings.csv"]


def test_old_outputs_are_replaced_and_strangers_stay(outputs: Path) -> None:
    run(outputs)
    assert word_in(outputs / "line.gpkg") == "new"
    assert (outputs / "page.html").read_text() == "new"
    assert (outputs / "schedules" / "borings.csv").read_text() == "new"


def test_a_run_that_fails_before_publishing_leaves_no_folder_behind(tmp_path: Path) -> None:
    with pytest.raises(FileNotFoundError), staging(tmp_path / "a" / "b") as stage:
        (stage / "half").write_text((stage / "missing").read_text())
    assert left_in(tmp_path) == []


@pytest.mark.parametrize("lock", ["exclusive", "immediate"])
def test_a_geopackage_that_another_program_writes_is_in_use_and_nothing_is_replaced(outputs: Path, lock: str) -> None:
    holder = sqlite3.connect(outputs / "line.gpkg", isolation_level=None)
    holder.execute(f"begin {lock}")
    with pytest.raises(OutputInUseError, match=r"line\.gpkg.*has this GeoPackage open"):
        run(outputs)
    holder.close()
    assert_all_old(outputs)


def test_a_geopackage_that_another_program_reads_is_in_use(outputs: Path) -> None:
    holder = sqlite3.connect(outputs / "line.gpkg", isolation_level=None)
    holder.execute("begin")
    holder.execute("select * from words").fetchall()
    with pytest.raises(OutputInUseError, match="GeoPackage open"):
        run(outputs)
    holder.close()
    assert_all_old(outputs)


@pytest.mark.parametrize("busy", [True, False])
def test_a_geopackage_open_in_write_ahead_mode_is_in_use_even_when_idle(outputs: Path, busy: bool) -> None:
    (outputs / "line.gpkg").unlink()
    database(outputs / "line.gpkg", "old", journal="wal")
    holder = sqlite3.connect(outputs / "line.gpkg", isolation_level=None)
    holder.execute("begin") if busy else None
    holder.execute("select * from words").fetchall()
    with pytest.raises(OutputInUseError, match="GeoPackage open"):
        run(outputs)
    assert holder.execute("select word from words").fetchall() == [("old",)]
    holder.close()
    assert_all_old(outputs)


def test_the_log_of_a_crashed_program_is_not_replayed_over_the_new_file(outputs: Path) -> None:
    (outputs / "line.gpkg").unlink()
    script = (
        "import os, sqlite3, sys; c = sqlite3.connect(sys.argv[1], isolation_level=None);"
        "c.execute('pragma journal_mode = wal'); c.execute('create table words (word text)');"
        "c.execute(\"insert into words values ('old')\"); os._exit(1)"
    )
    subprocess.run([sys.executable, "-c", script, str(outputs / "line.gpkg")], check=False)
    assert (outputs / "line.gpkg-wal").exists()
    run(outputs)
    assert word_in(outputs / "line.gpkg") == "new"
    assert not (outputs / "line.gpkg-wal").exists()


def test_a_log_without_its_geopackage_stops_the_run_and_is_named(outputs: Path) -> None:
    (outputs / "line.gpkg").unlink()
    (outputs / "line.gpkg-wal").write_bytes(b"x" * 64)
    with pytest.raises(OutputInUseError, match=r"line\.gpkg-wal.*delete this file"):
        run(outputs)
    assert (outputs / "page.html").read_text() == "old"
    (outputs / "line.gpkg-wal").unlink()


def test_a_broken_old_file_is_simply_replaced(outputs: Path) -> None:
    (outputs / "line.gpkg").write_text("this is no database, whatever its name says" * 50)
    run(outputs)
    assert word_in(outputs / "line.gpkg") == "new"


def test_a_folder_with_the_name_of_an_output_is_an_error(outputs: Path) -> None:
    (outputs / "page.html").unlink()
    (outputs / "page.html").mkdir()
    with pytest.raises(OutputInUseError, match="a folder has the name"):
        run(outputs)
    assert word_in(outputs / "line.gpkg") == "old"


@pytest.mark.parametrize("linked", [True, False])
def test_a_move_that_fails_midway_puts_the_old_files_back(
    outputs: Path, monkeypatch: pytest.MonkeyPatch, linked: bool
) -> None:
    replace = Path.replace

    def third_fails(self: Path, target: Path) -> Path:
        if self.name == "borings.csv":
            raise PermissionError(errno.EACCES, "Permission denied", str(self), None, str(target))
        return replace(self, target)

    def no_links(*_: object) -> None:
        raise OSError(errno.EPERM, "no hard links here")

    monkeypatch.setattr(Path, "replace", third_fails)
    if not linked:
        monkeypatch.setattr(os, "link", no_links)
    with pytest.raises(OutputInUseError, match=r"borings\.csv: cannot be written \(Permission denied\)"):
        run(outputs)
    monkeypatch.undo()
    assert_all_old(outputs)


def test_a_move_that_fails_midway_removes_new_files_that_had_no_old_one(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    replace = Path.replace

    def second_fails(self: Path, target: Path) -> Path:
        if self.name == "line.gpkg":
            raise OSError(errno.ENOSPC, "No space left on device", str(self), None, str(target))
        return replace(self, target)

    monkeypatch.setattr(Path, "replace", second_fails)
    with pytest.raises(OutputInUseError, match="No space left"):
        run(tmp_path)
    assert [path for path in left_in(tmp_path) if path != "schedules"] == []


@pytest.mark.skipif(not hasattr(signal, "SIGKILL"), reason="needs a signal that cannot be caught")
def test_what_a_killed_run_left_is_removed_by_the_next_and_a_live_run_is_not_touched(outputs: Path) -> None:
    script = (
        "import sys, time; from pathlib import Path; from geomap.exports.publish import staging\n"
        "with staging(Path(sys.argv[1])) as stage:\n"
        "    (stage / 'big').write_text('half'); print(stage, flush=True); time.sleep(60)"
    )
    environment = {**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)}
    command = [sys.executable, "-c", script, str(outputs)]
    killed, alive = (subprocess.Popen(command, stdout=subprocess.PIPE, text=True, env=environment) for _ in range(2))
    try:
        stages = [Path(process.stdout.readline().strip()) for process in (killed, alive) if process.stdout]
        killed.kill()
        killed.wait()
        assert all((stage / "big").exists() for stage in stages)
        run(outputs)
        assert [stage.exists() for stage in stages] == [False, True]
    finally:
        for process in (killed, alive):
            process.kill()
            process.communicate()
    run(outputs)
    assert not stages[1].exists()


def test_a_folder_that_is_just_being_made_is_left_alone_and_an_old_one_is_not(tmp_path: Path) -> None:
    young, old = (tmp_path / f"{STAGING_PREFIX}{word}" for word in ("young", "old"))
    young.mkdir()
    old.mkdir()
    hour_ago = time.time() - 3600
    os.utime(old, (hour_ago, hour_ago))
    with staging(tmp_path):
        assert young.exists()
        assert not old.exists()


def test_a_target_that_is_a_file_is_a_clear_error(tmp_path: Path) -> None:
    (tmp_path / "outputs").write_text("a file")
    with pytest.raises(OutputInUseError, match="outputs"), staging(tmp_path / "outputs"):
        pass


@pytest.mark.parametrize("name", ["x" * 300, "a/" + "y" * 300, "null\0character"])
def test_a_folder_that_cannot_have_its_name_is_a_clear_error_and_nothing_is_left(tmp_path: Path, name: str) -> None:
    with (
        pytest.raises(OutputInUseError, match=r"cannot be written \(.*choose another folder"),
        staging(tmp_path / name),
    ):
        pass
    assert left_in(tmp_path) == []


@pytest.mark.parametrize("code", [errno.ENOENT, errno.EINVAL, errno.EMFILE])
def test_whatever_the_system_says_about_making_the_folder_is_said_to_the_user(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, code: int
) -> None:
    def refuse(self: Path, *_: object, **__: object) -> None:
        raise OSError(code, os.strerror(code), str(self))

    monkeypatch.setattr(Path, "mkdir", refuse)
    with pytest.raises(OutputInUseError, match=os.strerror(code)), staging(tmp_path / "new"):
        pass


@pytest.mark.skipif(not Path("/proc/self").is_dir(), reason="needs the folder of processes of Linux")
@pytest.mark.parametrize("place", ["/proc", "/proc/xx"])
def test_a_folder_of_the_system_that_takes_no_files_is_a_clear_error(place: str) -> None:
    with pytest.raises(OutputInUseError, match=rf"{place}: cannot be written"), staging(Path(place)):
        pass


@pytest.mark.skipif(not hasattr(os, "seteuid"), reason="needs the permissions of POSIX")
def test_a_folder_without_permission_is_a_clear_error() -> None:
    with tempfile.TemporaryDirectory() as folder:
        outputs = Path(folder)
        (outputs / "page.html").write_text("old")
        outputs.chmod(0o555)
        me = os.geteuid()
        try:
            if me == 0:  # root may write anywhere: become nobody for a moment
                os.seteuid(65534)
            with pytest.raises(OutputInUseError, match="Permission denied"):
                run(outputs)
        finally:
            os.seteuid(me)
            outputs.chmod(0o700)
        assert (outputs / "page.html").read_text() == "old"


def test_a_full_disk_while_writing_is_a_clear_error_and_old_outputs_stay(outputs: Path) -> None:
    script = (
        "import resource, signal, sys; from pathlib import Path; from geomap.exports.publish import staging\n"
        "from geomap.errors import OutputInUseError\n"
        "signal.signal(signal.SIGXFSZ, signal.SIG_IGN); resource.setrlimit(resource.RLIMIT_FSIZE, (10_000, 10_000))\n"
        "try:\n"
        "    with staging(Path(sys.argv[1])) as stage: (stage / 'page.html').write_text('x' * 100_000)\n"
        "except OutputInUseError as error: print('said:', error)"
    )
    pytest.importorskip("resource")
    environment = {**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)}
    done = subprocess.run(
        [sys.executable, "-c", script, str(outputs)], capture_output=True, text=True, env=environment, check=True
    )
    assert "cannot be written (File too large)" in done.stdout
    assert_all_old(outputs)


def test_a_defect_inside_the_block_is_not_dressed_up_as_a_full_disk(tmp_path: Path) -> None:
    with pytest.raises(FileNotFoundError), staging(tmp_path) as stage:
        (stage / "missing").read_text()
    with pytest.raises(sqlite3.OperationalError), staging(tmp_path):
        sqlite3.connect(":memory:").execute("select * from nothing")


def test_only_staged_files_can_be_published(tmp_path: Path) -> None:
    (tmp_path / "other").mkdir()
    stranger = tmp_path / "other" / "page.html"
    stranger.write_text("x")
    with pytest.raises(ValueError, match="not in a staging folder"):
        publish.publish([stranger], tmp_path)
