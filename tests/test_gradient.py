"""Gradients of our own sums over the grid and over the surface of a continuum, against PySCF's own."""

import numpy as np
import pytest

from unpaired.electronic.continuum import Continuum
from unpaired.electronic.gradient import nuclear_gradient
from unpaired.electronic.settings import Settings
from unpaired.electronic.surface import Surface
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Solvent

COARSE = Settings("def2-universal-jkfit", 0, 1e-7, 1e-4)
BENT = np.array([[0.1, -0.2, 0.0], [1.9, 0.3, 0.1], [-0.4, 1.85, -0.2]])
NH2 = Molecule(("N", "H", "H"), BENT, 0, 2)


@pytest.mark.parametrize(
    "level",
    [
        Level("UKS", "pcseg-0", "SVWN"),
        Level("UKS", "pcseg-1", "PBE"),
        Level("UKS", "pcseg-0", "B3LYP"),
        Level("ROKS", "pcseg-0", "B3LYP"),
    ],
    ids=lambda level: level.id,
)
def test_a_gradient_is_the_librarys(level: Level) -> None:
    field = Surface(NH2, level, settings=COARSE).converged(BENT)
    library = field.nuc_grad_method().set(verbose=0).kernel()
    np.testing.assert_allclose(nuclear_gradient(field), library, atol=1e-8)


def test_a_gradient_in_a_continuum_is_the_librarys() -> None:
    """To the single precision in which the potentials are kept."""
    from pyscf.solvent import pcm

    field = Surface(NH2, Level("UKS", "pcseg-0", "B3LYP"), Solvent("water", 78.4), settings=COARSE).converged(
        BENT
    )
    assert isinstance(field.with_solvent, Continuum)
    density = field.make_rdm1().sum(axis=0)
    ours, library = field.with_solvent.grad(density), pcm.PCM.grad(field.with_solvent, density)
    np.testing.assert_allclose(ours, library, atol=1e-8)
    assert abs(library).max() > 1e-3
