"""A process of its own that does one log after the other for `batch`; it knows nothing of the others.

It is a fresh interpreter and no fork, since whoever calls may have threads (numpy and pyarrow start some on import),
and it never runs the caller's main module again, so that a script without a guard can scan with many processes too.
"""

from __future__ import annotations

import os
import pickle
import signal
import subprocess
import sys
from multiprocessing.connection import Connection, Pipe

from exceed.lean import without_pandas

READY = b"ready"


def start(threads: int, *, talks: bool) -> tuple[subprocess.Popen[bytes], Connection]:
    """A new worker and our end of its pipe, through which it first wants the pickled pair of work and run.

    threads : for the libraries inside it. talks : what it writes to stderr is seen. Raises OSError where no process can
    be started.
    """
    ours, theirs = Pipe()
    try:
        process = subprocess.Popen(
            [sys.executable, "-c", _code(theirs.fileno())],
            stdin=subprocess.DEVNULL,
            stdout=subprocess.DEVNULL,
            stderr=None if talks else subprocess.DEVNULL,
            pass_fds=[theirs.fileno()],
            env={**os.environ, "OMP_NUM_THREADS": str(threads), "OPENBLAS_NUM_THREADS": str(threads)},
            # a group of its own: Ctrl-C reaches the parent alone, which ends the workers itself
            process_group=0,
        )
    except BaseException:
        ours.close()
        raise
    finally:
        theirs.close()
    return process, ours


def _code(descriptor: int) -> str:
    path = [os.path.abspath(entry) for entry in sys.path]
    return f"import sys; sys.path[:] = {path!r}; from exceed.worker import serve; serve({descriptor})"


def serve(descriptor: int) -> None:
    """Answer each log that comes through the pipe with its outcome, until the pipe is closed."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    without_pandas()
    with Connection(descriptor) as connection:
        try:
            # taken before it is opened, which imports what it needs: the parent is not kept waiting
            blob = connection.recv_bytes()
            work, run = pickle.loads(blob)
            connection.send_bytes(READY)
            while True:
                connection.send(work(connection.recv(), run))
        except (EOFError, ConnectionError):
            # the parent has what it wanted, or is gone
            return
