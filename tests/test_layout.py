"""Tables as plain text."""

from __future__ import annotations

from unpaired.layout import layout


def test_the_first_columns_stand_flush_left_and_the_others_right() -> None:
    assert layout(("name", "value"), [("a", "1.5"), ("bcdef", "-12.25")], left=1) == (
        "name    value\na         1.5\nbcdef  -12.25\n"
    )


def test_a_last_column_of_words_stands_flush_left() -> None:
    assert layout(("name", "value", "source"), [("a", "1.5", "x y")], left=1, left_last=True) == (
        "name  value  source\na       1.5  x y\n"
    )
