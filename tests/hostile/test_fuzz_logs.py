"""Pieces of the sample day with a few bytes changed: each is read or refused, and what is read adds up.

Seeded and short; `EXCEED_FUZZ=50 pytest tests/hostile/test_fuzz_logs.py` looks fifty times longer.
"""

from __future__ import annotations

import gzip
import json
from functools import lru_cache
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from exceed import pipeline
from exceed.prepare import Run, prepare
from exceed.read.find import LogPath
from exceed.report.describe import describe
from exceed.report.summary import summarise
from exceed.report.table import render_table
from exceed.report.write import to_json
from exceed.settings import Settings
from hostile import mutations

SAMPLES = Path(__file__).resolve().parents[2] / "sample_logs"
LINES = 240


@lru_cache(maxsize=1)
def bases() -> dict[str, bytes]:
    """Heads of the text logs, one of them packed, and a short Parquet log."""
    import io

    import pyarrow.parquet as pq

    found = {}
    for path in sorted((SAMPLES).glob("zz-*/*")):
        if path.suffix == ".parquet":
            box = io.BytesIO()
            # small pages, so that an edit may hit pages, their headers or the footer
            pq.write_table(pq.read_table(path).slice(4000, 300), box, data_page_size=1024)
            found[path.name] = box.getvalue()
            continue
        data = gzip.decompress(path.read_bytes()) if path.suffix == ".gz" else path.read_bytes()
        lines = data.split(b"\n")
        # the heading, and a stretch of flight behind it
        found[path.name.removesuffix(".gz")] = b"\n".join(lines[: LINES // 2] + lines[4000 : 4000 + LINES // 2]) + b"\n"
    packed = next(name for name in sorted(found) if not name.endswith(".parquet"))
    found[packed + ".gz"] = gzip.compress(found[packed], mtime=0)
    return found


@lru_cache(maxsize=1)
def run() -> Run:
    return prepare(
        Settings(
            paths=(".",), aircraft="aerobatic", mass="900 kg", rules=("airframe", "aerobatic", "handling", "landing")
        ),
        [],
    )


def held(name: str, data: bytes, folder: Path) -> dict[str, Any]:
    """The log's part of the summary, after the checks that hold for every log."""
    path = folder / name
    path.write_bytes(data)
    log = LogPath(name, str(path), str(folder))
    outcome = pipeline.assess(log, run())
    assert "internal error" not in str(outcome.problem)
    summary = summarise(pipeline.day(run(), [outcome]))
    text = to_json(summary)  # refuses what is not finite
    assert json.loads(text) == json.loads(to_json(json.loads(text)))
    for width in (60, None):
        assert render_table(summary, width=width, colour=False, unicode=True)
    (found,) = summary["recordings"]
    if found["status"] == "failed":
        assert outcome.problem is not None
        assert outcome.problem.place.startswith(name)
        assert outcome.problem.do or outcome.problem.expected
        return found  # type: ignore[no-any-return]
    describe(outcome, width=80, colour=False, unicode=True)
    for row in found["assessment"]:
        total = row["assessed_s"] + row["unassessed_s"] + row["not_applicable_s"]
        assert row["flight"] is not None or total == pytest.approx(found["recorded_s"], rel=1e-6, abs=0.02)
    for event in (*found["events"], *found["undecided"]):
        assert event["start_s"] <= event["end_s"]
        assert 0.0 <= event["probability"] <= 1.0
    return found  # type: ignore[no-any-return]


def test_the_pieces_are_good_logs_before_they_are_changed(tmp_path: Path) -> None:
    for name, data in bases().items():
        found = held(name, data, tmp_path)
        assert found["status"] == "ok", (name, found["problem"])
        assert len(found["channels"]) > 2, name


@settings(
    max_examples=mutations.examples(120), deadline=None, derandomize=True, database=None,
    suppress_health_check=list(HealthCheck), phases=mutations.PHASES,
)  # fmt: skip
@given(st.data())
def test_whatever_happens_to_a_good_log_it_is_answered(
    tmp_path_factory: pytest.TempPathFactory, data: st.DataObject
) -> None:
    name = data.draw(st.sampled_from(sorted(bases())))
    changed = mutations.apply(bases()[name], data.draw(mutations.edits(mutations.LOG_WORDS)))
    held(name, changed, tmp_path_factory.getbasetemp())
