"""Headless Chromium, driven over its own pipe: what a reader of a page would see."""

from __future__ import annotations

import base64
import fcntl
import itertools
import json
import os
import select
import shutil
import subprocess
import time
from pathlib import Path
from typing import Any, Self

PATH = shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")
FLAGS = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--disable-extensions",
    "--disable-default-apps",
    "--remote-debugging-pipe",
)
PATIENCE = 60.0


class Browser:
    """One browser with one page; what the page asks for and complains of is kept."""

    def __init__(self, profile: Path):
        assert PATH is not None
        read, self._out = os.pipe()
        self._in, write = os.pipe()

        def give() -> None:
            # The browser reads commands on descriptor 3 and answers on 4: first both move out of the way.
            moved = [fcntl.fcntl(end, fcntl.F_DUPFD, 10) for end in (read, write)]
            os.dup2(moved[0], 3)
            os.dup2(moved[1], 4)

        command = [PATH, *FLAGS, f"--user-data-dir={profile}", "about:blank"]
        quiet = subprocess.DEVNULL
        self._process = subprocess.Popen(
            command, stdin=quiet, stdout=quiet, stderr=quiet, close_fds=False, preexec_fn=give
        )
        os.close(read)
        os.close(write)
        self._numbers = itertools.count(1)
        self._rest = b""
        self._session: str | None = None
        self.requests: list[str] = []
        self.complaints: list[str] = []
        self._loaded = False
        pages = self.call("Target.getTargets")["targetInfos"]
        page = next(t["targetId"] for t in pages if t["type"] == "page")
        self._session = self.call("Target.attachToTarget", targetId=page, flatten=True)["sessionId"]
        for domain in ("Page", "Runtime", "Log", "Network"):
            self.call(f"{domain}.enable")

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *_: object) -> None:
        self._process.kill()
        self._process.wait()
        os.close(self._in)
        os.close(self._out)

    def open(self, page: Path, width: int, height: int) -> None:
        """Load a page in a window of a size and wait until all of it is there."""
        self.requests, self.complaints, self._loaded = [], [], False
        self.call(
            "Emulation.setDeviceMetricsOverride",
            width=width,
            height=height,
            deviceScaleFactor=1,
            mobile=width < 600,
        )
        self.call("Page.navigate", url=page.as_uri())
        while not self._loaded:
            self._take()
        # A request that a page makes on being drawn comes after its load event.
        self.ask("new Promise(done => requestAnimationFrame(() => setTimeout(done, 200)))")

    def ask(self, expression: str) -> Any:
        """Return the value of an expression in the page."""
        answer = self.call("Runtime.evaluate", expression=expression, awaitPromise=True, returnByValue=True)
        return answer["result"].get("value")

    def paper(self, into: Path) -> None:
        """Print the page as its own style sheet asks."""
        answer = self.call("Page.printToPDF", preferCSSPageSize=True, printBackground=True)
        into.write_bytes(base64.b64decode(answer["data"]))

    def picture(self, into: Path) -> None:
        """Take a picture of the window."""
        into.write_bytes(base64.b64decode(self.call("Page.captureScreenshot")["data"]))

    def call(self, method: str, **params: Any) -> dict[str, Any]:
        """Send a command and wait for its answer."""
        number = next(self._numbers)
        message = {"id": number, "method": method, "params": params}
        if self._session is not None:
            message["sessionId"] = self._session
        os.write(self._out, json.dumps(message).encode() + b"\0")
        while True:
            answer = self._take()
            if answer.get("id") == number:
                assert "error" not in answer, answer["error"]
                return answer["result"]

    def _take(self) -> dict[str, Any]:
        """Read one message and keep what it tells of the page."""
        end = time.monotonic() + PATIENCE
        while b"\0" not in self._rest:
            ready, _, _ = select.select([self._in], [], [], max(0.0, end - time.monotonic()))
            assert ready, "the browser does not answer"
            piece = os.read(self._in, 1 << 20)
            assert piece, "the browser has ended"
            self._rest += piece
        line, self._rest = self._rest.split(b"\0", 1)
        message = json.loads(line)
        params = message.get("params", {})
        match message.get("method"):
            case "Page.loadEventFired":
                self._loaded = True
            case "Network.requestWillBeSent":
                self.requests.append(params["request"]["url"])
            case "Runtime.exceptionThrown":
                self.complaints.append(params["exceptionDetails"]["text"])
            case "Runtime.consoleAPICalled" if params["type"] in ("error", "warning", "assert"):
                self.complaints.append(str([a.get("value") for a in params["args"]]))
            case "Log.entryAdded" if params["entry"]["level"] in ("error", "warning"):
                self.complaints.append(params["entry"]["text"])
        return message


def outside(requests: list[str], page: Path) -> list[str]:
    """Return the requests that went beyond a page and what lies within it."""
    return [url for url in requests if url != page.as_uri() and not url.startswith("data:")]
