"""Computed against measured couplings of finished runs, per group, with the mean absolute error per nucleus.

    unpaired run recipes/*.yaml; python tests/benchmarks/against_measured.py results/*

prints markdown. The last level of each recipe is compared; magnitudes where the sign is unknown. Averaged
couplings are taken where the result has them. The limit is that of the tests: 15 % or 0.08 mT, whichever is larger;
measured values that are held uncertain decide nothing.
"""

from __future__ import annotations

import sys
from collections import defaultdict
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent.parent))

from hits import MISSES

from unpaired import load_result


def main() -> None:
    """Print the table."""
    errors: dict[str, list[float]] = defaultdict(list)
    reasons: dict[str, list[str]] = defaultdict(list)
    print(
        "| radical | atoms | isotope | computed / mT | measured / mT | error / mT | within limit | from memory |"
    )
    print("| --- | --- | --- | --- | --- | --- | --- | --- |")
    for folder in map(Path, sys.argv[1:]):
        result = load_result(folder)
        rows = {row["atom"]: row for row in result.rows("couplings", result.level_id())}
        for item in result.recipe["measured"]:
            if not item["atoms"]:
                continue
            picked = [rows[atom] for atom in item["atoms"]]
            values = [
                row["a_iso_mT"] if row.get("a_averaged_mT") is None else row["a_averaged_mT"]
                for row in picked
            ]
            if None in values:
                print(
                    f"| {result.radical} | {' '.join(item['atoms'])} | {picked[0]['isotope']} | failed | | | | |"
                )
                continue
            computed = sum(values) / len(values)
            shown = computed if item["sign"] != "unknown" else abs(computed)
            error = shown - item["coupling_mT"]
            errors[picked[0]["isotope"]].append(abs(error))
            limit = max(0.15 * abs(item["coupling_mT"]), 0.08)
            within = "yes" if abs(error) <= limit else "no"
            if "for looking only" in item["source"]:
                within = "uncertain"
            if within == "no":
                name = result.radical.split(" (")[0].replace(" ", "-")
                reason = MISSES.get((name, item["atoms"][0]), "not explained")
                reasons[reason].append(f"{result.radical} {' '.join(item['atoms'])}")
            memory = "yes" if "from memory" in item["source"] else "no"
            print(
                f"| {result.radical} | {' '.join(item['atoms'])} | {picked[0]['isotope']} | {shown:+.3f} | "
                f"{item['coupling_mT']:+.3f} | {error:+.3f} | {within} | {memory} |"
            )
    print("\nWhat misses the limit, and why:\n")
    for reason, names in reasons.items():
        print(f"* {', '.join(names)}: {reason}")
    print("\n| isotope | couplings | mean absolute error / mT |\n| --- | --- | --- |")
    for isotope, found in sorted(errors.items()):
        print(f"| {isotope} | {len(found)} | {sum(found) / len(found):.3f} |")


if __name__ == "__main__":
    main()
