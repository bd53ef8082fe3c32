"""A headless browser, driven through the two pipes that Chromium offers for it: messages of JSON, ended by a zero byte.

The browser has its own profile in a folder that is given, and no network but what a page asks for, which is recorded.
"""

from __future__ import annotations

import base64
import fcntl
import json
import os
import select
import shutil
import signal
import time
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import Any

NAMES = ("chromium", "chromium-browser", "google-chrome")
PATIENCE = 120.0
"""Seconds to wait for an answer: a browser that hangs fails the test, and does not hang it too."""

FLAGS = (
    "--headless=new",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-dev-shm-usage",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-default-apps",
    "--no-first-run",
    "--hide-scrollbars",
    "--remote-debugging-pipe",
)


def chromium() -> str:
    """The browser's path. Raises AssertionError if there is none: these tests are of nothing without it."""
    found = next((path for name in NAMES if (path := shutil.which(name))), None)
    assert found is not None, "no chromium on PATH"
    return found


class Browser:
    """A running browser and the one page in it.

    requests  addresses of all that the page asked for, but the file itself
    dialogs   texts of the dialogs that scripts opened
    """

    def __init__(self, profile: Path) -> None:
        to_browser, self._write = os.pipe()
        self._read, from_browser = os.pipe()
        # Out of the way of the numbers that the browser expects them under.
        ends = [fcntl.fcntl(end, fcntl.F_DUPFD_CLOEXEC, 10) for end in (to_browser, from_browser)]
        null = os.open(os.devnull, os.O_RDWR)
        actions = [(os.POSIX_SPAWN_DUP2, ends[0], 3), (os.POSIX_SPAWN_DUP2, ends[1], 4)]
        actions += [(os.POSIX_SPAWN_DUP2, null, stream) for stream in (0, 1, 2)]
        command = [chromium(), *FLAGS, f"--user-data-dir={profile}", "about:blank"]
        self._process = os.posix_spawn(command[0], command, os.environ, file_actions=actions, setpgroup=0)
        for end in (*ends, to_browser, from_browser, null):
            os.close(end)
        self._pending = b""
        self._count = 0
        self._session: str | None = None
        self.requests: list[str] = []
        self.dialogs: list[str] = []
        self._loaded = 0
        self._attach()

    def _attach(self) -> None:
        pages = [t for t in self.ask("Target.getTargets")["targetInfos"] if t["type"] == "page"]
        target = (
            pages[0]["targetId"] if pages else self.ask("Target.createTarget", url="about:blank")["targetId"]
        )
        self._session = self.ask("Target.attachToTarget", targetId=target, flatten=True)["sessionId"]
        for domain in ("Page", "Network", "Runtime"):
            self.ask(f"{domain}.enable")

    def ask(self, method: str, **parameters: Any) -> Any:
        """What the browser answers to a command. Raises AssertionError where it refuses it."""
        self._count += 1
        message = {"id": self._count, "method": method, "params": parameters}
        if self._session is not None:
            message["sessionId"] = self._session
        os.write(self._write, json.dumps(message).encode() + b"\0")
        while True:
            answer = self._message()
            if answer.get("id") == self._count:
                assert "error" not in answer, answer["error"]
                return answer["result"]

    def _message(self) -> dict[str, Any]:
        """The next message; events are noted on the way."""
        until = time.monotonic() + PATIENCE
        while b"\0" not in self._pending:
            ready, _, _ = select.select([self._read], [], [], max(0, until - time.monotonic()))
            assert ready, "the browser does not answer"
            part = os.read(self._read, 1 << 16)
            assert part, "the browser has ended"
            self._pending += part
        text, _, self._pending = self._pending.partition(b"\0")
        message: dict[str, Any] = json.loads(text)
        self._note(message.get("method", ""), message.get("params", {}))
        return message

    def _note(self, event: str, told: dict[str, Any]) -> None:
        if event == "Network.requestWillBeSent":
            self.requests.append(told["request"]["url"])
        elif event == "Page.javascriptDialogOpening":
            self.dialogs.append(told["message"])
            self._count += 1
            closing = {"id": self._count, "method": "Page.handleJavaScriptDialog", "params": {"accept": True}}
            os.write(self._write, json.dumps({**closing, "sessionId": self._session}).encode() + b"\0")
        elif event == "Page.loadEventFired":
            self._loaded += 1

    def open(self, path: Path) -> None:
        """Load a file and wait until it has all."""
        self.requests.clear()
        self.dialogs.clear()
        before = self._loaded
        address = path.resolve().as_uri()
        self.ask("Page.navigate", url=address)
        while self._loaded == before:
            self._message()
        self.evaluate("0")
        self.requests = [url for url in self.requests if url != address]

    def window(self, width: int, height: int = 800, mobile: bool = False) -> None:
        """The window's size in CSS pixels."""
        self.ask(
            "Emulation.setDeviceMetricsOverride",
            width=width,
            height=height,
            deviceScaleFactor=1,
            mobile=mobile,
        )

    def media(self, kind: str = "screen", scheme: str = "light") -> None:
        """What the page is shown on, and the colours that its reader prefers."""
        features = [{"name": "prefers-color-scheme", "value": scheme}]
        self.ask("Emulation.setEmulatedMedia", media=kind, features=features)

    def evaluate(self, script: str) -> Any:
        """The value of an expression in the page, as JSON."""
        answer = self.ask("Runtime.evaluate", expression=script, returnByValue=True, awaitPromise=True)
        assert "exceptionDetails" not in answer, answer["exceptionDetails"]
        return answer["result"].get("value")

    def screenshot(self) -> bytes:
        """The whole page as PNG."""
        made = self.ask("Page.captureScreenshot", format="png", captureBeyondViewport=True)
        return base64.b64decode(made["data"])

    def printed(self) -> bytes:
        """The page as PDF, as its style for print has it."""
        return base64.b64decode(self.ask("Page.printToPDF", preferCSSPageSize=True)["data"])

    def close(self) -> None:
        """End the browser and wait for it."""
        with suppress(ProcessLookupError):
            os.killpg(self._process, signal.SIGKILL)
        os.waitpid(self._process, 0)
        os.close(self._write)
        os.close(self._read)


@contextmanager
def browser(profile: Path) -> Iterator[Browser]:
    """A browser that has ended when the block ends."""
    running = Browser(profile)
    try:
        yield running
    finally:
        running.close()
