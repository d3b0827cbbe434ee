"""A headless Chromium with the network cut, and what tests ask of it."""

from __future__ import annotations

import base64
import os
import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import pytest

_FLAGS = (
    "--headless=new",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--host-resolver-rules=MAP * ~NOTFOUND",
)


def _program(names: tuple[str, ...]) -> str | None:
    return next((path for path in map(shutil.which, names) if path), None)


CHROMIUM = _program(("chromium", "chromium-browser"))
DRIVER = _program(("chromedriver",))
AXE = os.environ.get("HUBDESIGN_AXE", "")

needs_chromium = pytest.mark.skipif(
    CHROMIUM is None or DRIVER is None, reason="chromium or chromedriver is not installed"
)
needs_axe = pytest.mark.skipif(
    not Path(AXE).is_file(), reason="HUBDESIGN_AXE does not point to an axe.min.js (npm package axe-core)"
)


class Chrome:
    """The browser; see the methods."""

    def __init__(self, driver: Any) -> None:
        self.driver = driver

    def show(self, page: Path, width: int = 1280, dark: bool = False, script: bool = True) -> None:
        """Open a page at a width, px, light or dark, with or without script."""
        self.command(
            "Emulation.setDeviceMetricsOverride",
            width=width,
            height=900,
            deviceScaleFactor=1,
            mobile=width < 500,
        )
        scheme = {"name": "prefers-color-scheme", "value": "dark" if dark else "light"}
        self.command("Emulation.setEmulatedMedia", features=[scheme])
        self.command("Emulation.setScriptExecutionDisabled", value=not script)
        self.driver.get_log("browser")
        self.driver.get(page.as_uri())

    def command(self, name: str, **parameters: Any) -> Any:
        """Give a command of the DevTools protocol."""
        return self.driver.execute_cdp_cmd(name, parameters)

    def run(self, script: str, *arguments: Any) -> Any:
        """Run a function body in the page."""
        return self.driver.execute_script(script, *arguments)

    def complaints(self) -> list[str]:
        """Return what the console holds: errors, refused content, failed requests."""
        return [entry["message"] for entry in self.driver.get_log("browser")]

    def click_at(self, x: float, y: float) -> None:
        """Press and release the mouse at a place of the window, px."""
        for kind in ("mouseMoved", "mousePressed", "mouseReleased"):
            self.command("Input.dispatchMouseEvent", type=kind, x=x, y=y, button="left", clickCount=1)

    def press(self, *keys: str) -> None:
        """Press keys where the focus is."""
        from selenium.webdriver.common.action_chains import ActionChains

        chain = ActionChains(self.driver)
        for key in keys:
            chain.send_keys(key)
        chain.perform()

    def print_pdf(self) -> bytes:
        """Return the page as printed on A4."""
        told = self.command("Page.printToPDF", preferCSSPageSize=True, printBackground=False)
        return base64.b64decode(told["data"])


@contextmanager
def started(profile: Path) -> Iterator[Chrome]:
    """Give a browser with a new, empty profile."""
    from selenium import webdriver
    from selenium.webdriver.chrome.service import Service

    options = webdriver.ChromeOptions()
    assert CHROMIUM is not None
    options.binary_location = CHROMIUM
    for flag in (*_FLAGS, f"--user-data-dir={profile}"):
        options.add_argument(flag)
    options.set_capability("goog:loggingPrefs", {"browser": "ALL"})
    driver = webdriver.Chrome(options=options, service=Service(DRIVER))
    try:
        yield Chrome(driver)
    finally:
        driver.quit()
