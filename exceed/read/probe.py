"""Windows spread over a large log settle what its headings leave open; the whole is read for wanted columns only."""

from __future__ import annotations

import re
from collections.abc import Sequence

from exceed.read import evidence
from exceed.read.evidence import Settled
from exceed.read.look import Column, Survey
from exceed.read.raw import RawChannel

LARGE = 24 << 20
WINDOWS = 48
WINDOW = 48 << 10


def worth_it(survey: Survey) -> bool:
    """Is the log so large that reading more columns than wanted costs more than reading windows?"""
    layout = survey.layout
    return (
        survey.source.direct
        and survey.source.size > LARGE
        and layout is not None
        and not layout.squeeze
        and not layout.uneven
    )


def windows(survey: Survey) -> bytes:
    """Whole lines of data from evenly spread places, first and last included."""
    assert survey.layout is not None
    pieces = []
    with open(survey.source.location, "rb") as stream:
        head = stream.read(8 << 20)
        ends = [match.end() for match in re.finditer(rb"\r\n|\r|\n", head)]
        first = ends[survey.layout.skip - 1] if survey.layout.skip else 0
        for k in range(WINDOWS):
            place = first + (survey.source.size - WINDOW - first) * k // (WINDOWS - 1)
            stream.seek(max(first, place))
            block = stream.read(WINDOW)
            begin = 0
            if place > first:
                match = re.search(rb"\r\n|\r|\n", block)
                begin = match.end() if match else len(block)
            end = max(block.rfind(b"\n"), block.rfind(b"\r")) + 1
            if end > begin:
                pieces.append(block[begin:end])
    return b"".join(pieces)


def probe(survey: Survey, columns: Sequence[Column]) -> dict[int, Settled] | None:
    """Column index -> what the data settle; None where the windows do not tell (then the whole is read for it)."""
    from exceed.errors import LogError
    from exceed.read.instants import instants
    from exceed.read.loading import parse_text
    from exceed.read.raw import raw_channels
    from exceed.read.settle import placed

    try:
        parsed = parse_text(survey, list(columns), windows(survey))
        if parsed.rows < 500:
            return None
        raws, _, _ = raw_channels(survey, columns, parsed, quiet=True)
        time = instants(survey, parsed, raws)
    except LogError:
        return None
    for raw in raws:
        placed(raw, time)
    found = evidence.settle(raws, time.time, survey.declared)
    return {one.raw.column.index: one for one in found}


def carried(raws: Sequence[RawChannel], known: dict[int, Settled]) -> list[Settled] | None:
    """The whole log's channels with what the windows settled; None if one was not among them."""
    out = []
    for raw in raws:
        one = known.get(raw.column.index)
        if one is None:
            return None
        if one.problem == "holds no value" and len(raw.values):
            return None
        raw.column = one.raw.column
        one.raw = raw
        if len(raw.values) == 0:
            one.problem = "holds no value"
        out.append(one)
    return out


__all__ = ["carried", "probe", "windows", "worth_it"]
