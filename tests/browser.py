"""A headless Chromium for tests, spoken to over two pipes (the DevTools protocol; no package).

A page is loaded from a local file, expressions are evaluated in it, and whatever the browser
complains of (errors, refused styles, refused fetches) is kept.
"""

from __future__ import annotations

import json
import os
import select
import shutil
import subprocess
import time
from pathlib import Path
from types import TracebackType
from typing import Any

import pytest

BROWSER = next(filter(None, map(shutil.which, ("chromium", "chromium-browser"))), None)
FLAGS = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
)
PATIENCE = 120.0
"""Seconds to wait for an answer; only a browser that hangs is met by it."""

needs_browser = pytest.mark.skipif(BROWSER is None, reason="no chromium to show the page with")


class Browser:
    """One browser with one page."""

    def __init__(self, profile: Path) -> None:
        self.complaints: list[str] = []
        self.requests: list[str] = []
        self._number, self._kept = 0, b""
        self._answers: dict[int, dict[str, Any]] = {}
        self._loaded = False
        to_read, self._write = os.pipe()
        self._read, to_write = os.pipe()
        words = [str(BROWSER), *FLAGS, f"--user-data-dir={profile}", "--remote-debugging-pipe"]
        # The browser reads commands from 3 and writes answers to 4, whatever we have there.
        shell = f'exec 3<&{to_read} 4>&{to_write}; exec "$@"'
        self._process = subprocess.Popen(
            ["bash", "-c", shell, "bash", *words],
            pass_fds=(to_read, to_write),
            stdin=subprocess.DEVNULL,
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )
        os.close(to_read)
        os.close(to_write)
        self._session: str | None = None
        target = self.send("Target.createTarget", url="about:blank")["targetId"]
        self._session = self.send("Target.attachToTarget", targetId=target, flatten=True)[
            "sessionId"
        ]
        for domain in ("Page", "Runtime", "Log", "Network"):
            self.send(f"{domain}.enable")

    def __enter__(self) -> Browser:
        return self

    def __exit__(
        self, _kind: type[BaseException] | None, _e: BaseException | None, _t: TracebackType | None
    ) -> None:
        self._process.terminate()
        self._process.wait(PATIENCE)
        os.close(self._read)
        os.close(self._write)

    def open(self, page: Path) -> None:
        """Show a local file and wait until it has been loaded."""
        self._loaded = False
        self.send("Page.navigate", url=page.resolve().as_uri())
        self._until(lambda: self._loaded)

    def ask(self, expression: str) -> Any:
        """Return the JSON-like value of a JavaScript expression in the page."""
        found = self.send("Runtime.evaluate", expression=expression, returnByValue=True)
        assert "exceptionDetails" not in found, found["exceptionDetails"]
        return found["result"].get("value")

    def send(self, method: str, **parameters: Any) -> dict[str, Any]:
        """Send one command and return its result."""
        self._number += 1
        number = self._number
        message: dict[str, Any] = {"id": number, "method": method, "params": parameters}
        if self._session is not None:
            message["sessionId"] = self._session
        content = json.dumps(message).encode() + b"\0"
        while content:
            content = content[os.write(self._write, content) :]
        self._until(lambda: number in self._answers)
        answer = self._answers.pop(number)
        assert "error" not in answer, answer["error"]
        result: dict[str, Any] = answer["result"]
        return result

    def _until(self, done: Any) -> None:
        end = time.monotonic() + PATIENCE
        while not done():
            ready, _, _ = select.select([self._read], [], [], max(0.0, end - time.monotonic()))
            assert ready, "the browser does not answer"
            got = os.read(self._read, 1 << 16)
            assert got, "the browser has gone"
            *whole, self._kept = (self._kept + got).split(b"\0")
            for each in whole:
                self._take(json.loads(each))

    def _take(self, message: dict[str, Any]) -> None:
        if "id" in message:
            self._answers[message["id"]] = message
            return
        method, details = message["method"], message["params"]
        if method == "Page.loadEventFired":
            self._loaded = True
        elif method == "Network.requestWillBeSent":
            self.requests.append(details["request"]["url"])
        elif method == "Runtime.exceptionThrown":
            self.complaints.append(str(details["exceptionDetails"]))
        elif method == "Log.entryAdded":
            self.complaints.append(details["entry"]["text"])
        elif method == "Runtime.consoleAPICalled":
            self.complaints.append(f"console: {details['args']}")
