"""What tests share: the app over a folder of its own, a live server, and Debian's chromium."""

from __future__ import annotations

import os
import shutil
import socket
import threading
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

import hypothesis
import pytest

if TYPE_CHECKING:
    from fastapi import FastAPI
    from fastapi.testclient import TestClient
    from playwright.sync_api import Browser, ConsoleMessage, Page, Request

    from app.settings import Settings

slow_machine = [hypothesis.HealthCheck.too_slow]
hypothesis.settings.register_profile("here", deadline=None, suppress_health_check=slow_machine)
hypothesis.settings.register_profile(
    "ci", deadline=None, suppress_health_check=slow_machine, derandomize=True, print_blob=True
)
hypothesis.settings.load_profile("ci" if os.environ.get("CI") else "here")

CHROMIUM_QUIET = [
    *("--no-sandbox", "--disable-gpu", "--disable-dev-shm-usage", "--disable-background-networking"),
    *("--disable-component-update", "--disable-sync", "--no-first-run", "--metrics-recording-only"),
]


@pytest.fixture
def settings(tmp_path: Path) -> Settings:
    from app.settings import Settings

    return Settings(data=tmp_path / "data", open_browser=False)


@pytest.fixture
def app(settings: Settings) -> FastAPI:
    from app.main import create_app

    return create_app(settings)


@pytest.fixture
def client(app: FastAPI, settings: Settings) -> Iterator[TestClient]:
    """A client that speaks as a page of the app would; the app's jobs and store end with it."""
    from fastapi.testclient import TestClient

    with TestClient(app, base_url=settings.address, headers={"Sec-Fetch-Site": "same-origin"}) as client:
        yield client


@dataclass(frozen=True)
class Live:
    """A server that listens. address: with its closing slash."""

    app: FastAPI
    settings: Settings

    @property
    def address(self) -> str:
        return self.settings.address


@pytest.fixture
def live(settings: Settings) -> Iterator[Live]:
    """The app on a free loopback port, over a folder of its own."""
    import uvicorn

    from app.__main__ import listen
    from app.main import create_app

    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        port = probe.getsockname()[1]
    listener, settings = listen(type(settings)(data=settings.data, port=port, open_browser=False))
    app = create_app(settings)
    server = uvicorn.Server(uvicorn.Config(app, log_level="warning", access_log=False, ws="none"))
    thread = threading.Thread(target=server.run, kwargs={"sockets": [listener]})
    thread.start()
    while not server.started and thread.is_alive():
        time.sleep(0.01)
    yield Live(app, settings)
    server.should_exit = True
    thread.join()
    listener.close()


@pytest.fixture(scope="session")
def chromium() -> Iterator[Browser]:
    """Debian's chromium; without it the test is skipped, or fails where STEELYARD_BROWSER is "required"."""
    path = shutil.which("chromium")
    if path is None:
        if os.environ.get("STEELYARD_BROWSER") == "required":
            pytest.fail("chromium is not installed, and STEELYARD_BROWSER says that it is required")
        pytest.skip("chromium is not installed (apt-get install chromium)")
    from playwright.sync_api import sync_playwright

    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=path, args=CHROMIUM_QUIET)
        yield browser
        browser.close()


@dataclass
class Watched:
    """What went wrong in a page, collected while a test drives it."""

    address: str
    expected_statuses: set[int] = field(default_factory=set)
    found: list[str] = field(default_factory=list)

    def attach(self, page: Page) -> None:
        page.on("console", self._console)
        page.on("pageerror", lambda error: self.found.append(f"script error: {error}"))
        page.on("request", self._request)

    def _console(self, message: ConsoleMessage) -> None:
        if message.type not in ("error", "warning"):
            return
        refused = message.text.startswith("Failed to load resource") and any(
            f"status of {status} " in message.text for status in self.expected_statuses
        )
        if not refused:
            self.found.append(f"console {message.type}: {message.text}")

    def _request(self, request: Request) -> None:
        if not request.url.startswith((self.address, "data:", "blob:", "about:")):
            self.found.append(f"request off the machine: {request.url}")


@pytest.fixture
def open_page(live: Live, chromium: Browser) -> Iterator[Callable[..., Page]]:
    """Open pages of the live server: open_page(javascript=True, width=1280, expect={422}) -> Page.

    The test fails at its end when any of them met a console error, a policy violation or a request off the machine.
    expect: statuses that the test provokes on purpose.
    """
    watched = Watched(live.address)
    contexts = []

    def open_one(javascript: bool = True, width: int = 1280, height: int = 900, expect: set[int] | None = None) -> Page:
        watched.expected_statuses |= expect or set()
        context = chromium.new_context(
            java_script_enabled=javascript,
            base_url=live.address,
            viewport={"width": width, "height": height},
            locale="en-GB",
        )
        context.set_default_timeout(20_000)
        contexts.append(context)
        page = context.new_page()
        watched.attach(page)
        return page

    yield open_one
    for context in contexts:
        context.close()
    assert watched.found == []
