"""Fitted Coulomb and exchange from three-index integrals that the levels of one molecule share.

With (mn|ls) ~ sum_P L_P,mn L_P,ls in the Coulomb metric (O. Vahtras, J. Almloef, M. W. Feyereisen,
Chem. Phys. Lett. 213, 514 (1993)):

    J = sum_P L_P (L_P . D)        K = sum_P,i n_i (L_P C_i) (L_P C_i)^T        for D = C n C^T

How much of K is made, and in which precision, depends on what is asked: see `Fitting.get_jk`.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import AbstractContextManager, contextmanager, nullcontext
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyscf import df

from .exchange import Anchor, anchor, coulomb, whole
from .lowrank import factor
from .threeindex import ThreeIndex, key_of, three_index

Array = NDArray[np.float64]

KEPT = 2
"""Sets of integrals kept: those of the basis and those of the small one in which states are scouted."""

_kept: dict[str, tuple[Any, ThreeIndex]] = {}
"""Auxiliary molecule and integrals used last in this process, latest at the end."""


class Fitting(df.DF):  # type: ignore[misc]
    """Density fitting that hands the library its integrals, with contractions of its own."""

    _integrals: ThreeIndex | None = None
    _anchor: Anchor | None = None
    _rough = False
    _responding = False

    def build(self) -> Fitting:
        """Three-index integrals, taken over from the previous level if it had the same molecule and sets."""
        key = key_of(self.mol, self.auxbasis)
        if key in _kept:
            self.auxmol, self._integrals = _kept[key] = _kept.pop(key)
        else:
            while len(_kept) >= KEPT:  # before new ones are made, so that they never stand side by side
                del _kept[next(iter(_kept))]
            self.auxmol = df.addons.make_auxmol(self.mol, self.auxbasis)
            self._integrals = three_index(self.mol, self.auxmol)
            _kept[key] = self.auxmol, self._integrals
        self._cderi = self._integrals.packed
        self._anchor = None
        return self

    def reset(self, mol: Any = None) -> Fitting:
        """Forgets integrals and densities."""
        self._integrals = self._anchor = None
        self._rough = self._responding = False  # the library makes its range-separated copy by a reset
        super().reset(mol)
        return self

    def loop(self, blksize: int | None = None) -> Iterator[Array]:
        """Integrals of all pairs, as the library packs them."""
        integrals = self.integrals()
        for rows in super().loop(blksize):
            full = np.zeros((len(rows), integrals.size * (integrals.size + 1) // 2))
            full[:, integrals.rows * (integrals.rows + 1) // 2 + integrals.columns] = rows
            yield full

    def integrals(self) -> ThreeIndex:
        """Those of this molecule, computed when first asked for."""
        if self._cderi is None or self._integrals is None:
            self.build()
        assert self._integrals is not None
        return self._integrals

    @contextmanager
    def rough(self) -> Iterator[None]:
        """Meanwhile single precision does."""
        before, self._rough = self._rough, True
        try:
            yield
        finally:
            self._rough = before

    @contextmanager
    def responding(self) -> Iterator[None]:
        """Meanwhile single precision does for matrices without orbitals: the response to a small change.

        Those with orbitals are made in full: second order needs the block between virtual orbitals as it is.
        """
        before, self._responding = self._responding, True
        try:
            yield
        finally:
            self._responding = before

    def forget(self) -> None:
        """The next exchange matrices are made in full and in double precision."""
        self._anchor = None
        for part in self._rsh_df.values():
            part.forget()

    def get_jk(
        self, dm: Any, hermi: int = 1, with_j: bool = True, with_k: bool = True,
        direct_scf_tol: float = 1e-13, omega: float | None = None,
    ) -> tuple[Any, Any]:  # fmt: skip
        """Coulomb and exchange matrices of real symmetric density matrices; others go to the library.

        Exchange of a pair of densities that carry orbitals is made in full, in double precision, once; as long as
        the next ones stay near, what changes is added as far as it acts on occupied orbitals (`Anchor`).
        """
        if omega is not None:
            with self.range_coulomb(omega) as part:
                part._rough, part._responding = self._rough, self._responding
                answer: tuple[Any, Any] = part.get_jk(dm, hermi, with_j, with_k, direct_scf_tol)
            return answer
        integrals = self.integrals()
        if hermi != 1 or np.iscomplexobj(dm):
            return super().get_jk(dm, hermi, with_j, with_k, direct_scf_tol, omega)  # type: ignore[no-any-return]
        shape = np.shape(dm)
        matrices = np.asarray(dm).reshape(-1, *shape[-2:])
        return (
            coulomb(integrals, matrices).reshape(shape) if with_j else None,
            self._exchange(dm, matrices).reshape(shape) if with_k else None,
        )

    def _exchange(self, dm: Any, matrices: Array) -> Array:
        integrals, factors = self.integrals(), factor(dm, matrices)
        bare = getattr(dm, "mo_coeff", None) is None
        if self._rough or (bare and self._responding):
            return whole(integrals, factors, np.float32)
        if bare or self._responding or any(np.any(n != 1) for _, n in factors):
            return whole(integrals, factors)
        orbitals = [c for c, _ in factors]
        steps = self._anchor.distances(integrals, orbitals) if self._anchor is not None else None
        if self._anchor is None or steps is None:
            self._anchor = None  # before a new one is made, so that they never stand side by side
            self._anchor = anchor(integrals, orbitals)
            return self._anchor.matrices.copy()  # the library scales what it gets
        return self._anchor.near(integrals, steps)


def responding(field: Any) -> AbstractContextManager[None]:
    """`Fitting.responding` of a mean-field object; nothing changes for one with exact integrals."""
    fitted = getattr(field, "with_df", None)
    return fitted.responding() if isinstance(fitted, Fitting) else nullcontext()


def release() -> None:
    """Forgets the integrals kept for the next level."""
    _kept.clear()
