"""The settings: one table, each row a command line option and an environment variable."""

from __future__ import annotations

import argparse
import os
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from engine.refusal import Refusal

LOOPBACK = ("127.0.0.1", "localhost", "::1")


@dataclass(frozen=True)
class Setting:
    """One row of the table.

    field: its name in `Settings`.  option: on the command line; a switch takes no value there.
    default: as a person would type it.  meaning: one sentence.  least, most: of a whole number; None for text.
    """

    field: str
    option: str
    default: str
    meaning: str
    least: int | None = None
    most: int | None = None
    switch: bool = False

    @property
    def variable(self) -> str:
        return "STEELYARD_" + self.field.upper()


TABLE = (
    Setting(
        "sample", "--sample", "no", "Bring the evening school sample, learn it and open its Ask page.", switch=True
    ),
    Setting("port", "--port", "8377", "Port to listen on; the next free one is taken when it is busy.", 1, 65535),
    Setting("host", "--host", "127.0.0.1", "Loopback address to listen on; no other address is accepted."),
    Setting("data", "--data", "the user's data folder", "Folder in which the studies are kept."),
    Setting(
        "open_browser",
        "--no-browser",
        "yes",
        "Open the browser at the start; the option leaves it closed.",
        switch=True,
    ),
    Setting("upload_limit", "--upload-limit", "200", "Largest file that can be brought, in megabytes.", 1),
    Setting("reading_memory", "--reading-memory", "2000", "Memory that reading a file may take, in megabytes.", 100),
    Setting("reading_time", "--reading-time", "120", "Time that reading a file may take, in seconds.", 1),
)


@dataclass(frozen=True)
class Settings:
    """What the program runs with. `data` is a folder; limits are in the units that the table states."""

    data: Path
    host: str = "127.0.0.1"
    port: int = 8377
    sample: bool = False
    open_browser: bool = True
    upload_limit: int = 200
    reading_memory: int = 2000
    reading_time: int = 120

    @property
    def upload_bytes(self) -> int:
        return self.upload_limit * 1_000_000

    @property
    def address(self) -> str:
        host = f"[{self.host}]" if ":" in self.host else self.host
        return f"http://{host}:{self.port}/"


def read_settings(arguments: Sequence[str], environment: Mapping[str, str] | None = None) -> Settings:
    """Settings from the command line, else from the environment, else the defaults.

    Raises Refusal for a value that cannot be used; SystemExit for an option that does not exist and after --help.
    """
    given = {name: text for name, text in vars(_parser().parse_args(arguments)).items() if text is not None}
    environment = os.environ if environment is None else environment
    chosen: dict[str, Any] = {}
    for setting in TABLE:
        if setting.field in given:
            text, where = given[setting.field], setting.option
        elif environment.get(setting.variable, "").strip():
            text, where = environment[setting.variable].strip(), setting.variable
        else:
            continue
        chosen[setting.field] = _value(setting, text, where)
    if "data" not in chosen:
        chosen["data"] = default_data_folder()
    return Settings(**chosen)


def default_data_folder() -> Path:
    from platformdirs import user_data_path

    return user_data_path("steelyard", appauthor=False)


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="steelyard",
        description="What-if questions to a model learned from your records, on this machine only.",
        epilog="Each option can also be given as an environment variable: STEELYARD_ and the name of the setting.",
        allow_abbrev=False,
    )
    for setting in TABLE:
        words = f"{setting.meaning} ({setting.variable}; default: {setting.default})"
        if setting.switch:
            pressed = "no" if setting.default == "yes" else "yes"
            parser.add_argument(setting.option, dest=setting.field, action="store_const", const=pressed, help=words)
        else:
            parser.add_argument(setting.option, dest=setting.field, metavar="VALUE", help=words)
    return parser


def _value(setting: Setting, text: str, where: str) -> object:
    if setting.switch:
        if text.lower() in ("yes", "true", "on", "1"):
            return True
        if text.lower() in ("no", "false", "off", "0"):
            return False
        raise Refusal(f"{where} is {text!r}, which is neither yes nor no.", where=where, do="Write yes or no.")
    if setting.least is not None:
        return _whole_number(setting, text, where)
    if setting.field == "host" and text not in LOOPBACK:
        raise Refusal(
            f"{where} is {text!r}, which is not an address of this machine alone.",
            where=where,
            do=f"Use one of {', '.join(LOOPBACK)}: Steelyard answers this machine only.",
        )
    return Path(text).expanduser() if setting.field == "data" else text


def _whole_number(setting: Setting, text: str, where: str) -> int:
    assert setting.least is not None
    most = setting.most
    bounds = f"from {setting.least} to {most}" if most is not None else f"of at least {setting.least}"
    number = int(text) if text.isascii() and text.isdigit() and len(text) < 10 else -1
    if number < setting.least or (most is not None and number > most):
        raise Refusal(
            f"{where} is {text!r}, which is not a whole number {bounds}.", where=where, do=f"Give a number {bounds}."
        )
    return number
