"""The console command: settings, a free port, the server, the browser."""

from __future__ import annotations

import contextlib
import sys
from collections.abc import Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

# Only light imports here: child processes import this module again before they start to work.
from app.settings import Settings, read_settings
from engine.refusal import Refusal

if TYPE_CHECKING:
    import socket

PORTS_TRIED = 50


def main(arguments: Sequence[str] | None = None) -> int:
    """Run Steelyard until Ctrl-C. Returns 0, or 2 when it could not start."""
    try:
        with contextlib.suppress(KeyboardInterrupt):
            run(read_settings(sys.argv[1:] if arguments is None else arguments))
    except Refusal as refusal:
        print(refusal, file=sys.stderr)
        return 2
    print("\nStopped. The studies stay where they are.")
    return 0


def run(settings: Settings) -> None:
    """Listen, open the studies and serve. Raises Refusal when that cannot be done."""
    listener, settings = listen(settings)
    with listener:
        _serve(settings, listener)


def listen(settings: Settings) -> tuple[socket.socket, Settings]:
    """A listening socket on the port of `settings` or the next free one, and the settings with the port it got.

    A busy port is said in a sentence. Raises Refusal when none of the next ports is free.
    """
    import errno
    import socket

    family = socket.AF_INET6 if ":" in settings.host else socket.AF_INET
    last = min(settings.port + PORTS_TRIED, 65535)
    for port in range(settings.port, last + 1):
        listener = socket.socket(family)
        listener.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, sys.platform != "win32")
        try:
            listener.bind((settings.host, port))
            listener.listen(128)
        except OSError as error:
            listener.close()
            if error.errno == errno.EADDRINUSE:
                continue
            raise Refusal(
                f"Steelyard may not listen on {settings.host}, port {port}: {error.strerror}.",
                do="Give another port with --port.",
            ) from error
        if port != settings.port:
            print(f"Port {settings.port} is busy, so Steelyard listens on {port}.", flush=True)
        return listener, replace(settings, port=port)
    raise Refusal(f"The ports {settings.port} to {last} are all busy.", do="Give another one with --port.")


def _serve(settings: Settings, listener: socket.socket) -> None:
    import threading
    import webbrowser

    import uvicorn

    from app.main import create_app
    from app.samples import FIRST, open_sample

    app = create_app(settings)
    address = settings.address
    if settings.sample:
        address += f"study/{open_sample(app.state.store, app.state.jobs, FIRST).key}/ask"
    print(f"Steelyard is at {address}", flush=True)
    print(f"The studies are in {settings.data}. Press Ctrl-C to stop.", flush=True)
    if settings.open_browser:
        threading.Thread(target=webbrowser.open, args=(address,), daemon=True).start()
    config = uvicorn.Config(
        app, log_level="warning", access_log=False, server_header=False, ws="none", timeout_graceful_shutdown=2
    )
    uvicorn.Server(config).run(sockets=[listener])


if __name__ == "__main__":
    sys.exit(main())
