"""Exchange and correlation on a grid, from basis-function values that are kept between iterations.

The library evaluates every function anew in each iteration and multiplies with the plain BLAS of its own
wheel. Here the grid is cut once into compact blocks; each block keeps the values and first derivatives of the
functions that reach it, and all that follows is a few matrix products per block with NumPy's BLAS, blocks
side by side in threads. With D = C n C^T, psi = C^T phi and weighted derivatives w of the energy
(J. A. Pople, P. M. W. Gill, B. G. Johnson, Chem. Phys. Lett. 199, 557 (1992)):

    rho = sum_i n_i psi_i^2,   grad rho = 2 sum_i n_i psi_i grad psi_i,   tau = sum_i n_i |grad psi_i|^2 / 2
    V = phi (w_rho/2 phi + w_grad . grad phi)^T + w_tau/4 grad phi . grad phi^T  + the transpose of all this

Products are in double precision where a final number depends on them. Single precision does for the grids of the
rough stage and of responses (`frame.turned_grids`), and for what changes between potential matrices that are close to
one another: V is linear in w. The one approximation beside is `REACH`.
"""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyscf import dft

from .lowrank import factor, occupied
from .threads import side_by_side, thread_count

REACH = 1e-8
"""A function is dropped from a block where its value and gradient stay below this, in atomic units."""
BLOCK_POINTS = 800
"""Points of a block at most: few, so that it is compact and stays in the cache; enough for products."""
KEPT_MB = 1500.0
"""Values are kept up to this size; those of further blocks are evaluated anew in every pass."""
KEPT_GRIDS = 2
"""Grids whose values are kept: the field's own and the coarse one of a response."""

NEAR = 0.1
"""Share of a weighted potential that may change while the change is integrated in single precision."""

COMPONENTS = {"LDA": 1, "GGA": 4, "MGGA": 5}
"""Density, gradient, kinetic-energy density."""

Array = NDArray[np.float64]
Values = NDArray[np.float64] | NDArray[np.float32]


@dataclass(eq=False)
class Block:
    """Consecutive grid points and the functions that reach them."""

    start: int
    stop: int
    functions: NDArray[np.intp]
    """Indices of the functions that reach it."""
    kept: Values | None
    """Values, then x, y, z derivatives: shape (functions, 1 or 4, points)."""


class Blocks:
    """The blocks of one grid and the values of the functions on them."""

    def __init__(self, mol: Any, grids: Any, derivative: int) -> None:
        self.mol, self.coordinates, self.derivative = mol, grids.coords, derivative
        self.kind: Any = np.float32 if getattr(grids, "single_precision", False) else np.float64
        self.anchor: tuple[Array, Array] | None = None
        """A weighted potential and its matrices in double precision."""
        size = grids.weights.size
        count = -(-size // BLOCK_POINTS)
        edges = [size * k // count for k in range(count + 1)]
        self.blocks: list[Block] = side_by_side(self._cut, list(itertools.pairwise(edges)))
        room = KEPT_MB * 1e6
        for block in self.blocks:
            assert block.kept is not None
            room -= block.kept.nbytes
            if room < 0:
                block.kept = None

    def values(self, block: Block) -> Values:
        """Shape (functions, 1 or 4, points)."""
        if block.kept is not None:
            return block.kept
        return np.ascontiguousarray(self._evaluate(block.start, block.stop)[block.functions], self.kind)

    def _evaluate(self, start: int, stop: int) -> Array:
        name = f"GTOval_sph_deriv{self.derivative}"
        values = self.mol.eval_gto(name, self.coordinates[start:stop])
        return np.asarray(values.reshape(-1, stop - start, self.mol.nao).transpose(2, 0, 1))

    def _cut(self, edge: tuple[int, int]) -> Block:
        values = self._evaluate(*edge)
        functions = np.flatnonzero(np.abs(values).max(axis=(1, 2)) > REACH)
        return Block(*edge, functions, np.ascontiguousarray(values[functions], self.kind))


class GridIntegration(dft.numint.NumInt):  # type: ignore[misc]
    """A `_numint` for open-shell Kohn-Sham; it leaves what it cannot do to the library."""

    def __init__(self) -> None:
        super().__init__()
        self._grids: list[Blocks] = []

    def nr_uks(
        self, mol: Any, grids: Any, xc_code: str, dms: Any, relativity: int = 0, hermi: int = 1,
        max_memory: float = 2000, verbose: Any = None,
    ) -> tuple[Any, Any, Any]:  # fmt: skip
        """Electrons, energy and potential matrices of one pair of real symmetric density matrices."""
        kind = self._xc_type(xc_code)
        if not _plain(dms, kind) or hermi != 1 or np.ndim(dms[0]) != 2:
            answer: tuple[Any, Any, Any] = super().nr_uks(
                mol, grids, xc_code, dms, relativity, hermi, max_memory, verbose
            )
            return answer
        blocks = self.blocks(mol, grids, kind)
        density = _density(blocks, factor(dms, np.asarray(dms)), kind)[0]
        energy, potential = self.eval_xc_eff(xc_code, density, deriv=1, xctype=kind, spin=1)[:2]
        electrons = (density if kind == "LDA" else density[:, 0]) * grids.weights
        matrices = _near_anchor(blocks, potential.reshape(2, -1, grids.weights.size) * grids.weights)
        return electrons.sum(axis=1), float(electrons.sum(axis=0) @ energy), matrices

    def nr_uks_fxc(
        self, mol: Any, grids: Any, xc_code: str, dm0: Any, dms: Any, relativity: int = 0, hermi: int = 0,
        rho0: Any = None, vxc: Any = None, fxc: Any = None, max_memory: float = 2000, verbose: Any = None,
    ) -> Any:  # fmt: skip
        """First-order potential matrices of real matrices, symmetrised: the kernel sees nothing else."""
        kind = self._xc_type(xc_code)
        if not _plain(dms, kind):
            return super().nr_uks_fxc(
                mol, grids, xc_code, dm0, dms, relativity, hermi, rho0, vxc, fxc, max_memory, verbose
            )
        if fxc is None:
            fxc = self.cache_xc_kernel1(mol, grids, xc_code, dm0, spin=1, max_memory=max_memory)[2]
        given = np.asarray(dms)
        pairs = given.reshape(2, -1, mol.nao, mol.nao).swapaxes(0, 1)
        if hermi != 1:
            pairs = (pairs + pairs.swapaxes(2, 3)) / 2
        blocks = self.blocks(mol, grids, kind)
        density = _density(blocks, factor(None, pairs.reshape(-1, mol.nao, mol.nao)), kind)
        density = density.reshape(len(pairs), 2, -1, grids.weights.size)
        kernel = fxc.reshape(2, density.shape[2], 2, density.shape[2], -1)
        potential = np.einsum("nsxg,sxtyg->ntyg", density, kernel) * grids.weights
        return _matrices(blocks, potential).swapaxes(0, 1).reshape(given.shape)

    def cache_xc_kernel(
        self, mol: Any, grids: Any, xc_code: str, mo_coeff: Any, mo_occ: Any, spin: int = 0,
        max_memory: float = 2000,
    ) -> Any:  # fmt: skip
        """Density, first and second derivatives of the functional at the ground state."""
        kind = self._xc_type(xc_code)
        if spin != 1 or np.ndim(mo_coeff[0]) != 2 or not _plain(mo_coeff, kind):
            return super().cache_xc_kernel(mol, grids, xc_code, mo_coeff, mo_occ, spin, max_memory)
        factors = [occupied(c, n) for c, n in zip(mo_coeff, mo_occ, strict=True)]
        density = _density(self.blocks(mol, grids, kind), factors, kind)[0]
        return density, *self.eval_xc_eff(xc_code, density, deriv=2, xctype=kind, spin=1)[1:3]

    def blocks(self, mol: Any, grids: Any, kind: str) -> Blocks:
        """The blocks of a grid, kept until other grids push them out."""
        if grids.coords is None:
            grids.build(with_non0tab=True)
        derivative = 0 if kind == "LDA" else 1
        for known in self._grids:
            if known.coordinates is grids.coords and known.mol is mol and known.derivative >= derivative:
                return known
        del self._grids[: len(self._grids) - KEPT_GRIDS + 1]
        self._grids.append(Blocks(mol, grids, derivative))
        return self._grids[-1]

    def reset(self, mol: Any = None) -> GridIntegration:
        """Forgets every grid."""
        self._grids.clear()
        return self


def _plain(matrices: Any, kind: str) -> bool:
    """Whether the functional and the matrices are of the kind this module integrates."""
    return kind in COMPONENTS and len(matrices) == 2 and not np.iscomplexobj(matrices[0])


def _density(blocks: Blocks, factors: Sequence[tuple[Array, Array]], kind: str) -> Array:
    """Density of each spin: shape (pairs of factors, 2, points), or (pairs, 2, 4 or 5, points)."""
    components = COMPONENTS[kind]
    density = np.empty((len(factors) // 2, 2, components, len(blocks.coordinates)))
    orbitals = np.ascontiguousarray(np.hstack([c for c, _ in factors]).T, blocks.kind)
    edges = np.cumsum([0, *(n.size for _, n in factors)])

    def fill(block: Block) -> None:
        values = blocks.values(block)
        functions, parts, points = values.shape
        psi = orbitals[:, block.functions] @ values.reshape(functions, parts * points)
        psi = psi.reshape(-1, parts, points)
        for k, (_, n) in enumerate(factors):
            mine = psi[edges[k] : edges[k + 1]]
            out = density[k // 2, k % 2, :, block.start : block.stop]
            scaled = mine[:, 0] if np.all(n == 1) else mine[:, 0] * n[:, None].astype(blocks.kind)
            np.einsum("ig,ixg->xg", scaled, mine[:, : min(components, 4)], out=out[:4])
            out[1:4] *= 2
            if components == 5:
                np.einsum("i,ixg,ixg->g", (n / 2).astype(blocks.kind), mine[:, 1:4], mine[:, 1:4], out=out[4])

    side_by_side(fill, blocks.blocks)
    return density[:, :, 0] if kind == "LDA" else density


def _near_anchor(blocks: Blocks, potential: Array) -> Array:
    """Potential matrices (2, size, size) of a weighted potential (2, components, points)."""
    if blocks.anchor is not None:
        change = potential - blocks.anchor[0]
        if np.abs(change).sum() < NEAR * np.abs(potential).sum():
            return np.asarray(blocks.anchor[1] + _matrices(blocks, change[None], np.float32)[0])
    matrices = np.asarray(_matrices(blocks, potential[None])[0])
    if blocks.kind == np.float64:
        blocks.anchor = potential, matrices
    return matrices.copy()


def _matrices(blocks: Blocks, potential: Array, kind: Any = np.float64) -> Array:
    """Potential matrices (sets, 2, size, size) of weighted potentials (sets, 2, components, points).

    `kind` is the precision of the products, unless the values have less.
    """
    size = blocks.mol.nao
    sets, _, components, points = potential.shape
    spins = 2 * sets
    kind = np.float32 if blocks.kind == np.float32 else kind
    scaled = potential.reshape(spins, components, points).astype(kind)
    scaled[:, 0] /= 2
    scaled[:, 4:] /= 4

    def add(mine: Sequence[Block]) -> Array:
        total = np.zeros((spins, size, size))
        for block in mine:
            values = blocks.values(block).astype(kind, copy=False)
            functions, _, width = values.shape
            w = scaled[:, :, block.start : block.stop]
            right = np.einsum("fxg,kxg->kfg", values[:, : min(4, components)], w[:, :4])
            product = values[:, 0] @ right.reshape(spins * functions, width).T
            product = product.reshape(functions, spins, functions).swapaxes(0, 1)
            if components == 5:
                for k, x in itertools.product(range(spins), (1, 2, 3)):
                    product[k] += values[:, x] @ (values[:, x] * w[k, 4]).T
            total[:, block.functions[:, None], block.functions] += product
        return total

    threads = thread_count()
    total = np.sum(side_by_side(add, [blocks.blocks[k::threads] for k in range(threads)]), axis=0)
    return np.asarray(total + total.swapaxes(1, 2)).reshape(sets, 2, size, size)
