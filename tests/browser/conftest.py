"""A headless Chromium with the network cut, and the pages that the tests open in it."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest

from geomap.exports import web_map
from geomap.results import Results
from tests.unit.exports.sample import sample_results

BROWSERS = ("chromium", "chromium-browser", "google-chrome")
ARTIFACTS = Path(__file__).parents[2] / ".artifacts" / "web_map"
WIDTHS = {1440: 900, 1024: 768, 390: 844}

Write = Callable[[Results], Path]


class Opened:
    """One open page, with everything that it asked for and complained about."""

    def __init__(self, page: Any, path: Path) -> None:
        self.page = page
        self.requests: list[str] = []
        self.complaints: list[str] = []
        self.dialogs: list[str] = []
        page.on("request", lambda r: self.requests.append(r.url) if not r.url.startswith("file:") else None)
        page.on("console", lambda m: self.complaints.append(m.text) if m.type in ("error", "warning") else None)
        page.on("pageerror", lambda error: self.complaints.append(str(error)))
        page.on("dialog", self._dismiss)
        page.goto(path.as_uri())
        page.wait_for_selector("html[data-ready]", state="attached")

    def _dismiss(self, dialog: Any) -> None:
        self.dialogs.append(dialog.message)
        dialog.dismiss()

    def settle(self) -> None:
        """Wait until what was asked for is drawn."""
        self.page.evaluate("() => new Promise((f) => requestAnimationFrame(() => requestAnimationFrame(f)))")

    def box(self, selector: str) -> dict[str, float]:
        """Return the box of an element in the window."""
        box: dict[str, float] = self.page.locator(selector).bounding_box()
        return box

    def point(self, x: float, y: float = 0.4) -> None:
        """Move the pointer to a place in the profile, in shares of its canvas."""
        box = self.box("#profile")
        self.page.mouse.move(box["x"] + x * box["width"], box["y"] + y * box["height"])
        self.settle()

    def go_to(self, text: str) -> None:
        """Type into the box and press Enter."""
        self.page.fill("#go-to-place", text)
        self.page.press("#go-to-place", "Enter")
        self.settle()

    def press(self, key: str, times: int = 1) -> None:
        """Press a key on the profile."""
        self.page.focus("#profile")
        for _ in range(times):
            self.page.keyboard.press(key)
            self.settle()

    @property
    def distance(self) -> float:
        """Distance that the profile stands at."""
        return float(self.page.get_attribute("#profile", "aria-valuenow"))

    @property
    def on_plan(self) -> float | None:
        """Distance that the plan marks, or None."""
        found = self.page.get_attribute(".plan-cursor", "data-distance")
        return None if found is None else float(found)

    def text(self, selector: str) -> str:
        """Return the visible text of an element, its spaces made single."""
        return " ".join(self.page.locator(selector).inner_text().split())

    def shot(self, name: str) -> None:
        """Keep a picture beside the repository's other artifacts, which git does not track."""
        ARTIFACTS.mkdir(parents=True, exist_ok=True)
        self.page.screenshot(path=ARTIFACTS / f"{name}.png")


@pytest.fixture(scope="session")
def chromium() -> Iterator[Any]:
    """Start Chromium once; skip where it or Playwright is missing."""
    playwright = pytest.importorskip("playwright.sync_api")
    program = next((found for name in BROWSERS if (found := shutil.which(name))), None)
    if program is None:
        pytest.skip("no Chromium on this machine")
    with playwright.sync_playwright() as driver:
        browser = driver.chromium.launch(executable_path=program, args=["--no-sandbox", "--disable-gpu"])
        yield browser
        browser.close()


@pytest.fixture(scope="session")
def results() -> Results:
    """Return the invented corridor; its tables are never changed by a test."""
    return sample_results()


@pytest.fixture(scope="session")
def written(tmp_path_factory: pytest.TempPathFactory) -> Write:
    """Write the page of some results and return its path."""
    return lambda results: web_map.write(results, tmp_path_factory.mktemp("page"))[0]


@pytest.fixture
def open_page(chromium: Any) -> Iterator[Callable[..., Opened]]:
    """Open a file with the network cut."""
    contexts = []

    def opened(path: Path, width: int = 1440, **options: Any) -> Opened:
        context = chromium.new_context(viewport={"width": width, "height": WIDTHS[width]}, offline=True, **options)
        contexts.append(context)
        return Opened(context.new_page(), path)

    yield opened
    for context in contexts:
        context.close()
