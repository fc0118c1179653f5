"""A headless Chromium, spoken to over a pipe in its DevTools protocol: nothing but the standard library."""

from __future__ import annotations

import base64
import fcntl
import json
import os
import select
import shutil
import subprocess
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

NAMES = ("chromium", "chromium-browser")
FLAGS = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--remote-debugging-pipe",
)
PATIENCE = 60.0  # s that one answer may take


def find_chromium() -> str:
    """Return the program; without one the test fails, and says what to do."""
    for name in NAMES:
        if path := shutil.which(name):
            return path
    pytest.fail("no Chromium: install chromium, on Debian by apt-get install -y chromium", pytrace=False)


class Chromium:
    """A browser with one page; ``events`` holds everything that it told."""

    def __init__(self, folder: Path) -> None:
        commands, self._write = _high_pipe()
        self._read, answers = _high_pipe()

        def at_3_and_4() -> None:  # where the browser looks for its pipe
            os.dup2(commands, 3)
            os.dup2(answers, 4)

        with (folder / "chromium.log").open("wb") as log:
            self._process = subprocess.Popen(
                [find_chromium(), *FLAGS, f"--user-data-dir={folder / 'profile'}", "about:blank"],
                stdout=log,
                stderr=log,
                close_fds=False,
                preexec_fn=at_3_and_4,
            )
        os.close(commands)
        os.close(answers)
        self._rest, self._count, self.events = b"", 0, list[dict[str, Any]]()
        target = self.send("Target.createTarget", url="about:blank")["targetId"]
        self._session = self.send("Target.attachToTarget", targetId=target, flatten=True)["sessionId"]
        for domain in ("Page", "Runtime", "Log", "Network"):
            self.send(f"{domain}.enable")

    def send(self, method: str, **parameters: Any) -> dict[str, Any]:
        """Return the answer to one command."""
        self._count += 1
        message = {"id": self._count, "method": method, "params": parameters}
        if session := getattr(self, "_session", None):
            message["sessionId"] = session
        os.write(self._write, json.dumps(message).encode() + b"\0")
        answer = self._wait(lambda got: got.get("id") == message["id"])
        assert "error" not in answer, answer
        return dict(answer["result"])

    def _wait(self, wanted: Callable[[dict[str, Any]], bool]) -> dict[str, Any]:
        end = time.monotonic() + PATIENCE
        while True:
            while b"\0" in self._rest:
                own, self._rest = self._rest.split(b"\0", 1)
                got = json.loads(own)
                if "id" not in got:
                    self.events.append(got)
                if wanted(got):
                    return dict(got)
            ready, _, _ = select.select([self._read], [], [], max(0.0, end - time.monotonic()))
            assert ready, "Chromium does not answer"
            more = os.read(self._read, 1 << 20)
            assert more, "Chromium has ended"
            self._rest += more

    def open(self, path: Path) -> None:
        """Open a file and wait until it is loaded; ``events`` are those since."""
        self.events.clear()
        self.send("Page.navigate", url=path.as_uri())
        loaded = any(event["method"] == "Page.loadEventFired" for event in self.events)
        if not loaded:
            self._wait(lambda got: got.get("method") == "Page.loadEventFired")

    def sized(self, width: int, height: int = 900) -> None:
        """Make the window so large [px]."""
        self.send(
            "Emulation.setDeviceMetricsOverride",
            width=width,
            height=height,
            deviceScaleFactor=1,
            mobile=False,
        )

    def media(self, kind: str = "", scheme: str = "light") -> None:
        """Show the page as on this medium, in this colour scheme."""
        features = [{"name": "prefers-color-scheme", "value": scheme}]
        self.send("Emulation.setEmulatedMedia", media=kind, features=features)

    def value(self, expression: str) -> Any:
        """Return what an expression of the page is."""
        return self.send("Runtime.evaluate", expression=expression, returnByValue=True)["result"].get("value")

    def picture(self) -> bytes:
        """Return the window as PNG."""
        return base64.b64decode(self.send("Page.captureScreenshot", format="png")["data"])

    def printed(self, width: float, height: float) -> bytes:
        """Return the page as PDF, on paper of this size [inch]."""
        answer = self.send(
            "Page.printToPDF",
            paperWidth=width,
            paperHeight=height,
            printBackground=True,
            preferCSSPageSize=True,
        )
        return base64.b64decode(answer["data"])

    def close(self) -> None:
        """End the browser."""
        self._session = None
        os.write(self._write, json.dumps({"id": 0, "method": "Browser.close"}).encode() + b"\0")
        try:
            self._process.wait(20.0)
        except subprocess.TimeoutExpired:
            self._process.kill()
            self._process.wait(20.0)
        os.close(self._write)
        os.close(self._read)


def _high_pipe() -> tuple[int, int]:
    """Return a pipe whose ends are not 3 or 4."""
    ends = os.pipe()
    high = [fcntl.fcntl(end, fcntl.F_DUPFD_CLOEXEC, 20) for end in ends]
    for end in ends:
        os.close(end)
    return high[0], high[1]
