"""A real browser for tests: Chromium, headless, by the W3C WebDriver protocol over plain HTTP.

Only the standard library is used; the protocol is W3C Recommendation WebDriver (2018), with the driver's own
additions for print media and console entries.
"""

from __future__ import annotations

import base64
import json
import os
import shutil
import socket
import subprocess
import tempfile
import time
import urllib.error
import urllib.request
from pathlib import Path
from types import TracebackType
from typing import Any

CHROMIUM = next((p for p in map(shutil.which, ("chromium", "chromium-browser")) if p), None)
DRIVER = shutil.which("chromedriver")
KEYS = {
    "right": "\ue014",
    "left": "\ue012",
    "up": "\ue013",
    "down": "\ue015",
    "home": "\ue011",
    "end": "\ue010",
}


def missing() -> str:
    """Why there is no browser here; empty where there is one."""
    gone = [name for name, path in (("chromium", CHROMIUM), ("chromedriver", DRIVER)) if not path]
    return f"{' and '.join(gone)} not installed" if gone else ""


class Browser:
    """One window. width, height : CSS pixels. touch : whether it pretends to be a phone."""

    def __init__(self, width: int, height: int, *, touch: bool = False) -> None:
        with socket.socket() as free:
            free.bind(("127.0.0.1", 0))
            port = free.getsockname()[1]
        # what the browser leaves behind goes with this folder
        self._folder = tempfile.TemporaryDirectory(ignore_cleanup_errors=True)
        self._server = subprocess.Popen(
            [str(DRIVER), f"--port={port}"],
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
            env={**os.environ, "TMPDIR": self._folder.name},
        )
        self._root = f"http://127.0.0.1:{port}"
        options: dict[str, Any] = {
            "binary": CHROMIUM,
            "args": [
                "--headless=new", "--no-sandbox", "--disable-gpu", "--disable-dev-shm-usage",
                # it asks its maker's servers for news otherwise, and waits where there is no network
                "--no-first-run", "--disable-background-networking", "--disable-component-update",
                "--disable-sync", "--disable-quic",
                f"--window-size={width},{height}",
            ],
        }  # fmt: skip
        if touch:
            metrics = {"width": width, "height": height, "pixelRatio": 2.0, "touch": True}
            options["mobileEmulation"] = {"deviceMetrics": metrics}
        always = {
            "browserName": "chrome",
            "goog:chromeOptions": options,
            "goog:loggingPrefs": {"browser": "ALL"},
        }
        self._wait_for_server()
        made = self._call("POST", "/session", {"capabilities": {"alwaysMatch": always}})
        self._session = f"/session/{made['sessionId']}"

    def __enter__(self) -> Browser:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        try:
            self._call("DELETE", self._session)
        finally:
            self._server.terminate()
            self._server.wait(timeout=20)
            self._folder.cleanup()

    def _wait_for_server(self) -> None:
        for _ in range(200):
            try:
                if self._call("GET", "/status").get("ready"):
                    return
            except (urllib.error.URLError, ConnectionError):
                pass
            time.sleep(0.1)
        raise TimeoutError("the browser's driver does not answer")

    def _call(self, method: str, path: str, body: dict[str, Any] | None = None) -> Any:
        data = None if body is None else json.dumps(body).encode()
        request = urllib.request.Request(self._root + path, data=data, method=method)
        request.add_header("Content-Type", "application/json")
        try:
            with urllib.request.urlopen(request, timeout=60) as answer:
                return json.load(answer)["value"]
        except urllib.error.HTTPError as error:
            raise RuntimeError(error.read().decode()[:400]) from error

    def open(self, path: Path) -> None:
        """Open a file."""
        self._call("POST", f"{self._session}/url", {"url": path.resolve().as_uri()})

    def run(self, script: str, *arguments: Any) -> Any:
        """Run a script in the page and return what it returns."""
        body = {"script": script, "args": list(arguments)}
        return self._call("POST", f"{self._session}/execute/sync", body)

    def console(self) -> list[str]:
        """Every entry of the console since the last call."""
        entries = self._call("POST", f"{self._session}/se/log", {"type": "browser"})
        return [f"{entry['level']}: {entry['message']}" for entry in entries]

    def point(self, x: float, y: float, *, touch: bool = False) -> None:
        """Move the mouse to a place of the window, or touch it."""
        kind = "touch" if touch else "mouse"
        steps: list[dict[str, Any]] = [
            {"type": "pointerMove", "duration": 0, "x": round(x), "y": round(y)}
        ]
        if touch:
            steps += [{"type": "pointerDown", "button": 0}, {"type": "pointerUp", "button": 0}]
        source = {
            "type": "pointer",
            "id": kind,
            "parameters": {"pointerType": kind},
            "actions": steps,
        }
        self._call("POST", f"{self._session}/actions", {"actions": [source]})

    def drag(self, start: tuple[float, float], end: tuple[float, float]) -> None:
        """Draw a finger from one place of the window to another, and leave it there."""
        steps: list[dict[str, Any]] = [
            {"type": "pointerMove", "duration": 0, "x": round(start[0]), "y": round(start[1])},
            {"type": "pointerDown", "button": 0},
            {"type": "pointerMove", "duration": 200, "x": round(end[0]), "y": round(end[1])},
        ]
        touch = {"pointerType": "touch"}
        source = {"type": "pointer", "id": "touch", "parameters": touch, "actions": steps}
        self._call("POST", f"{self._session}/actions", {"actions": [source]})
        self._call("DELETE", f"{self._session}/actions")

    def press(self, *names: str) -> None:
        """Press keys, one after another."""
        steps = []
        for name in names:
            key = KEYS.get(name, name)
            steps += [{"type": "keyDown", "value": key}, {"type": "keyUp", "value": key}]
        source = {"type": "key", "id": "keys", "actions": steps}
        self._call("POST", f"{self._session}/actions", {"actions": [source]})

    def picture(self, path: Path) -> None:
        """Save what the window shows."""
        path.write_bytes(base64.b64decode(self._call("GET", f"{self._session}/screenshot")))

    def whole_picture(self, path: Path) -> None:
        """Save the whole page, as high as it is."""
        shot = self.command(
            "Page.captureScreenshot",
            {"format": "png", "captureBeyondViewport": True, "fromSurface": True},
        )
        path.write_bytes(base64.b64decode(shot["data"]))

    def paper(self) -> bytes:
        """Print on A4 (cm) and return the PDF."""
        body = {"page": {"width": 21.0, "height": 29.7}, "shrinkToFit": False, "background": True}
        return base64.b64decode(self._call("POST", f"{self._session}/print", body))

    def command(self, name: str, parameters: dict[str, Any]) -> Any:
        """Send one command of the browser's own protocol."""
        body = {"cmd": name, "params": parameters}
        return self._call("POST", f"{self._session}/goog/cdp/execute", body)
