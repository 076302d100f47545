"""Run as a program: describe, trace and lint files of a folder; a line of JSON for each command and file.

One process for all, since starting one a file would take minutes; an answer for each says which one was hurt. Which
files are described, traced and linted is drawn by their names, unless EXCEED_FUZZ asks for all.
"""

from __future__ import annotations

import json
import os
import sys
import time
import traceback
import zlib
from pathlib import Path

from typer.testing import CliRunner

from exceed.cli.app import app


def drawn(name: str) -> set[str]:
    """The commands that a file is given to."""
    number = zlib.crc32(os.fsencode(name))
    every = bool(os.environ.get("EXCEED_FUZZ"))
    shares = {"describe": 2, "trace": 3, "lint": 5}
    return {command for command, share in shares.items() if every or number % share == 0}


def main(folder: str, outputs: str) -> None:
    """Every file of `folder`; what trace writes goes to `outputs`."""
    runner = CliRunner()
    for name in sorted(os.listdir(folder)):
        path = os.path.join(folder, name)
        if name.startswith("link-to-device") or not os.path.isfile(path):
            continue  # a path that is no file is a case of its own
        commands = (
            ["describe", path, "--write", os.path.join(outputs, "channels.yaml")],
            ["trace", path, "--out", os.path.join(outputs, "trace.parquet"), "--aircraft", "aerobatic"],
            ["lint", path],
        )
        for command in (one for one in commands if one[0] in drawn(name)):
            started = time.monotonic()
            done = runner.invoke(app, command, prog_name="exceed")
            fault = ""
            if done.exception is not None and not isinstance(done.exception, SystemExit):
                fault = "".join(traceback.format_exception(done.exception))
            answer = {
                "name": os.fsencode(name).decode("utf-8", "backslashreplace"),
                "command": command[0],
                "code": done.exit_code,
                "out": done.stdout.encode("utf-8", "backslashreplace").decode(),
                "err": done.stderr.encode("utf-8", "backslashreplace").decode(),
                "fault": fault,
                "seconds": time.monotonic() - started,
            }
            if command[0] == "describe" and done.exit_code == 0:
                written = runner.invoke(app, ["lint", command[-1]], prog_name="exceed")
                answer["channels"] = written.stdout if written.exit_code != 0 else ""
            print(json.dumps(answer))
    assert sorted(entry.name for entry in Path(outputs).iterdir()) in (
        ["channels.yaml", "trace.parquet"],
        ["channels.yaml"],
        [],
    )


if __name__ == "__main__":
    main(*sys.argv[1:])
