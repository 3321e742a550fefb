"""What state is it? Symmetry of the open shell where the molecule has any, spin populations otherwise."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

PURE = 0.98
"""Share of a symmetry species above which an orbital is called by it (all open-shell orbitals together)."""


@dataclass(frozen=True)
class Symmetry:
    """Point group of the nuclei and symmetry-adapted functions per species."""

    group: str
    """Schoenflies symbol: C2v, Dooh, SO3 for an atom, C1 for none."""
    species: dict[str, Array]
    """Columns span a species; shape (basis functions, functions of the species)."""


def symmetry_of(mole: Any) -> Symmetry:
    """Point group with PySCF's tolerance; species of its largest abelian subgroup (sigma, pi... when linear)."""
    copy = mole.copy()
    try:
        copy.symmetry = True
        copy.build(dump_input=False, parse_arg=False)
        same = np.allclose(copy.intor("int1e_ovlp"), mole.intor("int1e_ovlp"), atol=1e-8)
    except Exception:  # a shape that the library cannot place has no label by symmetry
        same = False
    if not same or copy.groupname == "C1":
        return Symmetry("C1", {})
    species: dict[str, list[Array]] = {}
    for name, columns in zip(copy.irrep_name, copy.symm_orb, strict=True):
        species.setdefault(_plain(name, copy.topgroup), []).append(columns)
    return Symmetry(copy.topgroup, {name: np.hstack(parts) for name, parts in species.items()})


def open_shell(orbitals: Array, occupations: Array, overlap: Array) -> Array:
    """Alpha orbitals without a partner in beta, from the corresponding orbitals; (functions, 2S).

    Amos and Hall, Proc. R. Soc. A 263, 483 (1961): singular vectors of the alpha-beta overlap.
    """
    alpha, beta = (c[:, n > 0] for c, n in zip(orbitals, occupations, strict=True))
    left, _, _ = np.linalg.svd(alpha.T @ overlap @ beta, full_matrices=True)
    return np.asarray(alpha @ left[:, beta.shape[1] :])


def spin_populations(mole: Any, orbitals: Array, occupations: Array, overlap: Array) -> Array:
    """Mulliken spin populations of the atoms."""
    alpha, beta = ((c * n) @ c.T for c, n in zip(orbitals, occupations, strict=True))
    by_function = np.einsum("ij,ji->i", alpha - beta, overlap)
    return np.array([by_function[start:stop].sum() for *_, start, stop in mole.aoslice_by_atom()])


@dataclass(frozen=True)
class Label:
    """Name of a state."""

    text: str
    by_symmetry: bool
    """It names symmetry species; else it lists spin populations."""


def state_label(mole: Any, symmetry: Symmetry, orbitals: Array, occupations: Array, overlap: Array) -> Label:
    """Name of the open shell.

    By symmetry: species of the singly occupied orbitals, such as `b1` or `pi_g x2`. By populations: the largest
    ones, such as `C1 0.82 O3 0.15`.
    """
    shell = open_shell(orbitals, occupations, overlap)
    shares = {
        name: sum(_share(orbital, columns, overlap) for orbital in shell.T)
        for name, columns in symmetry.species.items()
    }
    counts = {name: round(share) for name, share in shares.items()}
    if sum(counts.values()) == shell.shape[1] and all(
        abs(shares[name] - n) < (1 - PURE) * shell.shape[1] for name, n in counts.items()
    ):
        counted = sorted((name, n) for name, n in counts.items() if n)
        return Label(" ".join(name if n == 1 else f"{name} x{n}" for name, n in counted), True)
    populations = spin_populations(mole, orbitals, occupations, overlap)
    order = np.argsort(-np.abs(np.round(populations, 3)), kind="stable")
    kept = [k for k in order[:4] if abs(populations[k]) >= 0.1] or list(order[:1])
    text = " ".join(f"{mole.atom_symbol(k)}{k + 1} {populations[k]:.2f}" for k in kept)
    return Label(text, False)


def _share(orbital: Array, columns: Array, overlap: Array) -> float:
    """Norm squared of the part of a normalised orbital that lies in the span of the columns."""
    inside = columns.T @ overlap @ orbital
    metric = columns.T @ overlap @ columns
    return float(inside @ np.linalg.solve(metric, inside))


def _plain(name: str, group: str) -> str:
    """Species in lower case; sigma, pi, delta with linear groups, the letter of the shell for an atom."""
    if group == "SO3":
        return name[0]
    if group not in ("Coov", "Dooh"):
        return name.lower()
    match = re.match(r"([AE])(\d)([gu]?)", name)
    if match is None:
        return name.lower()
    letter = (
        "sigma" if match[1] == "A" else {"1": "pi", "2": "delta", "3": "phi"}.get(match[2], f"e{match[2]}")
    )
    minus = "-" if match[1] == "A" and match[2] == "2" else ""
    return letter + minus + (f"_{match[3]}" if match[3] else "")
