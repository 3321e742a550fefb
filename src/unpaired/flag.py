"""A Flag: one finding about a number, with the limit that it passed and what to do."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Severity = Literal["note", "caution", "bad"]
SEVERITIES: tuple[Severity, ...] = ("note", "caution", "bad")


@dataclass(frozen=True)
class Flag:
    """A diagnostic that stands beside the number it spoils."""

    code: str
    """Short and stable, such as `contaminated`."""
    severity: Severity
    """note: good to know; caution: look before you lean on it; bad: do not use the number."""
    advice: str
    """One sentence."""
    value: float | None = None
    limit: float | None = None
    level: str | None = None
    """Level id, None for the whole radical."""
    atom: str | None = None
    """Atom label, None for the whole level."""

    def row(self, radical: str) -> dict[str, object]:
        """The row of flags.csv."""
        return {
            "radical": radical,
            "level": self.level,
            "atom": self.atom,
            "code": self.code,
            "severity": self.severity,
            "value": self.value,
            "limit": self.limit,
            "advice": self.advice,
        }


def join_codes(flags: list[Flag]) -> str:
    """Codes joined by `;`, each once, worst first."""
    ordered = sorted(flags, key=lambda flag: -SEVERITIES.index(flag.severity))
    return ";".join(dict.fromkeys(flag.code for flag in ordered))


def worst(flags: list[Flag]) -> Severity:
    """The highest severity among flags (at least one)."""
    return max((flag.severity for flag in flags), key=SEVERITIES.index)
