"""The few things that the tests ask of a browser."""

import base64
import json
from pathlib import Path
from typing import Any

WIDE = (1280, 900)


class Browser:
    """A page as a person has it: in a window of some size, light or dark, with or without scripts."""

    def __init__(self, driver: Any) -> None:
        self.driver = driver

    def do(self, command: str, **values: Any) -> Any:
        """A command of the browser's own protocol."""
        return self.driver.execute_cdp_cmd(command, values)

    def open(self, page: Path, size: tuple[int, int] = WIDE, dark: bool = False, scripts: bool = True) -> None:
        """Load the page anew, with empty logs."""
        width, height = size
        self.do("Emulation.setDeviceMetricsOverride", width=width, height=height, deviceScaleFactor=1, mobile=False)
        scheme = {"name": "prefers-color-scheme", "value": "dark" if dark else "light"}
        self.do("Emulation.setEmulatedMedia", media="", features=[scheme])
        self.do("Emulation.setScriptExecutionDisabled", value=not scripts)
        for log in ("browser", "performance"):
            self.driver.get_log(log)
        self.driver.get(page.as_uri())

    def js(self, script: str, *values: Any) -> Any:
        """What a script returns; also on pages that run none of their own."""
        return self.driver.execute_script(script, *values)

    def all(self, css: str) -> list[Any]:
        """Elements."""
        return self.driver.find_elements("css selector", css)

    def one(self, css: str) -> Any:
        """The only element."""
        (found,) = self.all(css)
        return found

    def text(self, css: str) -> str:
        """The text that can be seen, blanks made plain."""
        return " ".join(self.one(css).text.replace("\u00a0", " ").split())

    def press(self, *keys: str) -> None:
        """Keys, wherever the focus is."""
        self.driver.switch_to.active_element.send_keys(*keys)

    def focused(self, expression: str) -> Any:
        """Something about the element that has the focus: `e` in a JavaScript expression."""
        return self.js(f"const e = document.activeElement; return {expression};")

    def type(self, css: str, words: str) -> None:
        """Replace what a field holds."""
        field = self.one(css)
        field.clear()
        field.send_keys(words)

    def complaints(self) -> list[str]:
        """What the console was told."""
        return [entry["message"] for entry in self.driver.get_log("browser")]

    def requests(self) -> list[str]:
        """Addresses that were asked for, the content of data: left out."""
        messages = [json.loads(entry["message"])["message"] for entry in self.driver.get_log("performance")]
        sent = [m["params"] for m in messages if m["method"] == "Network.requestWillBeSent"]
        return [params["request"]["url"][:200] for params in sent]

    def pdf(self) -> bytes:
        """The page as printed on A4."""
        printed = self.do("Page.printToPDF", paperWidth=8.27, paperHeight=11.69, preferCSSPageSize=True)
        return base64.b64decode(printed["data"])

    def faults(self, axe: str) -> list[str]:
        """What axe-core finds: rule and element."""
        self.js("if (!window.axe) { (0, eval)(arguments[0]); }", axe)
        run = (
            "const done = arguments[0];"
            "axe.run(document, {resultTypes: ['violations']})"
            ".then((found) => done(found.violations.flatMap("
            "(rule) => rule.nodes.map((node) => `${rule.id}: ${node.html.slice(0, 120)}`))))"
            ".catch((error) => done([`axe failed: ${error}`]));"
        )
        return self.driver.execute_async_script(run)
