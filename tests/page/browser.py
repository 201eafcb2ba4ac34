"""A headless Chromium for the tests of the page."""

from __future__ import annotations

import os
import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
from playwright.sync_api import Browser, Page, sync_playwright

CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser")

needs_chromium = pytest.mark.skipif(
    CHROMIUM is None and os.environ.get("CI") != "true",
    reason="needs Chromium: sudo apt-get install chromium",
)

_FLAGS = ("--no-sandbox", "--autoplay-policy=no-user-gesture-required")


@contextmanager
def chromium() -> Iterator[Browser]:
    """A running browser."""
    assert CHROMIUM is not None, "Chromium is missing: apt-get install chromium"
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=CHROMIUM, args=list(_FLAGS))
        yield browser
        browser.close()


def opened(browser: Browser, path: Path, address: str = "", **context: object) -> Page:
    """A page opened from disk; its errors, console messages and requests are kept in lists."""
    made = browser.new_context(**context).new_page()  # type: ignore[arg-type]
    made.faults = []  # type: ignore[attr-defined]
    made.asked = []  # type: ignore[attr-defined]
    made.on("console", lambda message: made.faults.append(message.text))  # type: ignore[attr-defined]
    made.on("pageerror", lambda error: made.faults.append(str(error)))  # type: ignore[attr-defined]
    made.on("request", lambda request: made.asked.append(request.url))  # type: ignore[attr-defined]
    made.goto(path.as_uri() + address)
    return made


def until(page: Page, expression: str, seconds: float = 20.0) -> None:
    """Wait for an expression of the page's script to be true."""
    # The page's policy forbids the waiting that evaluates text inside of it.
    for _ in range(round(seconds / 0.05)):
        if page.evaluate(expression):
            return
        page.wait_for_timeout(50)
    raise AssertionError(f"never came true: {expression}")
