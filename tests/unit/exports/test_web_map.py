"""The page as a file: one, self-contained, the same every time, and deaf to what its data would like to run."""

from __future__ import annotations

import base64
import hashlib
import re
from collections.abc import Iterator
from html.parser import HTMLParser
from importlib import resources
from pathlib import Path

import pytest

from geomap.exports import web_map
from geomap.exports.web_page_data import page_data
from geomap.results import Results
from tests.unit.exports.sample import sample_results
from tests.unit.exports.web_corridor import large_results

WEB = resources.files("geomap.exports") / "web"
HOSTILE = (
    "{{7*7}}",
    "{{ cycler.__init__.__globals__.os.getpid() }}",
    "{% for x in ().__class__.__base__.__subclasses__() %}",
    "</script><script>alert(1)</script>",
    "<!-- slot: leaflet -->",
    "<img src=x onerror=alert(1)>",
    "`${alert(1)}`",
    "=cmd|' /C calc'!A0",
    "B" * 300,
    "\u202eBH-1 \u05d0\u05d1\u05d2",
    "BH\u2028\u2029\x00",
)


class Elements(HTMLParser):
    """Start tags with attributes, and the text of every script."""

    def __init__(self, text: str) -> None:
        super().__init__(convert_charrefs=True)
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.scripts: list[tuple[dict[str, str | None], str]] = []
        self.title = ""
        self._inside = ""
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))
        self._inside = tag
        if tag == "script":
            self.scripts.append((dict(attrs), ""))

    def handle_endtag(self, tag: str) -> None:
        self._inside = ""

    def handle_data(self, data: str) -> None:
        if self._inside == "script":
            attributes, text = self.scripts[-1]
            self.scripts[-1] = (attributes, text + data)
        elif self._inside == "title":
            self.title += data


@pytest.fixture(scope="module")
def text(results: Results) -> str:
    return web_map.page(page_data(results))


def executable(text: str) -> Iterator[str]:
    for attributes, script in Elements(text).scripts:
        if attributes.get("type") != "application/json":
            yield script


def test_one_file_named_after_the_corridor(results: Results, tmp_path: Path) -> None:
    assert web_map.write(results, tmp_path) == [tmp_path / "otter_brook_bypass.html"]
    assert [path.name for path in tmp_path.iterdir()] == ["otter_brook_bypass.html"]


def test_the_same_results_give_the_same_bytes(tmp_path: Path) -> None:
    first, second = (web_map.write(sample_results(), tmp_path)[0].read_bytes() for _ in range(2))
    assert first == second


def test_the_page_holds_two_scripts_and_one_data_block(text: str) -> None:
    assert len(list(executable(text))) == web_map.EXECUTABLE_SCRIPTS == 2
    assert len(Elements(text).scripts) == 3


def test_the_policy_allows_exactly_the_scripts_that_are_there(text: str) -> None:
    policies = [a["content"] for tag, a in Elements(text).tags if a.get("http-equiv") == "Content-Security-Policy"]
    assert len(policies) == 1
    allowed = re.findall(r"'sha256-([^']+)'", policies[0] or "")
    digests = [base64.b64encode(hashlib.sha256(s.encode()).digest()).decode() for s in executable(text)]
    assert allowed == digests
    assert "default-src 'none'" in (policies[0] or "")
    assert "unsafe" not in (policies[0] or "").split("script-src")[1]


def test_nothing_is_fetched(text: str) -> None:
    for tag, attributes in Elements(text).tags:
        assert tag not in {"link", "iframe", "img", "object", "embed", "base"}
        assert not attributes.keys() & {"src", "srcset", "action", "formaction"}
        assert (attributes.get("href") or "#").startswith("#")
    style = text[text.index("<style>") : text.index("</style>")]
    assert "url(" not in style
    assert "@import" not in style


def test_no_element_carries_a_script_in_an_attribute(text: str) -> None:
    assert not [name for _, attributes in Elements(text).tags for name in attributes if name.startswith("on")]


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_names_stay_data(text: str, name: str) -> None:
    hostile = web_map.page(page_data(sample_results(name=name, first=name)))
    elements = Elements(hostile)
    assert [tag for tag, _ in elements.tags] == [tag for tag, _ in Elements(text).tags]
    assert list(executable(hostile)) == list(executable(text))
    assert elements.title == name.replace("\x00", "")
    data = next(script for attributes, script in elements.scripts if attributes.get("type") == "application/json")
    assert not set(data) & set("<>&\u2028\u2029")
    hostile.encode("utf-8")


def test_a_planted_third_script_is_refused(results: Results, monkeypatch: pytest.MonkeyPatch) -> None:
    planted = web_map._text("page.html").replace("</body>", "<script>planted()</script></body>")
    real = web_map._text
    monkeypatch.setattr(web_map, "_text", lambda name: planted if name == "page.html" else real(name))
    with pytest.raises(AssertionError, match="found 4"):
        web_map.page(page_data(results))


def test_leaflet_is_the_release_that_it_claims_to_be() -> None:
    """The digests were taken from the unchanged files of the npm package leaflet 1.9.4."""
    folder = WEB / "leaflet"
    sums = (folder / "SHA256SUMS").read_text("utf-8")
    for line in sums.splitlines():
        digest, name = line.split()
        assert hashlib.sha256((folder / name).read_bytes()).hexdigest() == digest
    assert f"Leaflet {web_map.LEAFLET}," in (folder / "leaflet.js").read_text("utf-8")[:200]
    assert "db49d009c841f5ca34a888c96511ae936fd9f5533e90d8b2c4d57596f4e5641a  leaflet.js" in sums


def test_the_license_of_leaflet_travels_with_the_page(text: str) -> None:
    assert "Redistributions of source code must retain the above copyright notice" in text


def test_every_file_of_the_page_is_in_it() -> None:
    names = {path.name for path in WEB.iterdir() if path.name.endswith((".js", ".css"))}
    assert names == {*web_map.SCRIPTS, *web_map.STYLES}


def test_scripts_never_write_html() -> None:
    banned = ("innerHTML", "outerHTML", "insertAdjacentHTML", "document.write", "eval(", "bindPopup", "bindTooltip")
    for name in web_map.SCRIPTS:
        source = (WEB / name).read_text("utf-8")
        assert not [word for word in banned if word in source], name


def test_a_corridor_of_eight_kilometers_stays_under_one_and_a_half_megabytes(tmp_path: Path) -> None:
    results = large_results()
    assert len(results.tables["profile_cells"]) == 19_200
    assert len(results.tables["samples"]) > 200
    assert web_map.write(results, tmp_path)[0].stat().st_size < 1_500_000
