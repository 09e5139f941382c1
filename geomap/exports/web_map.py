"""One HTML page: plan, profile, cards and findings, opened from disk and asking no server for anything.

Folium makes the map; everything that comes from a corridor travels in one block of JSON that the page's own
scripts read, and is shown as text. Folium compiles what it renders as a template a second time, so a boring named
``{{ ... }}`` would run as code on this machine: no text of a corridor may reach it. A content security policy
lets the browser run the two scripts written here and nothing else.
"""

from __future__ import annotations

import base64
import hashlib
import html
import json
import re
from collections.abc import Mapping
from importlib import resources
from pathlib import Path
from typing import Any

import folium

from geomap.exports.texts import file_stem, stored_text
from geomap.exports.web_page_data import page_data
from geomap.results import Results

NAME = "web_map"
TITLE = "Offline HTML page: plan, longitudinal profile, boring and stretch cards, findings"
SUFFIX = ".html"

LEAFLET = "1.9.4"
# In this order: each file may use what stands above it, and start.js puts all together.
SCRIPTS = (
    *("text.js", "chainage.js", "data.js", "place.js", "colors.js"),
    *("plan_labels.js", "plan.js"),
    *("profile_scale.js", "profile_cells.js", "profile_marks.js", "profile_bands.js", "profile.js", "profile_input.js"),
    *("stretch.js", "findings.js", "boring.js", "summary.js", "legend.js", "print.js", "go_to.js", "start.js"),
)
STYLES = ("page.css", "plan.css", "profile.css", "cards.css", "narrow.css", "print.css")
EXECUTABLE_SCRIPTS = 2  # Leaflet; the map by folium with our own scripts

_FOLDER = resources.files("geomap.exports") / "web"
_SLOT = re.compile(r"<!-- slot: (\w+) -->")
_SCRIPT_START = re.compile(r"<script\b", re.IGNORECASE)


def write(results: Results, folder: Path) -> list[Path]:
    """Write the page of one corridor.

    Parameters
    ----------
    results
        What the run found out.
    folder
        Folder that exists, in a run the staging folder that `publish` empties.

    Returns
    -------
    list of Path
        The one file, named after the corridor. The same results give the same bytes.
    """
    target = folder / (file_stem(results.name) + SUFFIX)
    target.write_text(page(page_data(results)), encoding="utf-8", newline="\n")
    return [target]


def page(data: Mapping[str, Any]) -> str:
    """Return the page for one data block."""
    map_html, map_script = plan_map(data["plan"])
    scripts = [_leaflet_script(), page_script(map_script)]
    slots = {
        "policy": content_security_policy(scripts),
        "title": html.escape(stored_text(data["corridor"]["name"])),
        "style": "\n".join([_leaflet_style(), *(_text(name) for name in STYLES)]),
        "map": map_html,
        "data": json_block(data),
        "leaflet": scripts[0],
        "leaflet_version": LEAFLET,
        "script": scripts[1],
        "license": html.escape(_text("leaflet/LICENSE")),
    }
    # One pass: a slot's name inside the data is never looked at again.
    text = _SLOT.sub(lambda slot: slots[slot.group(1)], _text("page.html"))
    found = len(_SCRIPT_START.findall(text))
    if found != EXECUTABLE_SCRIPTS + 1:
        raise AssertionError(f"the page must hold {EXECUTABLE_SCRIPTS} scripts and one data block, found {found}")
    return text


def plan_map(plan: Mapping[str, Any]) -> tuple[str, str]:
    """Return the HTML element and the script of the map, with fixed names in place of folium's random ones.

    Only numbers and our own constants go in.
    """
    latitude, longitude = plan["lat"], plan["lon"]
    middle = [(min(latitude) + max(latitude)) / 2, (min(longitude) + max(longitude)) / 2]
    drawn = folium.Map(
        location=middle,
        tiles=None,
        crs="Simple" if plan["local"] else "EPSG3857",
        prefer_canvas=True,
        zoom_control="topright",
        zoom_snap=0.25,
        zoom_delta=1,
        wheel_px_per_zoom_level=120,
        min_zoom=-12 if plan["local"] else 3,
        max_zoom=22,
        attribution_control=False,
    )
    layers = {name: folium.FeatureGroup() for name in ("plan_grid", "plan_line", "plan_borings")}
    for layer in layers.values():
        layer.add_to(drawn)
    figure: Any = drawn.get_root()
    figure.render()
    parts = (figure.html.render(), figure.script.render())
    for name, made in {"plan_map": drawn, **layers}.items():
        parts = (parts[0].replace(made.get_name(), name), parts[1].replace(made.get_name(), name))
    return parts


def page_script(map_script: str) -> str:
    """Return folium's script and ours as one closed function: nothing is left in the browser's global names."""
    return "(() => {\n" + "\n".join(['"use strict";', map_script, *(_text(f"{name}") for name in SCRIPTS)]) + "})();\n"


def json_block(data: Mapping[str, Any]) -> str:
    r"""Return JSON that cannot end the script element it stands in.

    Examples
    --------
    >>> json_block({"boring": "</script><b>"})
    '{"boring":"\\u003c/script\\u003e\\u003cb\\u003e"}'
    """
    text = stored_text(json.dumps(data, separators=(",", ":"), allow_nan=False, ensure_ascii=False))
    for sign in ("<", ">", "&", "\u2028", "\u2029"):
        text = text.replace(sign, f"\\u{ord(sign):04x}")
    return text


def content_security_policy(scripts: list[str]) -> str:
    """Return a policy under which exactly these scripts run, and nothing is fetched.

    Leaflet sets styles on its elements, which needs ``'unsafe-inline'`` for styles.
    """
    digests = [base64.b64encode(hashlib.sha256(script.encode()).digest()).decode() for script in scripts]
    allowed = " ".join(f"'sha256-{digest}'" for digest in digests)
    return f"default-src 'none'; style-src 'unsafe-inline'; base-uri 'none'; form-action 'none'; script-src {allowed}"


def _text(name: str) -> str:
    return _FOLDER.joinpath(name).read_text("utf-8")


def _leaflet_script() -> str:
    return re.sub(r"//# sourceMappingURL=\S*", "", _text("leaflet/leaflet.js"))


def _leaflet_style() -> str:
    """Return Leaflet's style sheet without its icons, which this page does not use."""
    return re.sub(r"url\([^)]*\)", "none", _text("leaflet/leaflet.css"))
