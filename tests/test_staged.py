"""The coarse stage of Kohn-Sham fields: a detour that changes no result and gets in nobody's way."""

from dataclasses import replace

import numpy as np
import pytest

from unpaired.electronic.meanfield import mean_field
from unpaired.electronic.mole import build_mole
from unpaired.electronic.settings import settings
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point, Solvent

FORMYL = Molecule(("C", "O", "H"), np.array([[0, 0, 0], [0, 0, 2.22], [1.77, 0, -1.12]]), 0, 2)


def test_coarse_stage_changes_no_result():
    """The coarse grid is a detour on the way: energies agree to the threshold of the level."""
    level = Level("UKS", "pcseg-1", "B3LYP")
    mole = build_mole(Point(FORMYL, level))
    direct = mean_field(mole, level, None, replace(settings(level), start_grid_level=None)).run()
    staged = mean_field(mole, level, None, settings(level)).run()
    assert direct.converged
    assert staged.converged
    assert staged.e_tot == pytest.approx(direct.e_tot, abs=1e-8)
    assert staged.grids.level == settings(level).grid_level


def test_staged_field_goes_through_second_order_gradients_and_continuum():
    level = Level("UKS", "pcseg-0", "B3LYP")
    mole = build_mole(Point(FORMYL, level))
    field = mean_field(mole, level, Solvent("water", 78.4), settings(level)).run()
    second = field.newton().run()
    assert second.converged
    assert second.e_tot == pytest.approx(field.e_tot, abs=1e-7)
    gradient = field.nuc_grad_method().run().de
    np.testing.assert_allclose(gradient.sum(axis=0), 0, atol=3e-3)  # a coarse grid does not quite keep this
