"""Sheets: a head, figures, tables and lists, as plain text for a terminal and as one self-contained page.

`exceed envelope` and `exceed spectrum` fill them; both outputs come from the same sheet, so that they cannot differ.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from exceed.core.findings import CAUTIONS
from exceed.report.layout import Column, Screen, columns, on_point
from exceed.report.page import _environment, _static

Dict = dict[str, Any]


@dataclass(frozen=True, slots=True)
class Sheet:
    """A table with its heading and what is to be said under it. A cell is text; numbers stand on their points."""

    title: str
    heads: tuple[Column, ...] = ()
    rows: tuple[tuple[str, ...], ...] = ()
    said: tuple[str, ...] = ()

    def aligned(self) -> list[tuple[str, ...]]:
        """The rows with the numbers of a right-hand column padded to one point."""
        if not self.rows:
            return []
        sides = list(zip(*self.rows, strict=True))
        done = [on_point(side) if head.right else list(side) for head, side in zip(self.heads, sides, strict=True)]
        return list(zip(*done, strict=True))


@dataclass(frozen=True, slots=True)
class Part:
    """What belongs together: an aeroplane's tables. `figures`: (name in the data, caption), drawn on the page only."""

    title: str
    said: tuple[str, ...] = ()
    figures: tuple[tuple[str, str], ...] = ()
    sheets: tuple[Sheet, ...] = ()


@dataclass(frozen=True, slots=True)
class Paper:
    """The whole output. `lists`: (heading, lines) at the end."""

    title: str
    said: tuple[str, ...] = ()
    parts: tuple[Part, ...] = ()
    lists: tuple[tuple[str, tuple[str, ...]], ...] = ()
    cautions: tuple[str, ...] = field(default=CAUTIONS)


def render_text(paper: Paper, *, width: int | None = None, unicode: bool = True) -> str:
    """The paper as plain text; width None: a pipe, where nothing is squeezed."""
    screen = Screen(None if width is None else max(width, 40), False, unicode)
    lines = screen.wrap(screen.safe(paper.title))
    for text in paper.said:
        lines += screen.wrap(screen.safe(text), "  ")
    for part in paper.parts:
        if part.title:
            lines += ["", *screen.wrap(screen.safe(part.title))]
        for text in part.said:
            lines += screen.wrap(screen.safe(text), "  ")
        for sheet in part.sheets:
            lines += ["", *_sheet(sheet, screen)]
    for title, texts in paper.lists:
        if texts:
            lines += ["", screen.safe(title)]
            for text in texts:
                lines += screen.wrap(screen.safe(text), "  ", "    ")
    lines += ["", *(line for text in paper.cautions for line in screen.wrap(text))]
    return "\n".join(lines) + "\n"


def _sheet(sheet: Sheet, screen: Screen) -> list[str]:
    lines = screen.wrap(screen.safe(sheet.title))
    if sheet.rows:
        cells = [[screen.safe(cell) for cell in row] for row in sheet.aligned()]
        head, body = columns(screen, sheet.heads, cells)
        lines += [head, *body]
    for text in sheet.said:
        lines += screen.wrap(screen.safe(text), "  ", "    ")
    return lines


def render_paper(paper: Paper, figures: Mapping[str, Dict]) -> str:
    """The paper as one HTML page that asks the network for nothing. figures : name -> plotly data of `figures.py`."""
    return (
        _environment()
        .get_template("diagrams.html.j2")
        .render(paper=paper, title=paper.title, numeric=_numeric, **_static(dict(figures)))
    )


def _numeric(sheet: Sheet) -> Sequence[bool]:
    return [head.right for head in sheet.heads]
