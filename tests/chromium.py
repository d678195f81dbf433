"""A real headless browser with a page of `linkwright report` in it."""

from __future__ import annotations

import shutil
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Any

from required_tools import need_packages, need_programs

if TYPE_CHECKING:
    from selenium.webdriver import Chrome
    from selenium.webdriver.remote.webelement import WebElement

_SWITCHES = (
    "--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run",
    "--disable-background-networking", "--disable-component-update", "--disable-sync",
)  # fmt: skip


@contextmanager
def browser() -> Iterator[Browser]:
    """Debian's Chromium with a profile of its own."""
    need_packages("selenium")
    need_programs("chromium", "chromedriver")
    from selenium.webdriver import Chrome, ChromeOptions
    from selenium.webdriver.chrome.service import Service

    with tempfile.TemporaryDirectory(prefix="linkwright-") as profile:
        options = ChromeOptions()
        options.binary_location = shutil.which("chromium") or ""
        for switch in (*_SWITCHES, f"--user-data-dir={profile}"):
            options.add_argument(switch)
        options.set_capability("goog:loggingPrefs", {"browser": "ALL"})
        driver = Chrome(options=options, service=Service(shutil.which("chromedriver")))
        try:
            yield Browser(driver)
        finally:
            driver.quit()


class Browser:
    """What a reader does with the page."""

    def __init__(self, driver: Chrome) -> None:
        self._driver = driver

    def open(self, page: Path, width: int = 1280, height: int = 900) -> None:
        size = {"width": width, "height": height, "deviceScaleFactor": 1, "mobile": width < 600}
        self._driver.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", size)
        self._driver.get(page.as_uri())

    def run(self, script: str, *arguments: Any) -> Any:
        return self._driver.execute_script(script, *arguments)

    def complaints(self) -> list[dict[str, Any]]:
        """What the browser wrote to its console."""
        return list(self._driver.get_log("browser"))

    def find(self, identity: str) -> WebElement:
        return self._driver.find_element("id", identity)

    def text(self, identity: str) -> str:
        return self.find(identity).text

    def number(self, identity: str) -> float:
        """Of a readout or a field."""
        shown = self.find(identity)
        return float(shown.get_attribute("value") or shown.text)

    def press(self, *keys: str) -> None:
        """On whatever has the focus."""
        self._driver.switch_to.active_element.send_keys(*keys)

    def focus(self, identity: str) -> None:
        self.run("document.getElementById(arguments[0]).focus()", identity)

    def focused(self) -> str:
        """What tells the focused element: its id, or its value in a list of choices."""
        return str(self.run("return document.activeElement.id || document.activeElement.value"))

    def type(self, identity: str, text: str) -> None:
        """In place of what stood there."""
        self.focus(identity)
        self.run("document.activeElement.select()")
        self.press(text)
