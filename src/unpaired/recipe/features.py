"""Keys that are understood but whose feature has not been built yet: refused with a sentence that says so.

Delete a line when the feature lands; nothing else needs to change here.
"""

from __future__ import annotations

NOT_BUILT: dict[str, str] = {
    "motion.rotors": "leaving freely turning groups frozen",
    "motion.inversion": "averaging over inversion",
    "motion.torsion": "averaging over torsion",
    "motion.vibration": "averaging over vibration",
}
"""What each feature does, by the key that asks for it."""


def not_built(feature: str) -> str | None:
    """The sentence that refuses a feature, or None if the feature is there."""
    if feature not in NOT_BUILT:
        return None
    return (
        f"is understood, but {NOT_BUILT[feature]} has not been built yet in this version; leave the key out"
    )
