"""Records with chosen couplings for tests of lines, curves and spin-system files: nothing here is a prediction."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from unpaired import columns
from unpaired.constants import MHZ_PER_MT
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.nuclei import isotope
from unpaired.result import Result
from unpaired.spectrum.splitting import Splitting
from unpaired.spinsystem import SpinGroup, SpinNucleus, SpinSystem

LEVELS = (Level("UHF", "pcH-1"), Level("UKS", "pcH-1", "B3LYP"))


def record(
    groups: Sequence[tuple[str, int, float | None]],
    *,
    radical: str = "sample",
    multiplicity: int = 2,
    g: Mapping[str, Any] | None = None,
    isotopes: Mapping[str, str] | None = None,
    averaged: Mapping[str, float] | None = None,
    tensor: Sequence[float] | None = None,
    flags: Sequence[Mapping[str, Any]] = (),
) -> Result:
    """A result with groups (isotope, count, a_iso in mT); UHF has twice the couplings of the second level.

    `averaged` gives averages by group label, `tensor` the six dipolar components (xx, yy, zz, xy, xz, yz).
    """
    elements = [isotope(name).element for name, count, _ in groups for _ in range(count)]
    rows: list[dict[str, Any]] = []
    for level, factor in zip(LEVELS, (2.0, 1.0), strict=True):
        place = 0
        for name, count, coupling in groups:
            atoms = [f"{isotope(name).element}{place + k + 1}" for k in range(count)]
            place += count
            value = None if coupling is None else factor * coupling
            for atom in atoms:
                row: dict[str, Any] = dict.fromkeys(columns.names("couplings"))
                row |= {"radical": radical, "level": level.id, "scf": level.scf, "basis": level.basis}
                row |= {"atom": atom, "isotope": name, "group": atoms[0], "group_size": count, "flags": ""}
                row |= {"a_iso_mT": value, "a_group_mT": value}
                row["a_iso_MHz"] = None if value is None else value * MHZ_PER_MT
                row["a_averaged_mT"] = (averaged or {}).get(atoms[0])
                for component, axes in enumerate(("xx", "yy", "zz", "xy", "xz", "yz")):
                    row[f"t_{axes}_MHz"] = None if tensor is None else tensor[component]
                rows.append(row)
    return Result(
        radical=radical,
        recipe={
            "radical": radical,
            "levels": [level.to_dict() for level in LEVELS],
            "g": g,
            "isotopes": dict(isotopes or {}),
        },
        molecule=Molecule(tuple(elements), np.arange(3.0 * len(elements)).reshape(-1, 3), 0, multiplicity),
        tables={"couplings": rows, "states": [], "flags": list(flags)},
        provenance={"constants": "CODATA 2022"},
    )


def system(*groups: tuple[str, int, float], g_iso: float = 2.0, radical: str = "sample") -> SpinSystem:
    """A spin system of groups (isotope, count, a_iso in mT), atoms numbered through."""
    made, place = [], 0
    for name, count, coupling_mT in groups:
        atoms = [f"{isotope(name).element}{place + k + 1}" for k in range(count)]
        place += count
        made.append(
            SpinGroup(
                group=atoms[0],
                isotope=name,
                nuclear_spin=isotope(name).spin,
                count=count,
                a_iso_MHz=coupling_mT * MHZ_PER_MT,
                a_iso_mT=coupling_mT,
                nuclei=tuple(SpinNucleus(atom) for atom in atoms),
            )
        )
    return SpinSystem(
        radical=radical,
        level="UHF/pcH-1",
        electron_spin=0.5,
        g_iso=g_iso,
        g_source="chosen for a test",
        coupling_kind="equilibrium",
        groups=tuple(made),
    )


def splitting(name: str, count: int, coupling_MHz: float) -> Splitting:
    """One group for the numerics."""
    nucleus = isotope(name)
    return Splitting(round(2 * nucleus.spin), count, coupling_MHz, nucleus.nuclear_g)
