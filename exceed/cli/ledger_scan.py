"""What `exceed scan --ledger` does beside the scan."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from exceed.cli.run import Terminal
from exceed.errors import ExceedError, UsageError

if TYPE_CHECKING:
    from exceed.ledger.store import Ledger
    from exceed.read import LogPath, Skipped


class ScanLedger:
    """The ledger of one scan: opened before any log is read, written after the judging, its failure said last."""

    def __init__(self, place: str | None, new_only: bool, quiet: bool = False) -> None:
        self._quiet = quiet
        self._book: Ledger | None = None
        self._error: ExceedError | None = None
        # what the pipeline asks which logs to leave out, None where all are wanted
        self.sift = self._sift if new_only else None
        if place is None:
            if new_only:
                raise UsageError.one(
                    "--new-only", "needs a ledger to know what is new", "--ledger URL|default", "add it"
                )
            return
        from exceed.ledger.store import open_ledger

        self._book = open_ledger(place, create=True)

    def _sift(self, logs: Sequence[LogPath]) -> tuple[list[LogPath], list[Skipped]]:
        """The logs whose content is not in the ledger, and the others with the reason."""
        from exceed.ledger.record import known_digests
        from exceed.read import Skipped

        assert self._book is not None
        found = {log.location: _file_digest(log) for log in logs}
        known = known_digests(self._book, [one for one in found.values() if one])
        # a known recording may come packed anew: look inside those that are packed
        inside = {place: _content_digest(place) for place, one in found.items() if one and one not in known}
        known |= known_digests(self._book, [one for one in inside.values() if one])
        old = [log for log in logs if found[log.location] in known or inside.get(log.location) in known]
        if not self._quiet:
            Terminal.err(f"ledger: {len(old)} of {len(logs)} logs skipped, their content is in it")
        gone = {log.location for log in old}
        kept = [log for log in logs if log.location not in gone]
        return kept, [Skipped(log.shown, "its content is in the ledger already") for log in old]

    def record(self, summary: dict[str, Any]) -> None:
        """Add the summary; `replaces` is filled in. A failure waits until the outputs are written."""
        if self._book is None:
            return
        from exceed.ledger.record import record
        from exceed.report.ledger import recorded_lines

        try:
            result = record(self._book, summary)
        except ExceedError as error:
            self._error = error
            return
        finally:
            self._book.close()
        summary["replaces"] = result["replaces"]
        for line in recorded_lines(result, self._book.where.shown, quiet=self._quiet):
            Terminal.err(line)

    def finish(self) -> None:
        """Raise what went wrong with the ledger."""
        if self._error is not None:
            raise self._error


def _file_digest(log: LogPath) -> str | None:
    """SHA-256 of a log's bytes as they lie; None where it cannot be read (the scan will say why)."""
    import hashlib

    from exceed.errors import LogError
    from exceed.read.container import CHUNK, raw

    digest = hashlib.sha256()
    try:
        with raw(log.location, log.shown) as stream:
            while piece := stream.read(CHUNK):
                digest.update(piece)
    except (LogError, OSError):
        return None
    return digest.hexdigest()


def _content_digest(location: str) -> str | None:
    """SHA-256 of what a packed file holds; None for one that is not packed or cannot be read."""
    import hashlib

    from exceed.errors import LogError
    from exceed.read.container import open_source, unpacked

    digest = hashlib.sha256()
    try:
        source = open_source(location)
        if not source.packed:
            return None
        for piece in unpacked(location, location, source.packed, source.size):
            digest.update(piece)
    except (LogError, OSError):
        return None
    return digest.hexdigest()
