"""The command line: arguments in, exit code out. The only module that prints.

Heavy libraries are imported inside the commands that need them, so that ``geomap --help`` answers at once.
"""

from __future__ import annotations

import contextlib
import json
import os
import sys
import traceback
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any, TypeVar

import click

from geomap import __version__
from geomap.errors import GeomapError

INTERRUPTED = 130
DEFECT = 70  # EX_SOFTWARE of sysexits.h
SHOWN_FINDINGS = 12  # `run` shows this many; `check` shows all

Command = TypeVar("Command", bound=Callable[..., Any])


def main() -> None:
    """Run the command line and leave with its exit code."""
    sys.exit(run_command(sys.argv[1:]))


def run_command(arguments: list[str]) -> int:
    """Run one command and return its exit code: 0 done, 1 input blocks, 2 usage, 4 output in use, 130 interrupted."""
    as_json = "--json" in arguments
    try:
        code = geomap.main(args=arguments, prog_name="geomap", standalone_mode=False)
    except click.ClickException as error:
        error.show()
        return _refused(as_json, error.format_message(), error.exit_code)
    except (click.Abort, KeyboardInterrupt):
        _say("interrupted; nothing was replaced")
        return INTERRUPTED
    except BrokenPipeError:
        sys.stdout = open(os.devnull, "w", encoding="utf-8")  # noqa: SIM115, PTH123 - the reader left; stay quiet
        return 0
    except GeomapError as error:
        _say(click.style("error: ", fg="red", bold=True) + str(error))
        return _refused(as_json, str(error), error.exit_code)
    except Exception as error:
        _say(
            f"geomap has a defect: {type(error).__name__}: {error}\nNothing was replaced. Please report it; ",
            newline=False,
        )
        _say("GEOMAP_TRACEBACK=1 before the command shows where it happened.")
        if os.environ.get("GEOMAP_TRACEBACK"):
            traceback.print_exc()
        return _refused(as_json, f"defect: {error}", DEFECT)
    return code if isinstance(code, int) else 0


def _refused(as_json: bool, message: str, code: int) -> int:
    if as_json:
        click.echo(json.dumps({"ok": False, "exit_code": code, "error": message}))
    return code


def _say(text: str, newline: bool = True) -> None:
    """Write a message to standard error, in color only where a terminal wants it."""
    click.echo(text, err=True, nl=newline, color=False if "NO_COLOR" in os.environ else None)


def _common(command: Command) -> Command:
    """Give a command the options that all have."""
    as_json = click.option("--json", "as_json", is_flag=True, help="A machine-readable summary on standard output.")
    quiet = click.option("--quiet", is_flag=True, help="Errors only.")
    return quiet(as_json(command))


@contextlib.contextmanager
def _progress(quiet: bool) -> Iterator[Callable[[str], None]]:
    """Show the stage at work on one line of the terminal; elsewhere show nothing."""
    shown = not quiet and sys.stderr.isatty()

    def tell(stage: str) -> None:
        if shown:
            click.echo(f"\r\033[K{stage} ...", err=True, nl=False)

    try:
        yield tell
    finally:
        if shown:
            click.echo("\r\033[K", err=True, nl=False)


@click.group(context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, prog_name="geomap")
def geomap() -> None:
    """Soil groups and subgrade suitability along a road or pipeline corridor.

    Start with `geomap new FOLDER`, look at the input with `geomap check FOLDER`, then `geomap run FOLDER`.
    """


@geomap.command(epilog="Example:  geomap run demo_corridor")
@click.argument("corridor", type=click.Path())
@_common
def run(corridor: str, quiet: bool, as_json: bool) -> int:
    """Do the whole job: read, check, classify, estimate, rate, and write the outputs.

    CORRIDOR is a corridor file, or a folder that holds corridor.toml.
    """
    from geomap import pipeline

    with _progress(quiet) as tell:
        results, files = pipeline.run_and_write(corridor, tell)
    if as_json:
        click.echo(json.dumps({"ok": True, **results.summary(), "files": [str(f) for f in files]}))
    elif not quiet:
        _show_counts(results.tables["counts"])
        _show_findings(results.tables["findings"], SHOWN_FINDINGS, f"geomap check {corridor}")
        _show_answer(results.summary())
        click.echo("wrote")
        for file in files:
            click.echo(f"  {_short(file)}")
    return 0


@geomap.command(epilog="Example:  geomap check demo_corridor --to findings.xlsx")
@click.argument("corridor", type=click.Path())
@click.option("--to", "target", type=click.Path(), help="Save the findings to a CSV or XLSX file.")
@_common
def check(corridor: str, target: str | None, quiet: bool, as_json: bool) -> int:
    """Read and judge the input only, and print the findings; nothing else is written."""
    from geomap import gate as gates
    from geomap.exports import table_files

    if target:
        table_files.check_ending(Path(target))
    with _progress(quiet) as tell:
        gate = gates.check(corridor, tell)
        if target:
            table_files.save(gate.findings, Path(target), "findings")
    blocks = int((gate.findings["action"] == "block").sum())
    if as_json:
        found = json.loads(gate.findings.to_json(orient="records"))
        counts = json.loads(gate.counts.to_json(orient="records"))
        click.echo(json.dumps({"ok": not blocks, "counts": counts, "findings": found}))
    elif not quiet:
        _show_counts(gate.counts)
        _show_findings(gate.findings, len(gate.findings), "")
        if target:
            click.echo(f"saved to {target}")
    return 1 if blocks else 0


@geomap.command(epilog="Example:  geomap classify lab.xlsx --to classified.csv")
@click.argument("table", type=click.Path())
@click.option(
    "--to", "target", type=click.Path(), required=True, help="CSV, XLSX, Parquet or GeoPackage, by its ending."
)
@click.option("--system", "systems", multiple=True, help="A classification system; may be repeated. See `geomap list`.")
@click.option("--sheet", default="", help="Sheet of a workbook or layer of a GeoPackage.")
@_common
def classify(table: str, target: str, systems: tuple[str, ...], sheet: str, quiet: bool, as_json: bool) -> int:
    """Classify a table of laboratory results: the same rows in the same order, with the classes added."""
    from geomap import lab_table

    with _progress(quiet) as tell:
        done = lab_table.classify_file(Path(table), Path(target), systems, sheet, tell)
    if as_json:
        found = json.loads(done.findings.to_json(orient="records"))
        click.echo(json.dumps({"ok": True, "rows": done.rows, "classified": done.classified, "findings": found}))
    elif not quiet:
        _show_findings(done.findings, SHOWN_FINDINGS, "")
        classified = ", ".join(f"{name} {count}" for name, count in done.classified.items())
        click.echo(f"{done.rows} rows read and written to {target}; with a class: {classified}")
    return 0


@geomap.command(epilog="Example:  geomap new my_road")
@click.argument("folder", type=click.Path())
@_common
def new(folder: str, quiet: bool, as_json: bool) -> int:
    """Make a folder with a commented corridor file and empty tables to fill in."""
    from geomap import starter

    files = starter.make(Path(folder))
    if as_json:
        click.echo(json.dumps({"ok": True, "files": [str(f) for f in files]}))
    elif not quiet:
        for file in files:
            click.echo(f"  {_short(file)}")
        click.echo(f"Fill in the tables, then: geomap check {folder}")
    return 0


@geomap.command(name="list", epilog="Example:  geomap list")
@_common
def list_known(quiet: bool, as_json: bool) -> int:
    """List the standards, rule sets, file formats and outputs known here, with edition and source."""
    from geomap import catalog

    known = catalog.known()
    if as_json:
        click.echo(json.dumps({"ok": True, **known}))
    elif not quiet:
        for family, entries in known.items():
            click.echo(click.style(family.replace("_", " "), bold=True))
            for entry in entries:
                click.echo(f"  {entry['name']:<26} {entry['title']}")
                for detail in (entry.get("source", ""), entry.get("edition", ""), entry.get("flag", "")):
                    if detail:
                        click.echo(f"  {'':<26}   {detail}")
    return 0


def _show_counts(counts: Any) -> None:
    click.echo(f"{'table':<12}{'read':>8}{'used':>8}{'left out':>10}")
    for row in counts.itertuples():
        click.echo(f"{row.table:<12}{row.read:>8}{row.used:>8}{row.left_out:>10}")


def _show_answer(summary: Any) -> None:
    total = summary["length_m"]
    click.echo(f"{summary['name']}, {total:,.0f} m")
    for title, words in (
        ("design zone", ("suitable", "treat", "unsuitable", "not assessed")),
        ("evidence", ("observed", "inferred", "no data")),
    ):
        shares = ((word, summary[f"length_{word.replace(' ', '_')}_m"]) for word in words)
        click.echo(f"  {title:<12}" + ", ".join(f"{word} {length:,.0f} m" for word, length in shares if length))
    click.echo(f"  {'estimation':<12}{summary['estimation']}")
    for caution in summary["cautions"]:
        click.echo(click.style(f"  {caution}", dim=True))


def _show_findings(findings: Any, most: int, more_by: str) -> None:
    """Print findings, the gravest first, one paragraph each."""
    if not len(findings):
        click.echo("no findings")
        return
    counts = findings["severity"].value_counts()
    click.echo(
        "findings: " + ", ".join(f"{counts[s]} {s}{'s' if counts[s] > 1 else ''}" for s in SEVERITIES if s in counts)
    )
    rank = findings["severity"].map({s: k for k, s in enumerate(SEVERITIES)})
    texts = findings.astype("string").fillna("")
    for row in texts.iloc[rank.argsort(kind="stable")].head(most).itertuples():
        number = f"row {row.row_number}" if row.row_number else ""
        place = ", ".join(str(part) for part in (row.file, row.sheet, number, row.heading) if part)
        who = " ".join(str(part) for part in (row.boring, row.sample) if part)
        what = _plain(f"{place} ({who})" if who else place)
        done = row.action.replace("_", " ")
        click.echo(f"  {click.style(row.severity, fg=COLORS[row.severity])} {what}")
        click.echo(f"    found {_plain(row.found)!r}; allowed: {row.allowed}; done: {done}; {row.advice}")
    if len(findings) > most:
        click.echo(f"  ... and {len(findings) - most} more" + (f": {more_by}" if more_by else ""))


SEVERITIES = ("error", "warning", "note")
COLORS = {"error": "red", "warning": "yellow", "note": "cyan"}


def _plain(text: str) -> str:
    """Return text without control characters, so that a file cannot write to the terminal."""
    return "".join(c if c.isprintable() else "\N{REPLACEMENT CHARACTER}" for c in text)


def _short(path: Path) -> str:
    """Return a path as a person would type it from here."""
    with contextlib.suppress(ValueError, OSError):
        return os.path.relpath(path)
    return str(path)
