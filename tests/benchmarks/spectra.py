"""How long line lists and curves take: python tests/benchmarks/spectra.py prints markdown."""

from __future__ import annotations

import sys
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent.parent))

from spin_samples import system

from unpaired.spectrum.curve import Width, draw
from unpaired.spectrum.lines import line_list
from unpaired.spectrum.shapes import Shape

CASES = {
    "12 + 4 + 2 protons, second order": (system(("1H", 12, 0.65), ("1H", 4, 0.2), ("1H", 2, 0.7)), "second"),
    "16 different protons, second order": (
        system(*(("1H", 1, 0.1 + 0.01 * k * k) for k in range(16))),
        "second",
    ),
    "20 different protons, second order": (
        system(*(("1H", 1, 0.1 + 0.01 * k * k) for k in range(20))),
        "second",
    ),
    "3 + 1 nuclei (methyl, 13C), exact": (system(("1H", 3, -2.3), ("13C", 1, 3.8)), "exact"),
    "10 different protons (1024 states), exact": (
        system(*(("1H", 1, 0.1 + 0.03 * k * k) for k in range(10))),
        "exact",
    ),
}


def main() -> None:
    """Print processor seconds, the best of three."""
    print("| spin system | lines | line list / s | curve / s |")
    print("| --- | ---: | ---: | ---: |")
    for name, (one, order) in CASES.items():
        times = []
        for _ in range(3):
            start = time.process_time()
            lines = line_list([(one, 1.0)], frequency_MHz=9500.0, width_mT=0.1, order=order)
            middle = time.process_time()
            draw(lines, Width(0.1), Shape(0.1), lines.sweep.axis_per_mT)
            times.append((middle - start, time.process_time() - middle))
        listed, drawn = (min(column) for column in zip(*times, strict=True))
        print(f"| {name} | {len(lines)} | {listed:.4f} | {drawn:.4f} |")


if __name__ == "__main__":
    main()
