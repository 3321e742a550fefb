"""A table as plain text: aligned, never truncated, the same on a terminal and in a pipe."""

from __future__ import annotations

from collections.abc import Sequence


def plain_table(headings: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    """Lines of text, columns two blanks apart; a column of numbers is set flush right.

    Empty cells are written as `-`, so that every line has the same number of words up to the last column.
    """
    filled = [[cell or "-" for cell in row] for row in rows]
    columns = list(zip(headings, *filled, strict=True))
    aligned = []
    for column in columns:
        width = max(map(len, column))
        right = all(_is_number(cell) for cell in column[1:])
        aligned.append([cell.rjust(width) if right else cell.ljust(width) for cell in column])
    return "\n".join("  ".join(line).rstrip() for line in zip(*aligned, strict=True))


def _is_number(cell: str) -> bool:
    try:
        float(cell)
    except ValueError:
        return cell == "-"
    return True
