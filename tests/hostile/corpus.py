"""The whole corpus: tables, archives, Parquet, and things in a folder that are no files or have misleading names."""

from __future__ import annotations

import os
from pathlib import Path

from hostile import packed, parquets, tables
from hostile.case import Case, holding, text


def place_cases() -> list[Case]:
    """Things in a folder that are no files, or names that mislead."""
    good = text()

    def folder(path: Path) -> None:
        path.mkdir()

    def looping(path: Path) -> None:
        path.mkdir()
        (path / "again").symlink_to("..", target_is_directory=True)
        (path / "self.csv").symlink_to("self.csv")

    def deep(path: Path) -> None:
        inner = path
        for _ in range(60):
            inner = inner / "d"
        inner.mkdir(parents=True)
        (inner / "deep.csv").write_text(good)

    return [
        Case("folder.csv", folder, "folder"),
        Case("loop", looping, "folder"),
        Case("deep", deep, "folder"),
        Case("link-to-nothing.csv", lambda path: path.symlink_to("nowhere"), "skipped", "cannot be looked at"),
        Case("link-to-itself.csv", lambda path: path.symlink_to(path.name), "skipped", "cannot be looked at"),
        Case("link-to-device.csv", lambda path: path.symlink_to("/dev/zero"), "skipped", "no regular file"),
        Case("link-to-process.csv", lambda path: path.symlink_to("/proc/self/mem"), "failed", ""),
        Case("fifo.csv", lambda path: os.mkfifo(path), "skipped", "no regular file"),
        Case(".hidden.csv", holding(good), "skipped", "a hidden file"),
        Case("program.exe", holding(good), "skipped", "no known extension"),
        Case("log[red].csv", holding(good), "done"),
        Case("log\x1b[31m.csv", holding(good), "done"),
        Case("log\nnewline.csv", holding(good), "done"),
        Case("-rf.csv", holding(good), "done"),
        Case("--json.csv", holding(good), "done"),
        Case("*?[a].csv", holding(good), "done"),
        Case("$(touch owned).csv", holding(good), "done"),
        Case("<img src=x onerror=alert(1)>.csv", holding(good), "done"),
        Case("\u202evsc.csv", holding(good), "done"),
        Case("=cmd().csv", holding(good), "done"),
        Case("n" * 240 + ".csv", holding(good), "done"),
        Case(os.fsdecode(b"bytes-\xff\xfe.csv"), holding(good), "done"),
    ]


def cases() -> list[Case]:
    """Every case, by name."""
    return [
        *tables.csv_cases(),
        *tables.clock_cases(),
        *packed.packed_cases(),
        *parquets.parquet_cases(),
        *place_cases(),
    ]


def write(folder: Path) -> list[Case]:
    """Make the corpus in a folder. Returns its cases."""
    folder.mkdir(parents=True, exist_ok=True)
    found = cases()
    for case in found:
        case.make(folder / case.name)
    return found
