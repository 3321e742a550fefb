"""Fitted Coulomb and exchange from three-index integrals that the levels of one molecule share.

With (mn|ls) ~ sum_P L_P,mn L_P,ls in the Coulomb metric (O. Vahtras, J. Almloef, M. W. Feyereisen,
Chem. Phys. Lett. 213, 514 (1993)) the contractions are products with NumPy's BLAS:

    J = sum_P L_P (L_P . D)        K = sum_P,i n_i (L_P C_i) (L_P C_i)^T        for D = C n C^T
"""

from __future__ import annotations

import hashlib
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyscf import df, lib

from .lowrank import factor

Array = NDArray[np.float64]

BATCH_MB = 24.0
"""Size of the unpacked three-index integrals worked on at once."""
BUFFER_MB = 150.0
"""Memory beside the integrals while they are made."""

KEPT = 2
"""Sets of integrals kept: those of the basis and those of the small one in which states are scouted."""

_kept: dict[str, tuple[Any, Array]] = {}
"""Auxiliary molecule and integrals used last in this process, latest at the end."""


class Fitting(df.DF):  # type: ignore[misc]
    """Density fitting that keeps the library's integrals and storage, with faster contractions."""

    def build(self) -> Fitting:
        """Three-index integrals, taken over from the previous level if it had the same molecule and sets."""
        key = _key(self.mol, self.auxbasis)
        if key in _kept:
            self.auxmol, self._cderi = _kept[key] = _kept.pop(key)
            return self
        while len(_kept) >= KEPT:  # before new ones are made, so that they never stand side by side
            del _kept[next(iter(_kept))]
        self.auxmol = df.addons.make_auxmol(self.mol, self.auxbasis)
        words = self.auxmol.nao * (self.auxmol.nao + self.mol.nao * (self.mol.nao + 1) // 2)
        memory_MB = words * 8 / 0.98e6 + BUFFER_MB  # the library takes what it is given for its buffers
        self._cderi = df.incore.cholesky_eri(self.mol, auxmol=self.auxmol, max_memory=memory_MB)
        _kept[key] = self.auxmol, self._cderi
        return self

    def get_jk(
        self, dm: Any, hermi: int = 1, with_j: bool = True, with_k: bool = True,
        direct_scf_tol: float = 1e-13, omega: float | None = None,
    ) -> tuple[Any, Any]:  # fmt: skip
        """Coulomb and exchange matrices of real symmetric density matrices; others go to the library."""
        if omega is not None:
            with self.range_coulomb(omega) as part:
                answer: tuple[Any, Any] = part.get_jk(dm, hermi, with_j, with_k, direct_scf_tol)
            return answer
        if self._cderi is None:
            self.build()
        if hermi != 1 or np.iscomplexobj(dm):
            return super().get_jk(dm, hermi, with_j, with_k, direct_scf_tol, omega)  # type: ignore[no-any-return]
        shape = np.shape(dm)
        matrices = np.asarray(dm).reshape(-1, *shape[-2:])
        coulomb = self._coulomb(matrices).reshape(shape) if with_j else None
        exchange = self._exchange(dm, matrices).reshape(shape) if with_k else None
        return coulomb, exchange

    def _coulomb(self, matrices: Array) -> Array:
        packed = lib.pack_tril(matrices + matrices.swapaxes(1, 2))
        diagonal = np.arange(matrices.shape[-1])
        packed[:, diagonal * (diagonal + 1) // 2 + diagonal] /= 2
        return np.asarray(lib.unpack_tril((packed @ self._cderi.T) @ self._cderi))

    def _exchange(self, dm: Any, matrices: Array) -> Array:
        size = matrices.shape[-1]
        factors = factor(dm, matrices)
        orbitals = np.hstack([c for c, _ in factors])
        edges = np.cumsum([0, *(n.size for _, n in factors)])
        exchange = np.zeros_like(matrices)
        batch = max(1, int(BATCH_MB * 1e6 / (8 * size * size)))
        buffer = np.empty((batch, size, size))
        for start in range(0, self._cderi.shape[0], batch):
            part = self._cderi[start : start + batch]
            full = lib.unpack_tril(part, out=buffer[: len(part)])
            half = full.reshape(-1, size) @ orbitals
            half = half.reshape(len(part), size, -1)
            for k, (_, n) in enumerate(factors):
                mine = np.ascontiguousarray(half[:, :, edges[k] : edges[k + 1]].transpose(1, 0, 2))
                mine = mine.reshape(size, -1)
                scaled = mine if np.all(n == 1) else mine * np.tile(n, len(part))
                exchange[k] += scaled @ mine.T
        return exchange


def release() -> None:
    """Forgets the integrals kept for the next level."""
    _kept.clear()


def _key(mol: Any, auxbasis: Any) -> str:
    """Everything that decides the integrals."""
    text = repr((mol._atm.tolist(), mol._bas.tolist(), mol._env.tolist(), sorted(auxbasis.items())))
    return hashlib.sha256(text.encode()).hexdigest()
