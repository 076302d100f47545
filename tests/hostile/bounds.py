"""Bounds on time and memory for programs that read hostile files, and a run of one inside them."""

from __future__ import annotations

import resource
import subprocess
import sys
from pathlib import Path

# address space of a process with numpy, pyarrow and their threads is about 1.5 GB before a byte is read
MEMORY = 3 << 30


def bound() -> None:
    """In the child, before it starts: no more memory than this, and no core file."""
    resource.setrlimit(resource.RLIMIT_AS, (MEMORY, MEMORY))
    resource.setrlimit(resource.RLIMIT_CORE, (0, 0))


def run(*arguments: str, folder: Path, seconds: float) -> subprocess.CompletedProcess[bytes]:
    """A Python program inside the bounds. Raises TimeoutExpired where it hangs."""
    return subprocess.run(
        [sys.executable, "-W", "error", *arguments], cwd=folder, capture_output=True, check=False, timeout=seconds,
        preexec_fn=bound, stdin=subprocess.DEVNULL,
    )  # fmt: skip
