"""The family of outputs: what each member has, and that one run publishes them together."""

from __future__ import annotations

import re
from pathlib import Path

from geomap.exports import EXPORTS, publish
from geomap.results import Results


def test_names_are_those_of_the_corridor_file_and_titles_say_what_they_are() -> None:
    assert [export.NAME for export in EXPORTS] == ["geopackage", "web_map", "schedules"]
    assert all(re.fullmatch("[A-Z].{10,90}", export.TITLE) for export in EXPORTS)


def test_all_outputs_of_a_run_are_published_together(results: Results, tmp_path: Path) -> None:
    folder = tmp_path / "outputs"
    with publish.staging(folder) as stage:
        staged = [path for export in EXPORTS for path in export.write(results, stage)]
        published = publish.publish(staged, folder)
    found = sorted(path for path in folder.rglob("*") if path.is_file())
    assert found == sorted(published)
    assert {path.suffix for path in found} == {".gpkg", ".html", ".csv"}
