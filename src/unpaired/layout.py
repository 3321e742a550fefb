"""A table as plain text: aligned, never truncated, the same on a terminal and in a pipe."""

from __future__ import annotations

from collections.abc import Sequence


def layout(head: Sequence[str], lines: Sequence[Sequence[str]], left: int, left_last: bool = False) -> str:
    """Columns two spaces apart; the first `left` columns (and the last, if asked) are flush left."""
    table = [list(head), *[list(line) for line in lines]]
    widths = [max(len(row[place]) for row in table) for place in range(len(head))]
    text = ""
    for row in table:
        cells = []
        for place, (cell, width) in enumerate(zip(row, widths, strict=True)):
            flush_left = place < left or (left_last and place == len(row) - 1)
            cells.append(cell.ljust(width) if flush_left else cell.rjust(width))
        text += "  ".join(cells).rstrip() + "\n"
    return text
