"""Chromium through a pipe: the DevTools protocol is JSON, one message after another, each ended by a zero byte.

The pipe needs no port of the network and no library. What tests ask for is little: open a page, look into it, point,
type, print; and what the browser asked of the network and wrote to its console meanwhile.
"""

from __future__ import annotations

import base64
import json
import os
import select
import shutil
import subprocess
import tempfile
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import pytest

_NAMES = ("chromium", "chromium-browser", "google-chrome", "google-chrome-stable")
_FLAGS = (
    "--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update", "--disable-sync", "--disable-dev-shm-usage", "--hide-scrollbars", "--mute-audio",
    "--force-device-scale-factor=1", "--remote-debugging-pipe",
)  # fmt: skip
_PATIENCE_SECOND = 60.0
ALL_TESTS = "COULOMBOOK_ALL_TESTS"


def executable() -> str:
    """Where the browser is. Without one a test is skipped, or fails where every test is asked for."""
    found = next((path for name in _NAMES if (path := shutil.which(name))), None)
    if found is None:
        reason = f"no browser ({', '.join(_NAMES)}) is installed"
        if os.environ.get(ALL_TESTS):
            pytest.fail(reason)
        pytest.skip(reason)
    return found


class Browser:
    """One browser with one page."""

    def __init__(self, program: str, profile: Path) -> None:
        theirs_in, self._out = os.pipe()
        self._in, theirs_out = os.pipe()
        # the browser reads from its descriptor 3 and writes to 4
        into_place = f'exec "$@" 3<&{theirs_in} 4>&{theirs_out}'
        self._process = subprocess.Popen(
            ["bash", "-c", into_place, "sh", program, *_FLAGS, f"--user-data-dir={profile}", "about:blank"],
            pass_fds=(theirs_in, theirs_out),
            stdin=subprocess.DEVNULL,
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )
        os.close(theirs_in)
        os.close(theirs_out)
        self._rest, self._last = b"", 0
        self.events: list[dict[str, Any]] = []
        self._session = ""
        target = self.ask("Target.createTarget", url="about:blank")["targetId"]
        self._session = self.ask("Target.attachToTarget", targetId=target, flatten=True)["sessionId"]
        for domain in ("Page", "Runtime", "Log", "Network", "DOM"):
            self.ask(f"{domain}.enable")

    def ask(self, method: str, **parameters: Any) -> dict[str, Any]:
        """Send a command and wait for its answer."""
        self._last += 1
        message: dict[str, Any] = {"id": self._last, "method": method, "params": parameters}
        if self._session:
            message["sessionId"] = self._session
        view = memoryview(json.dumps(message).encode("utf-8") + b"\0")
        while view:
            view = view[os.write(self._out, view) :]
        wanted = self._last
        while True:
            answer = self._next()
            if answer.get("id") == wanted:
                if "error" in answer:
                    raise RuntimeError(f"{method}: {answer['error']}")
                result: dict[str, Any] = answer["result"]
                return result

    def _next(self) -> dict[str, Any]:
        """The next message; events are kept as they come by."""
        end = time.monotonic() + _PATIENCE_SECOND
        while b"\0" not in self._rest:
            if not select.select([self._in], [], [], max(end - time.monotonic(), 0.0))[0]:
                raise TimeoutError("the browser does not answer")
            more = os.read(self._in, 1 << 20)
            if not more:
                raise RuntimeError("the browser has ended")
            self._rest += more
        one, _, self._rest = self._rest.partition(b"\0")
        message: dict[str, Any] = json.loads(one)
        if "method" in message:
            self.events.append(message)
        return message

    def open(self, page: Path) -> None:
        """Open a file and wait until it is loaded."""
        self.events.clear()
        self.ask("Page.navigate", url=page.as_uri())
        while not any(one["method"] == "Page.loadEventFired" for one in self.events):
            self._next()
        self.run("new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(done)))")

    def run(self, script: str) -> Any:
        """The value of an expression, a promise waited for."""
        answer = self.ask(
            "Runtime.evaluate", expression=script, awaitPromise=True, returnByValue=True, userGesture=True
        )
        if "exceptionDetails" in answer:
            raise AssertionError(answer["exceptionDetails"].get("exception", answer["exceptionDetails"]))
        return answer["result"].get("value")

    def wait_for(self, condition: str) -> None:
        """Wait until an expression is true."""
        end = time.monotonic() + _PATIENCE_SECOND
        while not self.run(condition):
            assert time.monotonic() < end, f"never true: {condition}"
            time.sleep(0.05)

    def size(self, width: int, height: int = 900) -> None:
        """Give the window a size."""
        self.ask(
            "Emulation.setDeviceMetricsOverride",
            width=width,
            height=height,
            deviceScaleFactor=1,
            mobile=False,
        )

    def scheme(self, name: str) -> None:
        """Prefer light or dark."""
        self.ask("Emulation.setEmulatedMedia", features=[{"name": "prefers-color-scheme", "value": name}])

    def middle_of(self, selector: str) -> tuple[float, float]:
        """Where an element lies, once it was brought into view."""
        # what follows a scroll comes with the next frame
        box = self.run(
            f"(async () => {{ const one = document.querySelector({json.dumps(selector)});"
            "one.scrollIntoView({block: 'center', behavior: 'instant'});"
            "await new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(done)));"
            "const box = one.getBoundingClientRect();"
            "return [box.left + box.width / 2, box.top + box.height / 2]; })()"
        )
        return box[0], box[1]

    def mouse(self, kind: str, x: float, y: float, *, pressed: bool = False, clicks: int = 0) -> None:
        """Move, press or release."""
        self.ask(
            "Input.dispatchMouseEvent",
            type=f"mouse{kind}",
            x=x,
            y=y,
            button="left" if pressed or kind != "Moved" else "none",
            buttons=1 if pressed else 0,
            clickCount=clicks,
        )

    def click(self, x: float, y: float, times: int = 1) -> None:
        """Click, once or more."""
        self.mouse("Moved", x, y)
        for count in range(1, times + 1):
            self.mouse("Pressed", x, y, pressed=True, clicks=count)
            self.mouse("Released", x, y, clicks=count)

    def drag(self, start: tuple[float, float], end: tuple[float, float]) -> None:
        """Press at one place, release at the other."""
        self.mouse("Moved", *start)
        self.mouse("Pressed", *start, pressed=True, clicks=1)
        for share in (0.3, 0.7, 1.0):
            self.mouse(
                "Moved",
                start[0] + share * (end[0] - start[0]),
                start[1] + share * (end[1] - start[1]),
                pressed=True,
            )
        self.mouse("Released", *end, clicks=1)

    def key(self, name: str, text: str = "") -> None:
        """Press a key by its name."""
        codes = {"Enter": 13, "Tab": 9, "Escape": 27, "ArrowRight": 39, "ArrowLeft": 37}
        about = {"key": name, "code": name, "windowsVirtualKeyCode": codes.get(name, ord(name[0]))}
        if text:
            about["text"] = text
        self.ask("Input.dispatchKeyEvent", type="keyDown", **about)
        self.ask("Input.dispatchKeyEvent", type="keyUp", **{k: v for k, v in about.items() if k != "text"})

    def screenshot(self, path: Path, *, whole: bool = False) -> None:
        """What is to be seen, as PNG."""
        answer = self.ask("Page.captureScreenshot", format="png", captureBeyondViewport=whole)
        path.write_bytes(base64.b64decode(answer["data"]))

    def pdf(self) -> bytes:
        """The page as it is printed."""
        answer = self.ask("Page.printToPDF", preferCSSPageSize=True, printBackground=True)
        return base64.b64decode(answer["data"])

    def complaints(self) -> list[str]:
        """Errors and warnings of the console, exceptions, and dialogs, since the page was opened."""
        self.run("0")
        found = []
        for one in self.events:
            about = one["params"]
            if one["method"] == "Runtime.exceptionThrown":
                found.append(str(about["exceptionDetails"]))
            elif one["method"] == "Log.entryAdded" and about["entry"]["level"] in ("error", "warning"):
                found.append(about["entry"]["text"])
            elif one["method"] == "Runtime.consoleAPICalled":
                found.append(str(about["args"]))
            elif one["method"] == "Page.javascriptDialogOpening":
                found.append(f"dialog: {about['message']}")
        return found

    def requests(self) -> list[str]:
        """Every address that was asked for since the page was opened."""
        self.run("0")
        return [
            one["params"]["request"]["url"]
            for one in self.events
            if one["method"] == "Network.requestWillBeSent"
        ]

    def close(self) -> None:
        """End the browser, and only this one."""
        self._process.terminate()
        try:
            self._process.wait(10)
        except subprocess.TimeoutExpired:
            self._process.kill()
            self._process.wait()
        os.close(self._in)
        os.close(self._out)


@contextmanager
def chromium() -> Iterator[Browser]:
    """A browser with a profile of its own, gone afterwards."""
    program = executable()
    with tempfile.TemporaryDirectory(ignore_cleanup_errors=True) as profile:
        browser = Browser(program, Path(profile))
        try:
            yield browser
        finally:
            browser.close()
