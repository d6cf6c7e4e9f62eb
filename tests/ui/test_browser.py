"""Journeys in a real browser: what a planner does, with no error told and no request to anywhere else."""

from __future__ import annotations

import os
import socket
import subprocess
import sys
import time
import urllib.request
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

ROOT = Path(__file__).resolve().parents[2]
CHROMIUM = Path("/usr/bin/chromium")
FLAGS = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-dev-shm-usage",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
]
pytestmark = [
    pytest.mark.browser,
    pytest.mark.skipif(
        not CHROMIUM.exists() and not os.environ.get("CI"), reason="no /usr/bin/chromium here: apt-get install chromium"
    ),
]


@pytest.fixture(scope="module")
def server(tmp_path_factory: pytest.TempPathFactory) -> Iterator[str]:
    with socket.socket() as free:
        free.bind(("127.0.0.1", 0))
        port = free.getsockname()[1]
    environment = {**os.environ, "SPOOLWRIGHT_HOME": str(tmp_path_factory.mktemp("home"))}
    command = [sys.executable, "-m", "planner.cli", "serve", str(ROOT / "demo_fleet"), "--port", str(port)]
    process = subprocess.Popen(command, env=environment, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    address = f"http://localhost:{port}"
    for _ in range(240):
        try:
            with urllib.request.urlopen(f"{address}/_stcore/health", timeout=2):
                break
        except OSError:
            time.sleep(0.25)
    else:
        process.terminate()
        pytest.fail("the screen's server did not start within a minute")
    yield address
    process.terminate()
    process.wait(timeout=20)


@pytest.fixture(scope="module")
def browser() -> Iterator[Any]:
    from playwright.sync_api import sync_playwright

    with sync_playwright() as play:
        opened = play.chromium.launch(executable_path=str(CHROMIUM), args=FLAGS)
        yield opened
        opened.close()


class Watched:
    """A page that remembers what went wrong and where it asked."""

    def __init__(self, browser: Any, address: str, *, dark: bool = False) -> None:
        self.context = browser.new_context(
            viewport={"width": 1440, "height": 1000}, color_scheme="dark" if dark else "light"
        )
        self.page = self.context.new_page()
        self.errors: list[str] = []
        self.foreign: list[str] = []
        self.page.on("console", self._told)
        self.page.on("pageerror", lambda e: self.errors.append(str(e)))
        self.page.on("request", lambda r: self._asked(r.url, address))

    def _told(self, message: Any) -> None:
        # opened at a page's own address, the framework first looks for its server below that address and then finds it
        # at the root; the browser logs that look as a 404 of /_stcore/
        probing = "404" in message.text and "/_stcore/" in str(message.location)
        if message.type == "error" and not probing:
            self.errors.append(f"{message.text} {message.location}")

    def _asked(self, url: str, address: str) -> None:
        own = (address, address.replace("http", "ws"), "data:", "blob:")
        if not url.startswith(own):
            self.foreign.append(url)

    def close(self) -> None:
        self.context.close()
        assert self.foreign == []
        assert self.errors == []


@pytest.mark.parametrize("dark", [False, True])
def test_the_fleet_opens_with_the_weakest_first(server: str, browser: Any, dark: bool) -> None:
    watched = Watched(browser, server, dark=dark)
    page = watched.page
    page.goto(server)
    page.get_by_role("heading", name="Fleet", exact=True).wait_for(timeout=60_000)
    page.get_by_text("Engines on the wing", exact=True).first.wait_for()
    page.get_by_test_id("stDataFrame").first.wait_for()
    page.locator("canvas, svg.marks").first.wait_for()
    assert page.get_by_text("DEMO: invented data").count() >= 1
    assert page.get_by_text("Planning aid only").count() >= 1
    _shot(page, f"fleet-{'dark' if dark else 'light'}")
    watched.close()


def test_a_comparison_runs_and_a_reload_finds_it(server: str, browser: Any) -> None:
    watched = Watched(browser, server)
    page = watched.page
    page.goto(f"{server}/strategies")
    page.get_by_role("heading", name="Strategies", exact=True).wait_for(timeout=60_000)
    runs = page.get_by_label("Runs (0: until the interval is narrow)")
    runs.fill("4")
    runs.press("Tab")
    page.get_by_role("button", name="Run", exact=True).click()
    page.get_by_role("tab", name="Money").wait_for(timeout=240_000)
    assert "study=" in page.url
    page.get_by_text("USD", exact=False).first.wait_for()
    _shot(page, "strategies-money")
    page.get_by_role("tab", name="Difference").click()
    page.get_by_text("Paired runs", exact=False).first.wait_for()
    _shot(page, "strategies-difference")
    page.reload()
    page.get_by_role("tab", name="Money").wait_for(timeout=60_000)
    watched.close()


def test_a_study_can_be_cancelled_and_keeps_what_is_done(server: str, browser: Any) -> None:
    watched = Watched(browser, server)
    page = watched.page
    page.goto(f"{server}/strategies")
    runs = page.get_by_label("Runs (0: until the interval is narrow)")
    runs.wait_for(timeout=60_000)
    runs.fill("1500")
    runs.press("Tab")
    page.get_by_role("button", name="Run", exact=True).click()
    cancel = page.get_by_role("button", name="Cancel and keep what is done")
    cancel.wait_for(timeout=60_000)
    page.wait_for_timeout(3000)
    cancel.click()
    page.get_by_role("button", name="Download everything as JSON").wait_for(timeout=60_000)
    watched.close()


def test_life_left_shows_what_is_soon_and_who_is_hit(server: str, browser: Any) -> None:
    watched = Watched(browser, server)
    page = watched.page
    page.goto(f"{server}/life")
    page.get_by_role("heading", name="Life left", exact=True).wait_for(timeout=60_000)
    page.get_by_test_id("stDataFrame").first.wait_for()
    page.locator("canvas, svg.marks").first.wait_for()
    page.get_by_role("tab", name="Directives").click()
    page.get_by_text("Value of the life lost, USD").first.wait_for()
    page.get_by_role("tab", name="Owners and places").click()
    page.get_by_text("by when they must go back").first.wait_for()
    page.get_by_role("tab", name="Records").click()
    page.get_by_text("What the rules find in the records").first.wait_for()
    _shot(page, "life")
    watched.close()


def _shot(page: Any, name: str) -> None:
    """Leave a picture where SPOOLWRIGHT_SHOTS says, for a person to look at."""
    folder = os.environ.get("SPOOLWRIGHT_SHOTS")
    if folder:
        page.wait_for_timeout(1500)
        page.set_viewport_size({"width": 1440, "height": 2600})
        page.wait_for_timeout(800)
        page.screenshot(path=str(Path(folder) / f"{name}.png"), full_page=True)
