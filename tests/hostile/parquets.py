"""Hostile Parquet: cut, damaged, odd types, absurd times, a bomb."""

from __future__ import annotations

import gzip
import io
from pathlib import Path

from hostile.case import Case, holding, text


def parquet(columns: dict[str, object] | None = None, **options: object) -> bytes:
    """A Parquet file of the good log's columns, or of these."""
    import numpy as np
    import pyarrow as pa
    import pyarrow.parquet as pq

    if columns is None:
        k = np.arange(400)
        columns = {"time_s": k / 8, "nz_g": 1 + 0.3 * np.sin(k / 7), "ias_kt": 100 + 8 * np.sin(k / 31)}
    box = io.BytesIO()
    pq.write_table(pa.table(columns), box, **options)  # type: ignore[arg-type]
    return box.getvalue()


def bomb(path: Path) -> None:
    """Fifty million rows in 600 kB."""
    import numpy as np
    import pyarrow as pa
    import pyarrow.parquet as pq

    block = pa.table({name: np.ones(1_000_000) for name in ("time_s", "nz_g", "ias_kt")})
    with pq.ParquetWriter(path, block.schema) as writer:
        for _ in range(50):
            writer.write_table(block)


def parquet_cases() -> list[Case]:
    import datetime

    import numpy as np
    import pyarrow as pa

    k = np.arange(400)
    good = {"time_s": k / 8, "nz_g": 1 + 0.3 * np.sin(k / 7), "ias_kt": 100 + 8 * np.sin(k / 31)}
    whole = parquet()
    middle = bytearray(whole)
    middle[len(whole) // 3 : len(whole) // 3 + 60] = b"\xff" * 60
    footer = bytearray(whole)
    footer[-200:-100] = b"\xaa" * 100
    length = bytearray(whole)
    length[-8:-4] = b"\xff\xff\xff\x7f"
    deep: pa.DataType = pa.float64()
    for _ in range(40):
        deep = pa.list_(deep)
    early = pa.array(
        [datetime.datetime(1, 1, 1) + datetime.timedelta(seconds=float(x) / 8) for x in k], pa.timestamp("us")
    )
    late = pa.array(
        [datetime.datetime(9999, 12, 31, 23, 59, 0) + datetime.timedelta(seconds=float(x) / 8) for x in k],
        pa.timestamp("us"),
    )
    extreme = pa.array([2**63 - 1 - int(x) for x in k], pa.int64()).cast(pa.timestamp("us"), safe=False)
    made = {
        "pq-truncated.parquet": (whole[: len(whole) // 2], "failed", "no whole Parquet file"),
        "pq-footer-cut.parquet": (whole[:-1], "failed", "no whole Parquet file"),
        "pq-damaged-pages.parquet": (bytes(middle), "done", ""),
        "pq-damaged-footer.parquet": (bytes(footer), "failed", ""),
        "pq-footer-length.parquet": (bytes(length), "failed", ""),
        "pq-magic-only.parquet": (b"PAR1PAR1", "failed", "no whole Parquet file"),
        "pq-text.parquet": (text().encode(), "done", ""),
        "pq-as-csv.csv": (whole, "done", ""),
        "pq-no-rows.parquet": (parquet({n: pa.array([], pa.float64()) for n in good}), "failed", "holds no rows"),
        "pq-no-columns.parquet": (parquet({}), "failed", ""),
        "pq-one-row.parquet": (parquet({n: v[:1] for n, v in good.items()}), "done", ""),
        "pq-all-null.parquet": (parquet({n: pa.nulls(400, pa.float64()) for n in good}), "failed", ""),
        "pq-nulls-type.parquet": (parquet({**good, "nz_g": pa.nulls(400)}), "done", ""),
        "pq-no-time.parquet": (parquet({n: v for n, v in good.items() if n != "time_s"}), "failed", ""),
        "pq-strings.parquet": (parquet({n: [str(x) for x in v] for n, v in good.items()}), "done", ""),
        "pq-words.parquet": (parquet({n: ["word"] * 400 for n in good}), "failed", ""),
        "pq-nested.parquet": (parquet({**good, "raw": pa.array([None] * 400, deep)}), "done", ""),
        "pq-struct.parquet": (parquet({**good, "s": [{"nz_g": 1.0}] * 400}), "done", ""),
        "pq-bool.parquet": (parquet({**good, "wow": [bool(x % 2) for x in k]}), "done", ""),
        "pq-decimal.parquet": (
            parquet({**good, "d": pa.array([1] * 400, pa.int64()).cast(pa.decimal128(38, 10))}),
            "done",
            "",
        ),
        "pq-nan.parquet": (parquet({**good, "nz_g": np.full(400, np.nan)}), "done", ""),
        "pq-inf.parquet": (parquet({**good, "nz_g": np.where(k % 5, good["nz_g"], np.inf)}), "done", ""),
        "pq-nan-time.parquet": (parquet({**good, "time_s": np.where(k % 5, good["time_s"], np.nan)}), "done", ""),
        "pq-all-nan-time.parquet": (parquet({**good, "time_s": np.full(400, np.nan)}), "failed", ""),
        "pq-huge-int.parquet": (parquet({**good, "counter": np.full(400, 2**63 - 1)}), "done", ""),
        "pq-uint64.parquet": (parquet({**good, "counter": np.full(400, 2**64 - 1, np.uint64)}), "done", ""),
        "pq-half.parquet": (parquet({**good, "nz_g": good["nz_g"].astype(np.float16)}), "done", ""),
        "pq-dictionary.parquet": (
            parquet({**good, "mode": pa.array(["AP", "OFF"] * 200).dictionary_encode()}),
            "done",
            "",
        ),
        "pq-binary-column.parquet": (parquet({**good, "blob": [b"\xff\xfe"] * 400}), "done", ""),
        "pq-year-1.parquet": (parquet({"utc": early, "nz_g": good["nz_g"]}), "done", ""),
        "pq-year-9999.parquet": (parquet({"utc": late, "nz_g": good["nz_g"]}), "done", ""),
        "pq-beyond-time.parquet": (parquet({"utc": extreme, "nz_g": good["nz_g"]}), "failed", ""),
        "pq-date32.parquet": (
            parquet({**good, "date": pa.array([2**31 - 1] * 400, pa.int32()).cast(pa.date32())}),
            "done",
            "",
        ),
        "pq-durations.parquet": (
            parquet({"t": pa.array(k * 125_000, pa.duration("us")), "nz_g": good["nz_g"]}),
            "done",
            "",
        ),
        "pq-empty-name.parquet": (parquet({**good, "": k}), "done", ""),
        "pq-odd-names.parquet": (
            parquet({**good, "\x1b[31mIAS": k, "a\nb": k, "\u202eNZ": k, "[red]x[/red]": k}),
            "done",
            "",
        ),
        "pq-many-groups.parquet": (parquet(good, row_group_size=1), "done", ""),
        "pq-wide.parquet": (parquet({f"c{n}": [1.0, 2.0] for n in range(9000)}), "failed", "9000 columns"),
        "pq-list-time.parquet": (parquet({**good, "time_s": [[float(x)] for x in k]}), "failed", ""),
        "pq-packed.parquet.gz": (gzip.compress(whole), "failed", "packed Parquet"),
    }
    return [
        *(Case(name, holding(data), outcome, says) for name, (data, outcome, says) in made.items()),
        Case("pq-bomb.parquet", bomb, "failed", "too large for the memory"),
    ]
