"""Where the answer comes from, inside the GeoPackage: the Metadata extension (OGC 12-128r17, annex F.8)."""

from __future__ import annotations

import json
import sqlite3
from typing import Any

from geomap.exports.texts import stored_text
from geomap.results import Results

_DEFINITION = "http://www.geopackage.org/spec121/#extension_metadata"
_JSON_STANDARD = "https://www.rfc-editor.org/rfc/rfc8259"
_TEXT_STANDARD = "https://www.rfc-editor.org/rfc/rfc2046"
_TABLES = {
    "gpkg_metadata": """CREATE TABLE gpkg_metadata (
        id INTEGER CONSTRAINT m_pk PRIMARY KEY ASC NOT NULL, md_scope TEXT NOT NULL DEFAULT 'dataset',
        md_standard_uri TEXT NOT NULL, mime_type TEXT NOT NULL DEFAULT 'text/xml',
        metadata TEXT NOT NULL DEFAULT '')""",
    "gpkg_metadata_reference": """CREATE TABLE gpkg_metadata_reference (
        reference_scope TEXT NOT NULL, table_name TEXT, column_name TEXT, row_id_value INTEGER,
        timestamp DATETIME NOT NULL DEFAULT (strftime('%Y-%m-%dT%H:%M:%fZ','now')), md_file_id INTEGER NOT NULL,
        md_parent_id INTEGER,
        CONSTRAINT crmr_mfi_fk FOREIGN KEY (md_file_id) REFERENCES gpkg_metadata(id),
        CONSTRAINT crmr_mpi_fk FOREIGN KEY (md_parent_id) REFERENCES gpkg_metadata(id))""",
}


def add(connection: sqlite3.Connection, results: Results, date: str) -> None:
    """Add the provenance as JSON and the cautions as plain text, both about the whole file.

    Parameters
    ----------
    connection
        The finished GeoPackage.
    results
        What it was made from.
    date
        Time stamp of both entries, as the standard writes it.
    """
    for table, statement in _TABLES.items():
        connection.execute(statement)
        connection.execute(
            "INSERT INTO gpkg_extensions (table_name, column_name, extension_name, definition, scope) "
            "VALUES (?, NULL, 'gpkg_metadata', ?, 'read-write')",
            (table, _DEFINITION),
        )
    entries = [
        (
            1,
            "dataset",
            _JSON_STANDARD,
            "application/json",
            json.dumps(provenance(results), indent=1, ensure_ascii=False),
        ),
        (2, "dataset", _TEXT_STANDARD, "text/plain", cautions_text(results)),
    ]
    for entry in entries:
        connection.execute("INSERT INTO gpkg_metadata VALUES (?, ?, ?, ?, ?)", (*entry[:4], stored_text(entry[4])))
        connection.execute(
            "INSERT INTO gpkg_metadata_reference VALUES ('geopackage', NULL, NULL, NULL, ?, ?, NULL)", (date, entry[0])
        )


def provenance(results: Results) -> dict[str, Any]:
    """Return what the file was made from, ready for JSON: corridor, reference systems, run, counts, cautions."""
    run = results.tables["run"]
    counts = results.tables.get("counts")
    return {
        "corridor": results.name,
        "use": results.use,
        "issue": results.issue,
        "crs": results.crs,
        "vertical_datum": results.vertical_datum,
        "cautions": list(results.cautions),
        "run": dict(zip(run["key"].astype(str), run["value"].astype(str), strict=True)),
        "counts": [] if counts is None else json.loads(counts.to_json(orient="records")),
    }


def cautions_text(results: Results) -> str:
    """Return name, issue and cautions, a line each."""
    return "\n".join([results.name, f"Issue: {results.issue}", *results.cautions])
