"""Chromium over its debugging pipe, with the standard library only: open a page, look, measure."""

from __future__ import annotations

import base64
import json
import os
import shutil
import subprocess
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

FLAGS = (
    "--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run",
    "--disable-background-networking", "--disable-component-update", "--disable-sync",
    "--disable-extensions", "--hide-scrollbars", "--remote-debugging-pipe",
)  # fmt: skip


def find_chromium() -> str | None:
    """Path of an installed Chromium, or None."""
    return shutil.which("chromium") or shutil.which("chromium-browser")


class Browser:
    """One page in one headless Chromium."""

    def __init__(self, process: subprocess.Popen[bytes], write: int, read: int) -> None:
        self.process, self.write, self.read = process, write, read
        self.events: list[dict[str, Any]] = []
        self.session = ""
        self._number, self._buffer = 0, b""
        target = self.call("Target.createTarget", url="about:blank")["targetId"]
        attached = self.call("Target.attachToTarget", targetId=target, flatten=True)
        self.session = attached["sessionId"]
        for domain in ("Page", "Runtime", "Log", "Network"):
            self.call(f"{domain}.enable")

    def call(self, method: str, **params: Any) -> dict[str, Any]:
        """Send one command and wait for its answer."""
        self._number += 1
        message = {"id": self._number, "method": method, "params": params}
        if self.session:
            message["sessionId"] = self.session
        os.write(self.write, json.dumps(message).encode() + b"\0")
        while True:
            answer = self._next()
            if answer.get("id") == self._number:
                if "error" in answer:
                    raise RuntimeError(f"{method}: {answer['error']}")
                return dict(answer["result"])
            self.events.append(answer)

    def open(self, path: Path, width: int, height: int = 900) -> None:
        """Show the file at ``path`` in a window of this size and wait until it has loaded."""
        metrics = {"width": width, "height": height, "deviceScaleFactor": 1, "mobile": width < 700}
        self.call("Emulation.setDeviceMetricsOverride", **metrics)
        self.events.clear()
        self.call("Page.navigate", url=path.resolve().as_uri())
        while not any(event.get("method") == "Page.loadEventFired" for event in self.events):
            self.events.append(self._next())

    def evaluate(self, expression: str) -> Any:
        """Value of a JavaScript expression in the page."""
        answer = self.call("Runtime.evaluate", expression=expression, returnByValue=True)
        if "exceptionDetails" in answer:
            raise RuntimeError(str(answer["exceptionDetails"]))
        return answer["result"].get("value")

    def screenshot(self, target: Path, *, whole: bool = False) -> None:
        """Write a picture of the window, or of the whole page."""
        answer = self.call("Page.captureScreenshot", captureBeyondViewport=whole)
        target.write_bytes(base64.b64decode(answer["data"]))

    def requested(self) -> list[str]:
        """Addresses that the page asked for since it was opened."""
        sent = [e for e in self.events if e.get("method") == "Network.requestWillBeSent"]
        return [event["params"]["request"]["url"] for event in sent]

    def complaints(self) -> list[str]:
        """Console messages, exceptions and log entries since the page was opened."""
        kinds = ("Runtime.exceptionThrown", "Runtime.consoleAPICalled", "Log.entryAdded")
        return [json.dumps(e["params"]) for e in self.events if e.get("method") in kinds]

    def _next(self) -> dict[str, Any]:
        while b"\0" not in self._buffer:
            part = os.read(self.read, 1 << 16)
            if not part:
                raise RuntimeError("Chromium ended")
            self._buffer += part
        message, self._buffer = self._buffer.split(b"\0", 1)
        return dict(json.loads(message))


@contextmanager
def browser(profile: Path) -> Iterator[Browser]:
    """Start Chromium with a new profile folder, and end that process afterwards."""
    program = find_chromium()
    if program is None:
        raise FileNotFoundError("chromium")
    to_read, to_write = os.pipe()
    from_read, from_write = os.pipe()
    # Chromium reads commands from file descriptor 3 and answers on 4
    wrapped = ["bash", "-c", f'exec 3<&{to_read} 4>&{from_write}; exec "$0" "$@"', program]
    process = subprocess.Popen(
        [*wrapped, *FLAGS, f"--user-data-dir={profile}"],
        pass_fds=(to_read, from_write),
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
    )
    os.close(to_read)
    os.close(from_write)
    try:
        yield Browser(process, to_write, from_read)
    finally:
        process.terminate()
        process.wait(timeout=20)
        os.close(to_write)
        os.close(from_read)
