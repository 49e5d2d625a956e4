"""A real browser on a real server; what the browser complains about fails the test."""

import shutil
from collections.abc import Iterator

import pytest
from playwright.sync_api import Browser, Page, sync_playwright

from tests.service.conftest import Server, server

__all__ = ["server"]

CHROMIUM = next(filter(None, map(shutil.which, ("chromium", "chromium-browser", "google-chrome"))), None)
QUIET = ["--no-sandbox", "--disable-gpu", "--disable-background-networking", "--no-first-run"]


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    """Chromium without a window, one for each file: its event loop must not run beside other files' tests."""
    if CHROMIUM is None:
        pytest.fail("no chromium on the PATH: on Debian, install the package chromium")
    with sync_playwright() as playwright:
        running = playwright.chromium.launch(executable_path=CHROMIUM, args=QUIET)
        yield running
        running.close()


@pytest.fixture
def page(browser: Browser, server: Server) -> Iterator[Page]:
    """A fresh tab on the bench page, ready; errors and refused resources fail the test at its end."""
    opened = browser.new_page(viewport={"width": 1100, "height": 900})
    complaints: list[str] = []
    opened.on("pageerror", lambda error: complaints.append(str(error)))
    opened.on("console", lambda message: complaints.append(message.text) if message.type == "error" else None)
    opened.goto(server.url)
    settled(opened)
    yield opened
    opened.close()
    expected = [text for text in complaints if "422" not in text and "404" not in text]
    assert expected == []


def settled(page: Page) -> None:
    """Wait until the page has asked and shown everything."""
    page.wait_for_selector("#sources table")
    page.wait_for_selector("body:not(.waiting)")
