"""Lines and columns of a terminal: what does not fit is dropped or wrapped, and a cut is always seen."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

from exceed.report.show import breadth, clip, fill, paint, visible


@dataclass(frozen=True, slots=True)
class Screen:
    """Where a text goes. width None: a pipe, nothing is squeezed. zone: a time zone other than UTC, or None."""

    width: int | None = None
    colour: bool = False
    unicode: bool = True
    units: str = "trade"
    zone: Any = None

    def safe(self, text: object) -> str:
        """Foreign text, safe to print here."""
        return visible(text, unicode=self.unicode)

    def paint(self, text: str, kind: str) -> str:
        return paint(text, kind, self.colour)

    def heading(self, text: str) -> str:
        return self.paint(text, "strong")

    def wrap(self, text: str, first: str = "", rest: str | None = None) -> list[str]:
        """Text (already safe) as lines that fit, the first behind `first`, the others behind `rest`."""
        rest = " " * breadth(first) if rest is None else rest
        if self.width is None:
            return [f"{first}{text}".rstrip()]
        lines, line, fresh = [], first, True
        for word in text.split(" "):
            room = self.width - breadth(line) - (0 if fresh else 1)
            if breadth(word) > room and not fresh:
                lines.append(line.rstrip())
                line, fresh = rest, True
                room = self.width - breadth(line)
            while breadth(word) > room > 0:  # a path longer than the line
                head = clip(word, room, "")
                if not head:
                    break
                lines.append(line + head)
                word = word[len(head) :]
                line, room = rest, self.width - breadth(rest)
            line += ("" if fresh else " ") + word
            fresh = False
        return [*lines, line.rstrip()]

    def listing(self, names: Sequence[str], most: int = 12) -> str:
        """Names in a row, a long row shortened on a terminal with the number of those left out."""
        if self.width is None or len(names) <= most:
            return ", ".join(self.safe(name) for name in names)
        return ", ".join(self.safe(name) for name in names[:most]) + f" and {len(names) - most} more"


@dataclass(frozen=True, slots=True)
class Column:
    """A column: heading, alignment, when it is dropped (1 first, 0 never), the least it may be cut to (0: not)."""

    title: str
    right: bool = False
    drop: int = 0
    least: int = 0


Painter = Callable[[int, str], str]


def columns(
    screen: Screen, heads: Sequence[Column], rows: Sequence[Sequence[str]], indent: int = 2
) -> tuple[str, list[str]]:
    """The heading line and one line a row, columns in line. Cells must be safe; colour them afterwards by `tint`."""
    widths = [
        max([breadth(head.title), *(breadth(row[place]) for row in rows)]) if rows else breadth(head.title)
        for place, head in enumerate(heads)
    ]
    kept = [place for place in range(len(heads)) if any(row[place] for row in rows) or not rows]
    gap = 2 if screen.width is None or screen.width >= 100 else 1
    if screen.width is not None:
        if screen.width < 100:
            indent = min(indent, 1)
        kept, widths = _squeeze(heads, widths, kept, screen.width - indent, gap)
    edge, space = " " * indent, " " * gap

    def line(cells: Sequence[str]) -> str:
        parts = [fill(clip(cells[place], widths[place]), widths[place], right=heads[place].right) for place in kept]
        return (edge + space.join(parts)).rstrip()

    return line([head.title for head in heads]), [line(row) for row in rows]


def _squeeze(
    heads: Sequence[Column], widths: list[int], kept: list[int], room: int, gap: int
) -> tuple[list[int], list[int]]:
    def total(places: Sequence[int], sizes: Sequence[int]) -> int:
        return sum(sizes[place] for place in places) + gap * (len(places) - 1)

    least = [min(size, head.least) if head.least else size for size, head in zip(widths, heads, strict=True)]
    for turn in sorted({heads[place].drop for place in kept if heads[place].drop}):
        if total(kept, least) <= room:
            break
        kept = [place for place in kept if heads[place].drop != turn]
    sizes = list(widths)
    while total(kept, sizes) > room:
        # take from the column that has most to give
        place = max(kept, key=lambda place: (sizes[place] - least[place], sizes[place]))
        if sizes[place] <= 4:
            break
        excess = total(kept, sizes) - room
        spare = sizes[place] - least[place]
        sizes[place] -= min(excess, spare) if spare > 0 else 1
    return kept, sizes


def on_point(texts: Sequence[str]) -> list[str]:
    """Numbers padded so that their points stand in line."""
    heads = [text.partition(".")[0] for text in texts]
    tails = [text[len(head) :] for text, head in zip(texts, heads, strict=True)]
    left, right = max(map(len, heads), default=0), max(map(len, tails), default=0)
    return [f"{head:>{left}}{tail:<{right}}" for head, tail in zip(heads, tails, strict=True)]
