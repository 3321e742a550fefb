"""Plain PySCF defaults against the tool, case by case.

    python tests/hard_cases/table.py [--starts 1] [CASE...]

`--starts` is how many first densities the tool is tried from (1 to 4); it counts as right only if all of them end in
the lowest known solution, converged and stable. Plain results come from plain.csv, the lowest from lowest.csv.
"""

from __future__ import annotations

import sys
import time

from cases import STARTS, Case, cases

from unpaired.errors import CalculationError


def verdict(case: Case, count: int) -> tuple[str, str, float]:
    """`right` or what is wrong; the label of the state taken and how many solutions are listed; seconds."""
    begun, wrong, label = time.process_time(), [], ""
    for start in STARTS[:count]:
        try:
            state = case.solve(start)
        except CalculationError as error:
            wrong.append(f"from {start}: {error.message[:60]}")
            continue
        label = f"{state.solution.label} ({len(state.solutions)})"
        above = state.energy_Eh - case.expected_Eh
        if not case.is_lowest(state):
            wrong.append(f"from {start}: {1000 * above:+.3f} mEh, stable {state.stable}")
        elif above < -case.tolerance_Eh:
            label += f", {-1000 * above:.3f} mEh below the search"
    return "; ".join(wrong) or "right", label, time.process_time() - begun


def main() -> None:
    words = sys.argv[1:]
    count = int(words[words.index("--starts") + 1]) if "--starts" in words else 1
    wanted = {word for word in words if not word.startswith("--") and not word.isdigit()}
    right = [0, 0, 0]
    print("| case | lowest / Eh | plain PySCF | the tool | state taken (solutions listed) | CPU / s |")
    print("| --- | --- | --- | --- | --- | --- |")
    for case in cases():
        if wanted and case.name not in wanted:
            continue
        ours, label, seconds = verdict(case, count)
        plain = case.plain_verdict
        right = [right[0] + 1, right[1] + (plain == "right"), right[2] + (ours == "right")]
        row = f"{case.title} | {case.expected_Eh:.6f} | {plain} | {ours} | {label} | {seconds:.1f}"
        print(f"| {row} |", flush=True)
    print(
        f"\nof {right[0]}: plain PySCF right in {right[1]}, the tool right in {right[2]} (from {count} starts)"
    )


if __name__ == "__main__":
    main()
