"""The console command: a busy port, the sample, a clean end."""

import os
import re
import signal
import socket
import subprocess
import sys
import time
import urllib.request
from pathlib import Path

import pytest

from app.__main__ import listen, main
from app.settings import Settings

ROOT = Path(__file__).parents[2]
PATIENCE = 120.0


@pytest.fixture
def busy():
    """A loopback port on which somebody listens, the next one free."""
    with socket.socket() as taken:
        taken.bind(("127.0.0.1", 0))
        taken.listen()
        yield taken.getsockname()[1]


def test_a_busy_port_is_said_in_a_sentence_and_the_next_free_one_taken(tmp_path, busy, capsys):
    listener, settings = listen(Settings(data=tmp_path, port=busy))
    listener.close()
    assert settings.port > busy
    assert capsys.readouterr().out == f"Port {busy} is busy, so Steelyard listens on {settings.port}.\n"


def test_a_free_port_is_taken_without_a_word(tmp_path, busy, capsys):
    listener, settings = listen(Settings(data=tmp_path, port=busy + 1 if busy < 65535 else busy - 1))
    listener.close()
    if settings.port == busy + 1:
        assert capsys.readouterr().out == ""


def test_what_stops_the_start_is_a_sentence(tmp_path, capsys):
    (tmp_path / "steelyard.db").write_bytes(b"no database" * 100)
    assert main(["--data", str(tmp_path), "--no-browser"]) == 2
    said = capsys.readouterr().err
    assert "could not be read or written" in said
    assert "Traceback" not in said
    assert main(["--port", "many"]) == 2
    assert "whole number" in capsys.readouterr().err


def test_the_help_names_every_option(capsys):
    with pytest.raises(SystemExit) as ended:
        main(["--help"])
    assert ended.value.code == 0
    said = capsys.readouterr().out
    for option in ("--sample", "--port", "--data", "--no-browser"):
        assert option in said


def test_the_command_opens_the_sample_and_ends_cleanly_on_ctrl_c(tmp_path, busy):
    command = [sys.executable, "-m", "app", "--sample", "--no-browser", "--port", str(busy), "--data", str(tmp_path)]
    server = subprocess.Popen(
        command, cwd=ROOT, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, start_new_session=True
    )
    try:
        assert server.stdout.readline().startswith(f"Port {busy} is busy")
        address = re.search(
            r"http://127\.0\.0\.1:\d+/study/lantern-street-evening-school/ask", server.stdout.readline()
        )
        assert address is not None
        deadline = time.monotonic() + PATIENCE
        while True:
            try:
                with urllib.request.urlopen(address[0], timeout=PATIENCE) as page:
                    assert "Lantern Street" in page.read().decode()
                break
            except urllib.error.URLError:
                assert time.monotonic() < deadline
                time.sleep(0.1)
        os.killpg(server.pid, signal.SIGINT)  # as the terminal does: the server and its children alike
        out, errors = server.communicate(timeout=PATIENCE)
    finally:
        if server.poll() is None:
            server.kill()
            server.communicate()
    assert server.returncode == 0
    assert "Stopped." in out
    assert errors == ""
