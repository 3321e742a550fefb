"""How a prediction is held against a measured coupling, the same for every test that does so."""

from __future__ import annotations

from unpaired.result import Result

NO_INVERSION = "the radical inverts fast, which a static structure does not contain"
MISSES: dict[tuple[str, str], str] = {
    ("cyano", "N2"): "fed by polarisation alone: a small difference of large parts",
    ("pyrazine-anion", "C2"): "a ring 13C fed by polarisation alone, for which pcH-1 is too high",
    ("nitroxide", "N1"): "measured in water, whose hydrogen bonds are not in a continuum, and a soft bend",
    ("carbon-dioxide-anion", "C1"): "measured in a crystal of sodium formate; a gas-phase anion here",
    ("difluoride-anion", "F1"): "self-interaction error: the hole of a three-electron bond is too diffuse",
    ("fluoromethyl", "C1"): NO_INVERSION,
    ("fluoromethyl", "H3"): NO_INVERSION,
    ("hydrazine-cation", "H3"): NO_INVERSION,
    ("hydrazine-cation", "N1"): NO_INVERSION,
    ("silicon-boride", "B2"): "too much s character; functional, vibration and neon were not taken apart",
    ("vinyl", "H3"): NO_INVERSION,
    ("vinyl", "H5"): NO_INVERSION,
    ("vinyl", "C2"): "a small difference of direct and polarisation parts",
}
"""Per recipe and first atom: why a coupling at UKS-B3LYP/pcH-1 misses the measured one."""


def predicted_and_measured_mT(result: Result, place: int) -> tuple[float, float]:
    """Mean over the named atoms, and the measured value of the recipe's `measured[place]`.

    The magnitude of the prediction where the measured sign is unknown.
    """
    item = result.recipe["measured"][place]
    values = [row["a_iso_mT"] for row in result.rows("couplings") if row["atom"] in item["atoms"]]
    predicted = sum(values) / len(values)
    return (abs(predicted) if item["sign"] == "unknown" else predicted), float(item["coupling_mT"])
