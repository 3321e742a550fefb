"""How a prediction is held against a measured coupling, the same for every test that does so."""

from __future__ import annotations

from unpaired.result import Result


def predicted_and_measured_mT(result: Result, place: int) -> tuple[float, float]:
    """Mean over the named atoms, and the measured value of the recipe's `measured[place]`.

    The magnitude of the prediction where the measured sign is unknown.
    """
    item = result.recipe["measured"][place]
    values = [row["a_iso_mT"] for row in result.rows("couplings") if row["atom"] in item["atoms"]]
    predicted = sum(values) / len(values)
    return (abs(predicted) if item["sign"] == "unknown" else predicted), float(item["coupling_mT"])
