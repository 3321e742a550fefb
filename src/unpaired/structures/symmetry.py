"""Which nuclei are equivalent by symmetry: rotations and reflections that map a structure onto itself."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from .distances import distance_matrix

RMS_ANGSTROM = 0.01
MAX_ANGSTROM = 0.02
"""An operation counts if it brings every nucleus within this distance of an equal one, and within
RMS_ANGSTROM on the root mean square."""

_LOOSE = 0.3
"""Angstrom; candidates are matched within it before the operation is fitted to all nuclei."""

Floats = NDArray[np.float64]
Permutation = NDArray[np.intp]


def equivalence(
    kinds: Sequence[object],
    coordinates_angstrom: Floats,
    rms_angstrom: float = RMS_ANGSTROM,
    max_angstrom: float = MAX_ANGSTROM,
) -> list[tuple[int, ...]]:
    """Sets of atoms that symmetry operations of the structure turn into each other.

    `kinds` says which atoms may be equal at all (their elements, for example); coordinates have shape
    (atoms, 3). Proper and improper operations count: both leave isotropic couplings alone. Sets are sorted by
    their first atom.
    """
    first = list(range(len(kinds)))
    for permutation in permutations(kinds, coordinates_angstrom, rms_angstrom, max_angstrom):
        for atom, image in enumerate(permutation.tolist()):
            one, other = sorted((first[atom], first[image]))
            if one != other:
                first = [one if value == other else value for value in first]
    return [tuple(i for i, value in enumerate(first) if value == start) for start in sorted(set(first))]


def permutations(
    kinds: Sequence[object],
    coordinates_angstrom: Floats,
    rms_angstrom: float = RMS_ANGSTROM,
    max_angstrom: float = MAX_ANGSTROM,
) -> Iterator[Permutation]:
    """The permutations of atoms by the symmetry operations of a structure, some perhaps more than once.

    An operation keeps the centre of the structure and is fixed by the images of two atoms (and a handedness),
    so images of one well-chosen pair are tried and each candidate is fitted to all atoms.
    """
    points = np.asarray(coordinates_angstrom, dtype=np.float64).reshape(-1, 3)
    for permutation, _ in _fitted(kinds, points, rms_angstrom, max_angstrom):
        yield permutation


def _fitted(
    kinds: Sequence[object], points: Floats, rms_angstrom: float, max_angstrom: float
) -> Iterator[tuple[Permutation, Floats]]:
    """Permutations within the tolerances and the orthogonal matrices about the centre that belong to them."""
    numbers = {kind: place for place, kind in enumerate(dict.fromkeys(kinds))}
    types = np.array([numbers[kind] for kind in kinds])
    points = points - points.mean(axis=0)
    for operation in _candidates(types, points, max_angstrom):
        permutation = _match(types, points, operation)
        if permutation is None:
            continue
        fitted = _fit(points, points[permutation], np.sign(np.linalg.det(operation)))
        miss = np.sqrt(((points @ fitted.T - points[permutation]) ** 2).sum(axis=1))
        if miss.max() <= max_angstrom and np.sqrt((miss**2).mean()) <= rms_angstrom:
            yield permutation, fitted


def _candidates(types: NDArray[np.intp], points: Floats, tolerance: float) -> Iterator[Floats]:
    """Orthogonal matrices worth trying, shape (3, 3) each."""
    yield np.eye(3)
    if len(points) == 1:
        return
    axis = np.linalg.svd(points)[2][0]
    off_axis = np.linalg.norm(points - np.outer(points @ axis, axis), axis=1)
    if off_axis.max() <= tolerance:  # linear: the ends change places, or not
        yield -np.eye(3)
        return
    first, second = _reference_pair(types, points, tolerance)
    frame = _frame(points[first], points[second], 1.0)
    for image, partner in _images(types, points, first, second, tolerance):
        for hand in (1.0, -1.0):
            yield _frame(points[image], points[partner], hand) @ frame.T


def _frame(first: Floats, second: Floats, hand: float) -> Floats:
    """Orthonormal columns: along `first`, towards `second`, and their normal times `hand`."""
    along = first / np.linalg.norm(first)
    side = second - (second @ along) * along
    side = side / np.linalg.norm(side)
    return np.column_stack([along, side, hand * np.cross(along, side)])


def _images(
    types: NDArray[np.intp], points: Floats, first: int, second: int, tolerance: float
) -> list[tuple[int, int]]:
    """Pairs of atoms that the pair (first, second) could be turned into."""
    radius = np.linalg.norm(points, axis=1)
    distances = distance_matrix(points)

    def alike(atom: int) -> NDArray[np.bool_]:
        return np.asarray((types == types[atom]) & (abs(radius - radius[atom]) <= 2 * tolerance))

    same = abs(distances - distances[first, second]) <= 3 * tolerance
    found = np.argwhere(alike(first)[:, None] & alike(second)[None, :] & same)
    return [(int(i), int(j)) for i, j in found if i != j]


def _reference_pair(types: NDArray[np.intp], points: Floats, tolerance: float) -> tuple[int, int]:
    """Two atoms, not in line with the centre, with few images: a rare pair makes a short search."""
    radius = np.linalg.norm(points, axis=1)
    # Well spread pairs first; the area of the triangle with the centre measures how well they fix a frame.
    area = np.linalg.norm(np.cross(points[:, None, :], points[None, :, :]), axis=2)
    good = area >= 0.3 * area.max()
    best: tuple[int, int, int] | None = None
    for kind_first in _representatives(types, radius, tolerance):
        partners = np.flatnonzero(good[kind_first])
        for second in partners:
            count = len(_images(types, points, kind_first, int(second), tolerance))
            if best is None or count < best[0]:
                best = (count, kind_first, int(second))
        if best is not None and best[0] <= len(points):
            break
    if best is None:
        first, second = np.unravel_index(np.argmax(area), area.shape)
        return int(first), int(second)
    return best[1], best[2]


def _representatives(types: NDArray[np.intp], radius: Floats, tolerance: float) -> list[int]:
    """One atom of every kind and distance from the centre, the rarest first."""
    found: dict[tuple[int, int], list[int]] = {}
    for atom, (kind, distance) in enumerate(zip(types.tolist(), radius.tolist(), strict=True)):
        if distance > 0.1:
            found.setdefault((kind, round(distance / (4 * tolerance))), []).append(atom)
    return [atoms[0] for atoms in sorted(found.values(), key=len)]


def _match(types: NDArray[np.intp], points: Floats, operation: Floats) -> Permutation | None:
    """For every atom the equal atom at its image, or None if the structure is not mapped onto itself."""
    images = points @ operation.T
    distances = np.sqrt(((images[:, None, :] - points[None, :, :]) ** 2).sum(axis=-1))
    distances[types[:, None] != types[None, :]] = np.inf
    nearest = distances.argmin(axis=1)
    if distances.min(axis=1).max() > _LOOSE or len(set(nearest.tolist())) < len(points):
        return None
    return np.asarray(nearest)


def _fit(points: Floats, targets: Floats, hand: float) -> Floats:
    """Orthogonal matrix of determinant `hand` that brings the points nearest to the targets.

    W. Kabsch, Acta Cryst. A 32, 922 (1976).
    """
    left, _, right = np.linalg.svd(targets.T @ points)
    turn = np.diag([1.0, 1.0, hand * np.sign(np.linalg.det(left @ right))])
    return np.asarray(left @ turn @ right)


def operations(
    kinds: Sequence[object],
    coordinates_angstrom: Floats,
    rms_angstrom: float = RMS_ANGSTROM,
    max_angstrom: float = MAX_ANGSTROM,
) -> list[tuple[Permutation, Floats]]:
    """Distinct operations as (permutation, orthogonal matrix about the centre), the identity among them.

    A planar structure has its reflection as an operation of its own although it moves no atom; of a linear
    structure only those that change atoms are listed. The length of the list is the order of the point group.
    """
    points = np.asarray(coordinates_angstrom, dtype=np.float64).reshape(-1, 3)
    found: dict[tuple[bytes, bool], tuple[Permutation, Floats]] = {}
    for permutation, matrix in _fitted(kinds, points, rms_angstrom, max_angstrom):
        found.setdefault((permutation.tobytes(), np.linalg.det(matrix) > 0), (permutation, matrix))
    return list(found.values())


def symmetrised(
    kinds: Sequence[object],
    coordinates_angstrom: Floats,
    rms_angstrom: float = RMS_ANGSTROM,
    max_angstrom: float = MAX_ANGSTROM,
) -> Floats:
    """The nearby structure (atoms, 3) that has the operations of this one exactly, its centre in the same place.

    The mean over all operations, repeated because the fitted operations are a group only in the limit.
    """
    points = np.asarray(coordinates_angstrom, dtype=np.float64).reshape(-1, 3)
    centre = points.mean(axis=0)
    points = points - centre
    for _ in range(20):
        found = operations(kinds, points, rms_angstrom, max_angstrom)
        images = [points[permutation] @ matrix for permutation, matrix in found]
        mean = np.asarray(np.mean(images, axis=0))
        moved = abs(mean - points).max()
        points = mean
        if moved < 1e-12:
            break
    return np.asarray(points + centre)
