"""The text of `exceed selfcheck`: published check values, recomputed on this machine."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from exceed.core.findings import CAUTIONS
from exceed.report.show import count, visible


def render_checks(results: Sequence[Any], *, all_lines: bool = False) -> str:
    """A line for each source (or each value), failures always in full, then the totals."""
    lines: list[str] = []
    failures = [row for row in results if not row.passed]
    if all_lines:
        lines += [_line(row) for row in results]
    else:
        groups: dict[str, list[Any]] = {}
        for row in results:
            groups.setdefault(row.source, []).append(row)
        for source, rows in groups.items():
            bad = sum(not row.passed for row in rows)
            word = "pass" if bad == 0 else f"FAIL {bad}"
            lines.append(f"{word:8s} {len(rows):4d}  {visible(source)}")
        lines += [_line(row) for row in failures]
    passed = len(results) - len(failures)
    lines.append("")
    lines.append(f"{count(len(results), 'value')} recomputed: {passed} pass, {len(failures)} fail")
    lines.extend(CAUTIONS)
    return "\n".join(lines) + "\n"


def _line(row: Any) -> str:
    word = "pass" if row.passed else "FAIL"
    return (
        f"{word} {row.id} {row.quantity}: expected {row.expected}, got {row.got}, deviation {row.deviation},"
        f" tolerance {row.tolerance}; {visible(row.source)}; {visible(row.how)}"
    )
