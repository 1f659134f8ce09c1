"""Drives a headless Chromium of the system through its debugging pipe (Chrome DevTools Protocol, open documentation);
the standard library is all it needs."""

import base64
import json
import os
import select
import shutil
import subprocess
import time
from pathlib import Path

NAMES = ("chromium", "chromium-browser", "google-chrome-stable", "google-chrome")


def find():
    """Path of a Chromium: that of EBBMAP_BROWSER, else one on the search path, else none."""
    named = os.environ.get("EBBMAP_BROWSER")
    return named or next((path for path in map(shutil.which, NAMES) if path), None)


class Browser:
    """One page of a browser. Sizes in CSS pixels."""

    def __init__(self, program, profile, width, height, scale=1.0):
        to_browser, self._out = os.pipe()
        self._in, from_browser = os.pipe()
        # fds 3 and 4 are those of the protocol; first out of the way of each other
        high = [os.dup2(fd, 200 + n, inheritable=True) for n, fd in enumerate((to_browser, from_browser))]
        arguments = ["--headless=new", "--no-sandbox", "--disable-gpu", "--hide-scrollbars", "--no-first-run"]
        arguments += ["--disable-extensions", "--disable-background-networking", "--font-render-hinting=none"]
        arguments += ["--disable-lcd-text", "--force-color-profile=srgb", "--disable-dev-shm-usage"]
        arguments += [f"--user-data-dir={profile}", "--remote-debugging-pipe", "about:blank"]
        command = f'exec 3<&{high[0]} 4>&{high[1]}; exec "$0" "$@"'
        self._process = subprocess.Popen(
            ["bash", "-c", command, program, *arguments],
            pass_fds=high,
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )
        for fd in (to_browser, from_browser, *high):
            os.close(fd)
        self._pending, self._number, self._session, self.events = b"", 0, None, []
        target = self.call("Target.createTarget", url="about:blank")["targetId"]
        self._session = self.call("Target.attachToTarget", targetId=target, flatten=True)["sessionId"]
        self.call("Page.enable")
        metrics = {"width": width, "height": height, "deviceScaleFactor": scale, "mobile": False}
        self.call("Emulation.setDeviceMetricsOverride", **metrics)

    def _receive(self, limit_s):
        end = time.monotonic() + limit_s
        while b"\0" not in self._pending:
            if not select.select([self._in], [], [], max(0.0, end - time.monotonic()))[0]:
                raise TimeoutError("the browser does not answer")
            data = os.read(self._in, 1 << 20)
            if not data:
                raise EOFError("the browser has ended")
            self._pending += data
        message, _, self._pending = self._pending.partition(b"\0")
        return json.loads(message)

    def call(self, method, **parameters):
        self._number += 1
        message = {"id": self._number, "method": method, "params": parameters}
        if self._session:
            message["sessionId"] = self._session
        os.write(self._out, json.dumps(message).encode() + b"\0")
        while True:
            answer = self._receive(120)
            if answer.get("id") == self._number:
                if "error" in answer:
                    raise RuntimeError(f"{method}: {answer['error']}")
                return answer["result"]
            self.events.append(answer.get("method"))

    def wait_for(self, event, limit_s=60):
        while event not in self.events:
            self.events.append(self._receive(limit_s).get("method"))

    def open(self, path):
        """Loads a local file and its fonts."""
        self.events.clear()
        self.call("Page.navigate", url=Path(path).resolve().as_uri())
        self.wait_for("Page.loadEventFired")
        self.evaluate("document.fonts.ready.then(() => document.fonts.size)")

    def evaluate(self, expression):
        result = self.call("Runtime.evaluate", expression=expression, awaitPromise=True, returnByValue=True)
        assert "exceptionDetails" not in result, result
        return result["result"].get("value")

    def click(self, x, y):
        """Clicks and waits for the page that this leads to."""
        self.events.clear()
        for kind in ("mousePressed", "mouseReleased"):
            self.call("Input.dispatchMouseEvent", type=kind, x=x, y=y, button="left", clickCount=1)
        self.wait_for("Page.loadEventFired")

    def screenshot(self):
        """The page as PNG bytes."""
        return base64.b64decode(self.call("Page.captureScreenshot", format="png")["data"])

    def close(self):
        self._session = None
        try:
            self.call("Browser.close")
        except (EOFError, TimeoutError, OSError):
            pass
        try:
            self._process.wait(20)
        except subprocess.TimeoutExpired:
            self._process.kill()
            self._process.wait()
        os.close(self._in)
        os.close(self._out)
