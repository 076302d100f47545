"""Paths, folders, patterns and addresses -> logs to read, in one order; what is left out is counted with its reason."""

from __future__ import annotations

import glob
import os
import re
import stat
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import NamedTuple
from urllib.parse import quote, unquote, urlsplit

from exceed.errors import Problem, UsageError
from exceed.read.container import is_uri

PACKINGS = (".gz", ".bz2", ".zst", ".xz", ".zip")
TEXTS = (".csv", ".tsv", ".tab", ".txt", ".log", ".dat", ".asc", ".prn", ".psv", ".ssv")
TABLES = (".parquet", ".pq", ".parq")
# what stands beside logs and is none: said, so that nobody wonders
_OTHERS = {
    ".yaml": "a YAML file",
    ".yml": "a YAML file",
    ".md": "a text about the logs",
    ".rst": "a text about the logs",
    ".json": "a JSON file",
    ".html": "a page",
    ".htm": "a page",
    ".pdf": "a document",
    ".sqlite": "a ledger",
    ".db": "a data base",
    ".py": "a program",
    ".xlsx": "a spreadsheet: export it as CSV",
    ".xls": "a spreadsheet: export it as CSV",
    ".ods": "a spreadsheet: export it as CSV",
}
_README = re.compile(r"^(readme|license|licence|changelog|notes?|sources?|index|contents|version)([._-].*)?$", re.I)


@dataclass(frozen=True, slots=True, order=True)
class LogPath:
    """One log: `location` to open, `root` the PATH it was found under, `shown` relative to it with forward slashes."""

    shown: str
    location: str
    root: str

    def __fspath__(self) -> str:
        return self.location


class Skipped(NamedTuple):
    """A path that is not read, and why."""

    shown: str
    reason: str


def find_logs(paths: Iterable[str | os.PathLike[str]]) -> tuple[list[LogPath], list[Skipped]]:
    """Logs under the given paths: files as given, folders searched through, patterns expanded.

    Order: the paths as given, each folder's logs by their shown path. A file met twice is read once.

    Raises
    ------
    UsageError : a path that does not exist, or a pattern that matches nothing; all of them at once.
    """
    found: list[LogPath] = []
    skipped: list[Skipped] = []
    problems: list[Problem] = []
    seen: set[tuple[int, int] | str] = set()
    for given in paths:
        text = os.fspath(given)
        if text.startswith("file://"):
            text = unquote(urlsplit(text).path)
        if is_uri(text):
            found += _remote(text, skipped)
            continue
        if not text.strip():
            problems.append(
                Problem("", "an empty path is given", "a file, a folder or a pattern", "give the path of a log")
            )
            continue
        here: list[str] = [text]
        if not os.path.lexists(text) and glob.has_magic(text):
            here = sorted(glob.glob(text, recursive=True))
            if not here:
                problems.append(
                    Problem(text, "matches no file", "a pattern that fits a log", "check the pattern and its quotes")
                )
                continue
            base = _fixed_part(text)
        else:
            base = None
        for path in here:
            if not os.path.exists(path):
                what = "is a link to nothing" if os.path.islink(path) else "there is no such file or folder"
                problems.append(Problem(path, what, "a file, a folder or a pattern", "check the path"))
                continue
            if os.path.isdir(path):
                found += _folder(path, base or path, seen, skipped)
                continue
            reason = _unfit(path)
            if reason:
                skipped.append(Skipped(_shown(path, base or os.path.dirname(path)), reason))
                continue
            named = base is None
            reason = "" if named else _no_log(os.path.basename(path))
            if reason:
                skipped.append(Skipped(_shown(path, base or "."), reason))
            elif _fresh(path, seen):
                root = base if base is not None else os.path.dirname(path)
                found.append(LogPath(_shown(path, root), path, root or "."))
    if problems:
        raise UsageError(*problems)
    return found, skipped


def _fixed_part(pattern: str) -> str:
    """The folder before the first wildcard."""
    parts = Path(pattern).parts
    fixed = []
    for part in parts[:-1]:
        if glob.has_magic(part):
            break
        fixed.append(part)
    return os.path.join(*fixed) if fixed else ""


def _shown(path: str, root: str | None) -> str:
    relative = os.path.relpath(path, root or ".") if root is not None else path
    return relative.replace(os.sep, "/")


def _fresh(path: str, seen: set[tuple[int, int] | str]) -> bool:
    """Not met before, also not by another name."""
    try:
        state = os.stat(path)
    except OSError:
        key: tuple[int, int] | str = os.path.realpath(path)
    else:
        key = (state.st_dev, state.st_ino) if state.st_ino else os.path.realpath(path)
    if key in seen:
        return False
    seen.add(key)
    return True


def _unfit(path: str) -> str:
    """Why a path cannot be opened as a file, or ''."""
    try:
        mode = os.stat(path).st_mode
    except OSError as error:
        return f"cannot be looked at ({error.strerror or 'unknown reason'})"
    if not stat.S_ISREG(mode):
        return "no regular file"
    return ""


def _no_log(name: str) -> str:
    """Why a file of a folder is no log by its name, or ''."""
    lower = name.lower()
    if name.startswith((".", "~$")) or lower.endswith("~"):
        return "a hidden file"
    stem = lower
    for packing in PACKINGS:
        if stem.endswith(packing):
            stem = stem[: -len(packing)]
            if not Path(stem).suffix and packing == ".zip":
                return ""
            break
    suffix = Path(stem).suffix
    if suffix in _OTHERS:
        return _OTHERS[suffix]
    if _README.match(Path(stem).name):
        return "a text about the logs"
    if suffix in TEXTS or suffix in TABLES:
        return ""
    return "no known extension of a log"


def _folder(folder: str, root: str, seen: set[tuple[int, int] | str], skipped: list[Skipped]) -> list[LogPath]:
    """All logs of a folder, its folders included; links to folders above are not followed round."""
    found: list[LogPath] = []
    for path in _walk(folder, set(), root, skipped):
        reason = _no_log(os.path.basename(path)) or _unfit(path)
        if reason:
            skipped.append(Skipped(_shown(path, root), reason))
        elif _fresh(path, seen):
            found.append(LogPath(_shown(path, root), path, root))
    return sorted(found)


def _walk(folder: str, above: set[str], root: str, skipped: list[Skipped]) -> Iterator[str]:
    real = os.path.realpath(folder)
    if real in above:
        skipped.append(Skipped(_shown(folder, root), "a link back to a folder above it"))
        return
    try:
        entries = sorted(os.scandir(folder), key=lambda entry: entry.name)
    except OSError as error:
        skipped.append(Skipped(_shown(folder, root), f"cannot be opened ({error.strerror or 'unknown reason'})"))
        return
    for entry in entries:
        if _is_folder(entry):
            if not entry.name.startswith("."):
                yield from _walk(entry.path, above | {real}, root, skipped)
        else:
            yield entry.path


def _is_folder(entry: os.DirEntry[str]) -> bool:
    """A link to itself is none, and must not cost the rest of the folder."""
    try:
        return entry.is_dir()
    except OSError:
        return False


def _remote(address: str, skipped: list[Skipped]) -> list[LogPath]:
    """Logs at an object store's address: one object, or all below a prefix."""
    import pyarrow as pa
    import pyarrow.fs as fs

    try:
        system, path = fs.FileSystem.from_uri(address)
        info = system.get_file_info(path)
        if info.type == fs.FileType.File:
            return [LogPath(path.rsplit("/", 1)[-1], address, address.rsplit("/", 1)[0])]
        if info.type == fs.FileType.NotFound:
            raise UsageError(
                Problem(
                    address, "there is nothing at this address", "an object or a prefix that holds some", "check it"
                )
            )
        inside = system.get_file_info(fs.FileSelector(path, recursive=True))
    except (pa.ArrowException, OSError, ValueError) as error:
        text = " ".join(str(error).split())[:160]
        raise UsageError(
            Problem(address, f"cannot be opened: {text}", "an address that you may read", "check it")
        ) from error
    found = []
    for one in inside:
        if one.type != fs.FileType.File:
            continue
        shown = one.path.strip("/")[len(path.strip("/")) :].strip("/")
        reason = _no_log(one.path.rsplit("/", 1)[-1])
        if reason:
            skipped.append(Skipped(shown, reason))
        else:
            found.append(LogPath(shown, _below(address, shown), address))
    return sorted(found)


def _below(address: str, inside: str) -> str:
    """The address of an object below a prefix: the store's host and its options (`?endpoint_override=...`) stay."""
    prefix, mark, options = address.partition("?")
    return f"{prefix.rstrip('/')}/{quote(inside)}{mark}{options}"
