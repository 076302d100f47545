"""Hostile text tables: nothing, no text, letters, what screens obey, shapes, numbers, clocks."""

from __future__ import annotations

import math
from collections.abc import Callable

from hostile.case import HEADING, Case, column, holding, rows, text


def csv_cases() -> list[Case]:
    good = text()
    noted = "".join(f"# note {k}\n" for k in range(30))
    made: dict[str, tuple[bytes | str, str, str]] = {
        # nothing, or next to nothing
        "empty.csv": ("", "failed", "is empty"),
        "newline.csv": ("\n", "failed", "holds no text"),
        "blanks.csv": (" \t\r\n" * 500, "failed", "holds no text"),
        "bom-only.csv": (b"\xef\xbb\xbf", "failed", "holds no text"),
        "zeros.csv": (bytes(5000), "failed", "holds no text"),
        "one-byte.csv": ("7", "failed", ""),
        "commas.csv": (",,,,\n" * 500, "failed", ""),
        "quotes.csv": ('"' * 5000, "failed", ""),
        "quote-lines.csv": ('"\n' * 5000, "failed", ""),
        "header-only.csv": (HEADING + "\n", "failed", ""),
        "header-no-newline.csv": (HEADING, "failed", ""),
        "header-twice.csv": ((HEADING + "\n") * 400, "failed", ""),
        "one-row.csv": (text(count=1), "done", ""),
        "two-rows.csv": (text(count=2), "done", ""),
        "one-column.csv": ("NZ\n" + "\n".join(row.split(",")[1] for row in rows()) + "\n", "failed", ""),
        "no-header.csv": ("\n".join(rows()) + "\n", "failed", ""),
        "no-time.csv": (
            "NZ [g],IAS [kt]\n" + "\n".join(",".join(r.split(",")[1:3]) for r in rows()) + "\n",
            "failed",
            "",
        ),
        "no-channel.csv": (
            "time [s],SPARE 1,SPARE 2\n" + "\n".join(",".join(r.split(",")[:3]) for r in rows()) + "\n",
            "failed",
            "",
        ),
        "time-only.csv": ("time [s]\n" + "\n".join(r.split(",")[0] for r in rows()) + "\n", "failed", ""),
        # not text
        "binary.csv": (bytes(range(256)) * 400, "failed", "binary"),
        "elf.csv": (b"\x7fELF\x02\x01\x01" + bytes(64) + bytes(range(1, 256)) * 16, "failed", ""),
        "png.csv": (b"\x89PNG\r\n\x1a\n" + bytes(range(200)) * 50, "failed", ""),
        "html.csv": ("<html><body><p>404</p></body></html>\n" * 50, "failed", ""),
        "json.csv": ('{"a": [1, 2, 3]}\n' * 400, "failed", ""),
        "prose.csv": ("Dear all, find the log attached.\n" * 100, "failed", ""),
        "script.csv": ("#!/bin/sh\nrm -rf /\n" * 100, "failed", ""),
        "sqlite.csv": (b"SQLite format 3\x00" + bytes(4000), "failed", ""),
        "sync-words.csv": (b"\x47\x02" * 4000, "failed", ""),
        # letters
        "utf16.csv": (good.encode("utf-16"), "done", ""),
        "utf16-no-bom.csv": (good.encode("utf-16-le"), "done", ""),
        "utf32.csv": (good.encode("utf-32"), "done", ""),
        "utf16-odd.csv": (good.encode("utf-16")[:-1], "done", ""),
        "utf7-bom.csv": (b"+/v8-" + good.encode(), "done", ""),
        "latin.csv": (
            text(HEADING + ",OIL T [\xb0C]").replace("\n", ",90\n").replace("[\xb0C],90", "[\xb0C]").encode("latin-1"),
            "done",
            "",
        ),
        "bad-utf8-cell.csv": (good.encode().replace(b"1.0000", b"\xff\xfe\xfa", 1), "done", ""),
        "surrogates.csv": (good.replace("NZ", "NZ").encode().replace(b"PALT", b"PALT \xed\xa0\x80"), "done", ""),
        "nul-cells.csv": (good.encode().replace(b"100.", b"10\x000.", 5), "done", ""),
        "nul-tail.csv": (good.encode() + bytes(100_000), "done", ""),
        "ff-tail.csv": (good.encode() + b"\xff" * 100_000, "done", ""),
        "ctrl-z.csv": (good + "\x1a", "done", ""),
        "bidi.csv": (text(HEADING.replace("PALT", "\u202ePALT\u202c")), "done", ""),
        "zero-width.csv": (text(HEADING.replace("NZ", "N\u200bZ")), "done", ""),
        "fullwidth-digits.csv": (column(1, "１.０"), "done", ""),
        "arabic-digits.csv": (column(1, "١.٢"), "done", ""),
        "unicode-minus.csv": (column(1, "\u22121.0", slice(10, 12)), "done", ""),
        "unicode-space.csv": (text().replace(",", "\u00a0,"), "done", ""),
        "line-separators.csv": (good.replace("\n", "\u2028"), "failed", ""),
        "cr-only.csv": (good.replace("\n", "\r"), "done", ""),
        "mixed-ends.csv": (good.replace("\n", "\r\n", 200), "done", ""),
        "crcrlf.csv": (good.replace("\n", "\r\r\n"), "done", ""),
        "combining.csv": (
            text(HEADING + "," + "Z" + "\u0301" * 5000).replace("\n", ",1\n").replace("\u0301,1", "\u0301"),
            "done",
            "",
        ),
        # what a screen or another program might obey
        "escape-heading.csv": (text(HEADING.replace("PALT", "\x1b]0;owned\x07\x1b[2JPALT")), "done", ""),
        "escape-cells.csv": (column(1, "\x1b[31m1.0\x1b[0m", slice(20, 24)), "done", ""),
        "markup-heading.csv": (
            text("time [s],NZ [g],[bold red]IAS[/bold red],[link=file:///x]PALT[/link]"),
            "done",
            "",
        ),
        "html-heading.csv": (text("time [s],NZ [g],IAS [kt],<script>alert(1)</script>"), "done", ""),
        "formula-heading.csv": (text("time [s],NZ [g],=cmd|'/c calc'!A0,@SUM(1+1)"), "done", ""),
        "formula-cells.csv": (column(3, "=1+1"), "done", ""),
        "preamble-escape.csv": ("# Registration: \x1b[2J<b>[red]ZZ-X\n" + good, "done", ""),
        "preamble-path.csv": ("# Registration: ../../etc/passwd\n" + good, "done", ""),
        "preamble-long.csv": ("# Registration: " + "Z" * 100_000 + "\n" + good, "done", ""),
        "preamble-many.csv": (noted * 50 + good, "done", ""),
        "template-heading.csv": (text("time [s],NZ [g],{{7*7}},%s%n${x}"), "done", ""),
        # shapes
        "wide-8000.csv": (
            ",".join(f"c{n}" for n in range(8000)) + "\n" + (",".join("1" * 8000) + "\n") * 5,
            "failed",
            "",
        ),
        "wide-million.csv": (
            b",".join(b"c" for _ in range(1_000_000)) + b"\n" + b",".join(b"1" for _ in range(1_000_000)) + b"\n",
            "failed",
            "",
        ),
        "ragged.csv": (
            "\n".join(",".join(r.split(",") * (1 + k % 3)) for k, r in enumerate([HEADING, *rows()])) + "\n",
            "failed",
            "",
        ),
        "short-rows.csv": (
            HEADING + "\n" + "\n".join(",".join(r.split(",")[: 1 + k % 4]) for k, r in enumerate(rows())) + "\n",
            "failed",
            "",
        ),
        "trailing-commas.csv": (good.replace("\n", ",,,\n"), "done", ""),
        "same-headings.csv": (text("NZ,NZ,NZ,NZ"), "failed", ""),
        "same-time.csv": (text("time [s],time [s],IAS [kt],PALT [ft]"), "done", ""),
        "unnamed.csv": (text(",,,"), "failed", ""),
        "long-name.csv": (text("time [s],NZ [g],IAS [kt]," + "P" * 200_000), "done", ""),
        "long-cell.csv": (text(r100="12.5,1," + "9" * 300_000 + ",3100"), "done", ""),
        "open-quote.csv": (text(r100='12.5,"1,100,3100'), "done", ""),
        "quote-newline.csv": (text(r100='12.5,1,"10\n0",3100'), "done", ""),
        "quoted-all.csv": (
            "\n".join(",".join(f'"{c}"' for c in r.split(",")) for r in good.splitlines()) + "\n",
            "done",
            "",
        ),
        "nested-quotes.csv": (good.replace("NZ [g]", '"NZ ""x"" [g]"'), "done", ""),
        "semicolon-decimal-comma.csv": (good.replace(",", ";").replace(".", ","), "done", ""),
        "pipes.csv": (good.replace(",", "|"), "done", ""),
        "header-every-10.csv": (
            HEADING + "\n" + "\n".join("\n".join([*rows()[k : k + 10], HEADING]) for k in range(0, 400, 10)) + "\n",
            "done",
            "",
        ),
        "two-logs.csv": (good + "\n\nALT,SPEED\n" + "1,2\n" * 300, "done", ""),
        "cut-in-row.csv": (good[:-9], "done", ""),
        "cut-in-number.csv": (good[:-1] + "\n50.0,1.", "done", ""),
        "cut-in-utf8.csv": (good.encode() + "50.0,é".encode()[:-1], "done", ""),
        # numbers
        "nan-all.csv": (column(1, "nan"), "done", ""),
        "inf-all.csv": (column(1, "inf"), "done", ""),
        "inf-some.csv": (column(1, "-inf", slice(10, 20)), "done", ""),
        "huge.csv": (column(1, "1e308"), "done", ""),
        "huge-mixed.csv": (column(1, "1e308", slice(0, 400, 2)), "done", ""),
        "overflow.csv": (column(1, "1e999", slice(10, 12)), "done", ""),
        "denormal.csv": (column(1, "5e-324"), "done", ""),
        "negative-zero.csv": (column(1, "-0.0"), "done", ""),
        "hex.csv": (column(1, "0x1p3"), "done", ""),
        "words.csv": (column(1, "n/a"), "done", ""),
        "words-everywhere.csv": (HEADING + "\n" + "a,b,c,d\n" * 400, "failed", ""),
        "thousands.csv": (column(3, '"3,100"'), "done", ""),
        "underscores.csv": (column(3, "3_100"), "done", ""),
        "constant.csv": (HEADING + "\n" + "\n".join(f"{k / 8},1,100,3000" for k in range(400)) + "\n", "done", ""),
        "all-zero.csv": (HEADING + "\n" + "0,0,0,0\n" * 400, "failed", ""),
        "many-digits.csv": (column(1, "1." + "0" * 4000 + "1"), "done", ""),
        "exponent-digits.csv": (column(1, "1e" + "9" * 300, slice(5, 9)), "done", ""),
    }
    return [Case(name, holding(data), outcome, says) for name, (data, outcome, says) in made.items()]


def clock_cases() -> list[Case]:
    """Clocks from the year 0 to 9999, standing, backward, jumping, absurd."""

    def stamped(stamp: Callable[[int], str], heading: str = "UTC", count: int = 400) -> str:
        lines = [f"{heading},NZ [g],IAS [kt]"]
        lines += [f"{stamp(k)},{1 + 0.3 * math.sin(k / 7):.4f},{100 + 8 * math.sin(k / 31):.2f}" for k in range(count)]
        return "\n".join(lines) + "\n"

    def timed(time: Callable[[int], str]) -> str:
        return stamped(time, "time [s]")

    made = {
        "clock-year-0.csv": (stamped(lambda k: f"0000-01-01T00:{k // 60:02d}:{k % 60:02d}Z"), "done"),
        "clock-year-1.csv": (stamped(lambda k: f"0001-01-01T00:{k // 60:02d}:{k % 60:02d}Z"), "done"),
        "clock-year-1969.csv": (stamped(lambda k: f"1969-12-31T23:{50 + k // 60:02d}:{k % 60:02d}Z"), "done"),
        "clock-year-9999.csv": (stamped(lambda k: f"9999-12-31T23:{50 + k // 60:02d}:{k % 60:02d}Z"), "done"),
        "clock-year-99999.csv": (stamped(lambda k: f"99999-12-31T23:{50 + k // 60:02d}:{k % 60:02d}Z"), "failed"),
        "clock-month-13.csv": (stamped(lambda k: f"2031-13-40T25:{k // 60:02d}:{k % 60:02d}Z"), "failed"),
        "clock-second-60.csv": (stamped(lambda k: f"2031-06-30T23:{59 if k < 60 else 60}:{k % 61:02d}Z"), "done"),
        "clock-feb-29.csv": (stamped(lambda k: f"2031-02-29T10:{k // 60:02d}:{k % 60:02d}Z"), "done"),
        "clock-centuries.csv": (stamped(lambda k: f"{1000 + 20 * k:04d}-01-01T00:00:00Z"), "failed"),
        "clock-epoch-end.csv": (stamped(lambda k: f"{253402300799 + k}", "epoch"), "done"),
        "clock-epoch-huge.csv": (stamped(lambda k: f"{10**18 + k}", "unix time"), "failed"),
        "clock-epoch-negative.csv": (stamped(lambda k: f"{-(10**10) + k}", "unix time"), "done"),
        "clock-huge.csv": (timed(lambda k: f"{1e300 + k * 1e290!r}"), "failed"),
        "clock-wide-span.csv": (timed(lambda k: f"{k * 1e12:.0f}"), "failed"),
        "clock-tiny.csv": (timed(lambda k: f"{k * 1e-12!r}"), "failed"),
        "clock-inf.csv": (timed(lambda k: "inf"), "failed"),
        "clock-nan-some.csv": (timed(lambda k: "nan" if k % 3 else f"{k / 8}"), "done"),
        "clock-standing.csv": (timed(lambda k: "5"), "failed"),
        "clock-backward.csv": (timed(lambda k: f"{(400 - k) / 8}"), "failed"),
        "clock-sawtooth.csv": (timed(lambda k: f"{(k % 10) / 8}"), "done"),
        "clock-alternating.csv": (timed(lambda k: f"{(k if k % 2 else 1000 - k) / 8}"), "failed"),
        "clock-one-jump.csv": (timed(lambda k: f"{k / 8 if k < 200 else 1e15 + k / 8!r}"), "done"),
        "clock-back-jump.csv": (timed(lambda k: f"{k / 8 if k < 200 else -1e15 + k / 8!r}"), "done"),
        "clock-words.csv": (timed(lambda k: "noon"), "failed"),
        "clock-empty.csv": (timed(lambda k: ""), "failed"),
        "clock-random.csv": (timed(lambda k: f"{(k * 7919) % 4001 / 8}"), "failed"),
        "clock-mixed-kinds.csv": (stamped(lambda k: f"2031-05-02T09:00:{k % 60:02d}Z" if k % 2 else f"{k}"), "done"),
        "clock-zones.csv": (
            stamped(lambda k: f"2031-05-02T09:{k // 60:02d}:{k % 60:02d}{'+14:00' if k % 2 else '-12:00'}"),
            "failed",
        ),
        "clock-zone-huge.csv": (stamped(lambda k: f"2031-05-02T09:{k // 60:02d}:{k % 60:02d}+99:99"), "failed"),
    }
    return [Case(name, holding(data), outcome) for name, (data, outcome) in made.items()]
