"""Integration grids that turn with the molecule, so that turning it changes no number."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

DEGENERATE = 1e-4
"""Relative gap below which two moments count as equal."""


def molecular_axes(charges: NDArray[np.float64], coordinates: NDArray[np.float64]) -> NDArray[np.float64]:
    """Three orthonormal axes (rows) that turn with the nuclei; signs and order are free.

    Principal axes of the charge-weighted second moment. Where two or three moments are equal, the heaviest
    and outermost nucleus off the axes found so far gives the next direction: nuclei that tie are equivalent
    by symmetry, and atomic grids have the symmetry of the octahedron, so the choice does not matter.
    """
    centred = coordinates - charges @ coordinates / charges.sum()
    moments, vectors = np.linalg.eigh((centred * charges[:, None]).T @ centred)
    limit = DEGENERATE * max(float(moments[-1]), 1e-12)
    axes: list[NDArray[np.float64]] = []
    if moments[1] - moments[0] > limit:
        axes.append(vectors[:, 0])
    if moments[2] - moments[1] > limit:
        axes.append(vectors[:, 2])
    while len(axes) < 2:
        off = centred.copy()
        for axis in axes:
            off -= np.outer(off @ axis, axis)
        distances = np.linalg.norm(off, axis=1)
        if distances.max() < 1e-6:
            # nuclei on a line or a single one: any direction across is as good as another
            trial = np.eye(3)[np.argmin(np.abs(axes[0]))] if axes else np.array([0.0, 0.0, 1.0])
            for axis in axes:
                trial = trial - (trial @ axis) * axis
            axes.append(trial / np.linalg.norm(trial))
            continue
        # sizes rounded, so that nuclei which symmetry makes equal tie, and the first of them is taken
        place = max(
            range(len(charges)), key=lambda n: (distances[n] > 1e-3, charges[n], round(distances[n], 5))
        )
        axes.append(off[place] / distances[place])
    axes.append(np.cross(axes[0], axes[1]))
    return np.array(axes)


def turned_grids(mole: Any, level: int, single_precision: bool = False) -> Any:
    """PySCF's grids of a level, each atomic grid turned into the molecule's axes.

    `single_precision` says that sums on it need no more than that.
    """
    from pyscf import dft

    class TurnedGrids(dft.gen_grid.Grids):  # type: ignore[misc]
        """Atomic grids in molecular axes; the partition depends on distances alone."""

        _keys = frozenset({"single_precision"})

        def gen_atomic_grids(self, mol: Any, *arguments: Any, **options: Any) -> Any:
            tables = super().gen_atomic_grids(mol, *arguments, **options)
            axes = molecular_axes(mol.atom_charges().astype(float), mol.atom_coords())
            return {symbol: (points @ axes, weights) for symbol, (points, weights) in tables.items()}

    grids = TurnedGrids(mole)
    grids.level, grids.single_precision = level, single_precision
    return grids
