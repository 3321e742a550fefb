"""Is a determinant one of several of equal energy? Asked of the symmetry operations that make states degenerate."""

from __future__ import annotations

from collections.abc import Iterator
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.spatial.transform import Rotation

from .labels import open_shell

Array = NDArray[np.float64]

LOOSE_BOHR = 0.1
"""Tolerance of the library's point group for atoms, lines and cubic shapes."""
MAPPED_BOHR = 0.3
"""Shapes are judged as if they had an operation that leaves a turned nucleus this far from its like at most: so that
a Jahn-Teller distortion does not hide what it came from."""
ORDERS = ((3, False), (4, False), (4, True), (5, False), (8, False), (8, True))
"""Operations tried, improper or not: each E or T species of the common point groups changes under one of them."""
ROUND = 5
"""Steps of a full turn about an axis of infinite order: pi, delta and phi orbitals all change by one step."""
INVARIANT = 0.9
"""Overlap with its turned self from which a determinant or an orbital counts as unchanged; members of
degenerate species overlap with it by 0.81 at most about axes of order 3 to 6 (E2 of order 5) and 8."""
DEGENERATE_SHARE = 0.8
"""Share of degenerate species in the changed orbitals, from which the state is degenerate and not merely broken: an
orbital localised on one of three equal places has 0.67, on one of four 0.5, of six 0.67."""
PAIRS_KEEP = 0.7
"""Share of the open shell's overlap that the whole determinant must keep: pairs that break the symmetry lose more."""
SHELL_LOST = 0.1
"""Overlap of the open shell below which it says nothing of the pairs."""
CUBIC = ("T", "Td", "Th", "O", "Oh", "I", "Ih")


def degeneracy(mole: Any, orbitals: Array, occupations: Array, overlap: Array) -> str:
    """`atom`, `linear` or `Jahn-Teller` if the determinant is one of several of equal energy, else empty.

    Atoms and linear molecules: it changes when turned. Else: operations of order three or more carry the open shell
    into other orbitals, and those are of degenerate species (E, T), not a mixture that breaks the symmetry; the pairs
    of electrons keep it.
    """
    from pyscf.symm import geom

    keep = geom.TOLERANCE
    try:
        geom.TOLERANCE = LOOSE_BOHR
        group, middle, frame = geom.detect_symm(mole._atom)
    except Exception:  # a shape that cannot be placed has no axis to speak of
        return ""
    finally:
        geom.TOLERANCE = keep
    group = str(group)
    if group == "SO3":
        turns = [_turn(axis, ROUND, False) for axis in np.eye(3)]
        same = [_determinant(mole, orbitals, occupations, turn, middle) for turn in turns]
        return "atom" if min(same) < INVARIANT else ""
    if group in ("Coov", "Dooh"):
        # the line itself, not the frame: its direction must be exact
        ends = mole.atom_coords()
        line = ends[np.argmax(np.linalg.norm(ends - ends[0], axis=1))] - ends[0]
        turn = _turn(line / np.linalg.norm(line), ROUND, False)
        return "linear" if _determinant(mole, orbitals, occupations, turn, middle) < INVARIANT else ""
    shell = open_shell(orbitals, occupations, overlap)
    for matrix, order in _operations(mole, group in CUBIC, np.asarray(frame)):
        powers = [_overlaps(mole, shell, np.linalg.matrix_power(matrix, k), middle) for k in range(order)]
        left, sizes, _ = np.linalg.svd(powers[1])
        changed = left[:, sizes < INVARIANT]
        if not changed.shape[1]:
            continue
        # characters of the one-dimensional species of a cyclic group: 1 and, for an even order, +1 and -1 in turn
        signs = [np.ones(order)] + ([(-1.0) ** np.arange(order)] if order % 2 == 0 else [])
        plain = sum(sum(c * m for c, m in zip(sign, powers, strict=True)) / order for sign in signs)
        share = 1 - float(np.trace(changed.T @ plain @ changed)) / changed.shape[1]
        if group not in CUBIC and share <= DEGENERATE_SHARE:
            continue
        if _pairs_keep_symmetry(mole, orbitals, occupations, matrix, middle, abs(np.linalg.det(powers[1]))):
            return "Jahn-Teller"
    return ""


def _turn(axis: Array, order: int, improper: bool) -> Array:
    """Rotation by 360 degrees over `order`, with a reflection across the axis if improper; shape (3, 3)."""
    matrix = Rotation.from_rotvec(axis * 2 * np.pi / order).as_matrix()
    return np.asarray(matrix @ (np.eye(3) - 2 * np.outer(axis, axis))) if improper else np.asarray(matrix)


def _operations(mole: Any, cubic: bool, frame: Array) -> Iterator[tuple[Array, int]]:
    """Operations of order three or more that carry nuclei to their likes: (matrix, order).

    Axes: principal axes of the charges; in cubic shapes those of the frame, its diagonals, and lines to the nuclei.
    """
    charges = mole.atom_charges()
    places = mole.atom_coords() - charges @ mole.atom_coords() / charges.sum()
    axes = list(np.linalg.eigh((places * charges[:, None]).T @ places)[1].T)
    if cubic:
        axes += [*frame, *(frame.T @ np.array([1, a, b]) / np.sqrt(3) for a in (1, -1) for b in (1, -1))]
        axes += [place / np.linalg.norm(place) for place in places if np.linalg.norm(place) > MAPPED_BOHR]
    for axis in axes:
        for order, improper in ORDERS:
            matrix = _turn(axis, order, improper)
            apart = np.linalg.norm((places @ matrix.T)[:, None] - places[None], axis=2)
            apart[charges[:, None] != charges[None]] = np.inf
            if apart.min(axis=1).max() < MAPPED_BOHR:
                yield matrix, order


def _pairs_keep_symmetry(
    mole: Any, orbitals: Array, occupations: Array, matrix: Array, middle: Any, shell: float
) -> bool:
    """Whether an operation changes no more of the determinant than its open shell, whose overlap is `shell`."""
    spins = [
        _determinant(mole, orbitals[k : k + 1], occupations[k : k + 1], matrix, middle) for k in range(2)
    ]
    if shell < SHELL_LOST:  # carried into its partner altogether: one spin shows whether the pairs stay
        return max(spins) >= PAIRS_KEEP
    return spins[0] * spins[1] >= PAIRS_KEEP * shell


def _determinant(mole: Any, orbitals: Array, occupations: Array, matrix: Array, middle: Any) -> float:
    """Absolute overlap of a determinant with its turned self."""
    pair = [c[:, n > 0] for c, n in zip(orbitals, occupations, strict=True)]
    return float(
        np.prod([abs(np.linalg.det(_overlaps(mole, c, matrix, middle))) for c in pair if c.shape[1]])
    )


def _overlaps(mole: Any, orbitals: Array, matrix: Array, middle: Any) -> Array:
    """Overlaps of orbitals (columns) with the same orbitals turned about a point, shape (orbitals, orbitals)."""
    from pyscf import gto

    moved = mole.copy()
    moved.set_geom_((mole.atom_coords() - middle) @ matrix.T + middle, unit="Bohr")
    cross = gto.intor_cross("int1e_ovlp", mole, moved)
    turned = np.empty_like(orbitals)
    key = tuple(matrix.ravel().tolist())
    starts = mole.ao_loc_nr()
    for shell in range(mole.nbas):
        momentum = int(mole.bas_angular(shell))
        rows = orbitals[starts[shell] : starts[shell + 1]].reshape(mole.bas_nctr(shell), 2 * momentum + 1, -1)
        turned[starts[shell] : starts[shell + 1]] = (_functions_turned(momentum, key) @ rows).reshape(
            -1, orbitals.shape[1]
        )
    return np.asarray(orbitals.T @ cross @ turned)


@cache
def _functions_turned(momentum: int, key: tuple[float, ...]) -> Array:
    """What an operation makes of the real spherical functions of a shell, column by column.

    Found from the functions' values at some points, so that it keeps the library's order and signs.
    """
    from pyscf import gto

    matrix = np.array(key).reshape(3, 3)
    atom = gto.M(atom=[["H", (0, 0, 0)]], basis={"H": [[momentum, [0.5, 1.0]]]}, spin=1, verbose=0)
    points = np.array([[np.cos(1.7 * k), np.sin(2.3 * k + 1), np.cos(0.9 * k + 2)] for k in range(60)])
    values = atom.eval_gto("GTOval_sph", points)
    # the turned function at r is the function at the point that the operation carries to r
    return np.asarray(np.linalg.lstsq(values, atom.eval_gto("GTOval_sph", points @ matrix), rcond=None)[0])
