"""What reading a log will take, against what the machine has: a log that does not fit is refused before it is read."""

from __future__ import annotations

import contextlib
import os
import re
import resource
import zlib
from pathlib import Path

from exceed.errors import LogError, Problem, UsageError
from exceed.read.container import Source, raw
from exceed.read.loading import choose
from exceed.read.look import Survey

# bytes for each instant and for each cell: half more than the 62 and 13 by which peak resident memory was seen to grow
# with 14, 16 and 22 columns of 0.3 and 1 million rows
INSTANT_BYTES = 93
CELL_BYTES = 20
# of what is free: estimates are rough, and the machine does other things
SHARE = 0.8
# says how much memory may be taken for a log, where the machine's own figures do not
LIMIT = "EXCEED_MEMORY"
_UNITS = {"": 1, "B": 1, "KB": 10**3, "MB": 10**6, "GB": 10**9, "KIB": 1 << 10, "MIB": 1 << 20, "GIB": 1 << 30}
_NO_LIMIT = 1 << 60


def require(survey: Survey, wanted: set[str] | frozenset[str] | None, free: int | None = None) -> None:
    """Raises LogError where a load of the wanted quantities would take more memory than is free (None: asked here)."""
    need = estimate(survey, wanted)
    if free is None:
        free = available()
    if need <= SHARE * free:
        return
    many = rows(survey)
    raise LogError(
        Problem(
            survey.path,
            f"is too large for the memory here: some {many:,} rows take about {_shown(need)}, {_shown(free)} are free",
            f"a log that takes at most {_shown(int(SHARE * free))}",
            "split it, or scan it on a machine with more memory",
        )
    )


def estimate(survey: Survey, wanted: set[str] | frozenset[str] | None) -> int:
    """Bytes that reading and judging will take at the most, roughly."""
    # the witnesses that come along are read for a stretch only, if the log is a large one
    chosen, _ = choose(survey, wanted)
    # columns of one sub-frame are one channel of so many instants a row
    groups = [max(1, len(column.group)) for column in chosen]
    cells = len(survey.clock.columns) + sum(groups)
    return rows(survey) * (INSTANT_BYTES * max(groups, default=1) + CELL_BYTES * cells)


def rows(survey: Survey) -> int:
    """About how many rows a log has: known of Parquet, else by the length of its first lines."""
    if survey.rows is not None:
        return survey.rows
    source = survey.source
    head = source.head
    lines = max(head.count(b"\n"), head.count(b"\r"), 1)
    if source.whole:
        return lines
    return int(unpacked_size(source) * lines / len(head))


def unpacked_size(source: Source) -> int:
    """Bytes of text in a log: its size, of gzip what its last bytes say, else by how well its first block packs."""
    if not source.packed:
        return source.size
    if source.packed == "gzip":
        with raw(source.location, source.shown) as stream:
            stream.seek(-4, os.SEEK_END)
            said = int.from_bytes(stream.read(4), "little")
        # the field wraps at 4 GiB, and of several members it tells of the last one alone
        if said >= source.size:
            return said
    return int(source.size * len(source.head) / max(1, len(zlib.compress(source.head, 6))))


def available() -> int:
    """Bytes that may be taken now: the least of the machine's, the container's, the process's and EXCEED_MEMORY.

    Raises UsageError where EXCEED_MEMORY is no size.
    """
    return max(0, min(_told(), _machine(), _container(), _process()))


def _told() -> int:
    text = os.environ.get(LIMIT, "").strip()
    if not text:
        return _NO_LIMIT
    found = re.fullmatch(r"([0-9]+(?:\.[0-9]+)?)\s*([A-Za-z]*)", text)
    if found is None or found[2].upper() not in _UNITS:
        raise UsageError(Problem(LIMIT, f"'{text}' is no size of memory", "a number with MB or GB", "write '2 GB'"))
    return int(float(found[1]) * _UNITS[found[2].upper()])


def _machine() -> int:
    with contextlib.suppress(OSError, ValueError):
        for line in Path("/proc/meminfo").read_text().splitlines():
            if line.startswith("MemAvailable:"):
                return int(line.split()[1]) * 1024
    return _NO_LIMIT


def _container() -> int:
    """Of control groups, version 2 or 1, as a container sees its own."""
    for limit, usage in (
        ("/sys/fs/cgroup/memory.max", "/sys/fs/cgroup/memory.current"),
        ("/sys/fs/cgroup/memory/memory.limit_in_bytes", "/sys/fs/cgroup/memory/memory.usage_in_bytes"),
    ):
        # "max" is no number
        with contextlib.suppress(OSError, ValueError):
            most, taken = int(Path(limit).read_text()), int(Path(usage).read_text())
            return most - taken + _cached(Path(limit).with_name("memory.stat"))
    return _NO_LIMIT


def _cached(stat: Path) -> int:
    """Bytes of files that the kernel gives back when asked."""
    with contextlib.suppress(OSError, ValueError):
        for line in stat.read_text().splitlines():
            if line.startswith("inactive_file "):
                return int(line.split()[1])
    return 0


def _process() -> int:
    limit, _ = resource.getrlimit(resource.RLIMIT_AS)
    if limit == resource.RLIM_INFINITY:
        return _NO_LIMIT
    with contextlib.suppress(OSError, ValueError):
        return limit - int(Path("/proc/self/statm").read_text().split()[0]) * resource.getpagesize()
    return limit


def _shown(size: int) -> str:
    return f"{size / 1e9:.1f} GB" if size >= 1e9 else f"{size / 1e6:.0f} MB"


__all__ = ["available", "estimate", "require", "rows", "unpacked_size"]
