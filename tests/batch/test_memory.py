"""A log larger than memory is refused before it is read; the others go on."""

from __future__ import annotations

import gzip
import json
import subprocess
import sys
from pathlib import Path

import pyarrow as pa
import pyarrow.csv
import pyarrow.parquet as pq
import pytest

from exceed.errors import LogError, UsageError
from exceed.read import survey
from exceed.read.memory import available, estimate, require, rows

MANY = 40_000


@pytest.fixture(scope="module")
def table() -> pa.Table:
    time = pa.array([0.125 * k for k in range(MANY)])
    return pa.table(
        {
            "TIME [s]": time,
            "NZ [g]": pa.array([1.0 + 0.001 * (k % 97) for k in range(MANY)]),
            "IAS [kt]": pa.array([90.0 + 0.1 * (k % 53) for k in range(MANY)]),
        }
    )


@pytest.fixture
def log(table, tmp_path) -> Path:
    path = tmp_path / "long.csv"
    pyarrow.csv.write_csv(table, path)
    return path


def scan(*words: str, **more) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "exceed", "scan", *words], capture_output=True, text=True, timeout=120, **more
    )


@pytest.mark.parametrize("packing", ["", ".gz", ".bz2", ".xz", ".zip", ".parquet"])
def test_rows_are_counted_roughly_without_reading_them(log, table, packing):
    import bz2
    import lzma
    import zipfile

    path = log.with_name(f"other{packing}" if packing == ".parquet" else f"long.csv{packing}")
    data = log.read_bytes()
    if packing == ".parquet":
        pq.write_table(table, path)
    elif packing == ".zip":
        with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
            archive.writestr("long.csv", data)
    elif packing:
        path.write_bytes({".gz": gzip, ".bz2": bz2, ".xz": lzma}[packing].compress(data))
    # first lines are shorter, and how well the first block packs is a rough measure
    slack = {"": 0.05, ".gz": 0.05, ".parquet": 0.0}.get(packing, 0.7)
    assert rows(survey(path)) == pytest.approx(MANY, rel=slack)


def test_more_columns_take_more_and_nothing_is_free(log):
    found = survey(log)
    assert 0 < estimate(found, {"load_factor"}) < estimate(found, {"load_factor", "indicated_airspeed"})
    assert estimate(found, None) >= estimate(found, {"load_factor"})


def test_the_line_is_drawn_at_four_fifths_of_what_is_free(log):
    found = survey(log)
    need = estimate(found, None)
    require(found, None, free=int(need / 0.8) + 2)
    with pytest.raises(LogError, match=r"is too large for the memory here: some 4[0-9,]+ rows take about") as caught:
        require(found, None, free=int(need / 0.8) - 2)
    assert caught.value.problems[0].do == "split it, or scan it on a machine with more memory"


def test_the_estimate_covers_what_reading_and_judging_really_take(log, tmp_path):
    """Peak resident memory of whole processes, of a long log less that of a tenth of it."""
    short = tmp_path / "short.csv"
    lines = log.read_text().splitlines(keepends=True)
    heading, body = lines[0], lines[1:]
    short.write_text("".join([heading, *body[: MANY // 10]]))
    longer = tmp_path / "longer.csv"
    longer.write_text(heading + "".join(f"{k * 0.125},{line.split(',', 1)[1]}" for k, line in enumerate(body * 10)))
    peaks = [peak(path) for path in (short, longer)]
    need = estimate(survey(longer), None) - estimate(survey(short), None)
    taken = peaks[1] - peaks[0]
    assert taken < need
    # nor is it so careful that it refuses what would easily fit
    assert need < 4 * taken


def peak(path: Path) -> int:
    code = (
        "import sys; from exceed import pipeline; from exceed.settings import Settings\n"
        "found = pipeline.scan(Settings((sys.argv[1],), jobs=1))\n"
        "assert found.logs[0].status == 'ok', found.logs[0].problem\n"
        # not ru_maxrss, which a process inherits from the one that starts it
        "print([line.split()[1] for line in open('/proc/self/status') if line.startswith('VmHWM')][0])"
    )
    done = subprocess.run([sys.executable, "-c", code, str(path)], capture_output=True, text=True, check=True)
    return int(done.stdout) * 1024


def test_a_log_too_large_is_one_failed_log_and_the_others_go_on(log, day, monkeypatch):
    target = day / "zz-nma" / "long.csv"
    target.write_bytes(log.read_bytes())
    monkeypatch.setenv("EXCEED_MEMORY", "7 MB")
    for jobs in ("1", "2"):
        ended = scan(str(day), "--jobs", jobs, "--json", "-")
        assert ended.returncode == 3
        found = {one["path"]: one for one in json.loads(ended.stdout)["recordings"]}
        large = found.pop("zz-nma/long.csv")
        assert large["status"] == "failed"
        assert "is too large for the memory here" in large["problem"]["problem"]
        assert [path for path, one in found.items() if one["status"] == "failed"] == ["broken.csv"]
        assert "zz-nma/long.csv: is too large for the memory here" in ended.stderr


def test_a_limit_of_the_process_counts(log):
    code = (
        "import resource; from exceed.read.memory import available\n"
        "resource.setrlimit(resource.RLIMIT_AS, (1 << 33, 1 << 33)); print(available())"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert 0 < int(done.stdout) < 1 << 33


@pytest.mark.parametrize(("text", "size"), [("2 MB", 2_000_000), ("1.5 KiB", 1536), ("64", 64), ("3kb", 3000)])
def test_a_limit_can_be_told(monkeypatch, text, size):
    monkeypatch.setenv("EXCEED_MEMORY", text)
    assert available() == size


def test_a_limit_that_is_no_size_is_said_before_anything_is_scanned(monkeypatch, day):
    monkeypatch.setenv("EXCEED_MEMORY", "much")
    with pytest.raises(UsageError, match="'much' is no size of memory"):
        available()
    ended = scan(str(day))
    assert ended.returncode == 2
    assert ended.stdout == ""
    assert ended.stderr.startswith("exceed: EXCEED_MEMORY: 'much' is no size of memory")
