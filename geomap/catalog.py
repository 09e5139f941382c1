"""What is known here: standards, rule sets, file formats and outputs, read from the families themselves."""

from __future__ import annotations

from geomap.exports import EXPORTS
from geomap.ratings import rules
from geomap.readers import alignments, borings, surfaces
from geomap.soils.systems import SYSTEMS, astm_d2487


def choices() -> dict[str, list[str]]:
    """Return the names that a corridor file may use, by key."""
    return {
        "systems": [system.NAME for system in SYSTEMS],
        "rules": rules.rule_set_names(),
        "products": [export.NAME for export in EXPORTS],
        "groups": list(astm_d2487.SYMBOLS),
    }


def known() -> dict[str, list[dict[str, str]]]:
    """Return everything known here by family: name, title, and where they have one, source, edition and flag."""
    rule_sets = [rules.read_rule_set(name, purpose=None) for name in rules.rule_set_names()]
    formats = [
        *((f.NAME, "tables", f.TITLE, f.SUFFIXES) for f in borings.FORMATS),
        *((f.NAME, "alignment", f.TITLE, f.SUFFIXES) for f in alignments.FORMATS),
        *((f.NAME, "levels", f.TITLE, f.SUFFIXES) for f in surfaces.FORMATS),
    ]
    return {
        "standards": [{"name": s.NAME, "title": s.TITLE, "source": s.SOURCE, "edition": s.EDITION} for s in SYSTEMS],
        "rule_sets": [
            {"name": r.name, "title": r.title, "source": r.source, "edition": r.edition, "flag": r.flag}
            for r in rule_sets
        ],
        "file_formats": [
            {"name": f"{name} ({role})", "title": f"{title}: {', '.join(suffixes)}"}
            for name, role, title, suffixes in formats
        ],
        "outputs": [{"name": export.NAME, "title": export.TITLE} for export in EXPORTS],
    }
