"""Energies and gradients of one molecule at one level: the surface on which it is relaxed."""

from __future__ import annotations

import hashlib
import io
import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import ConvergenceError
from ..files import write_atomically
from ..level import Level
from ..molecule import Molecule
from ..point import Point, Solvent
from .boundary import library_errors
from .converge import converge
from .gradient import nuclear_gradient
from .meanfield import mean_field
from .mole import build_mole
from .settings import Settings, identity
from .stability import internal_stability
from .threads import suited_to

Floats = NDArray[np.float64]
Report = Callable[[str, int, float, float], None]
"""Called with (stage, step, energy_Eh, largest gradient component in Eh/bohr) after every step."""

RELAXATION = Settings("def2-universal-jkfit", 2, 1e-9, 1e-5, 0)
"""Fitting, grid and thresholds of relaxations. Turned in space, CF3 changes its energy by 1e-5 Eh on grid 2 and on
grid 3, by 3e-7 Eh on grid 4: hence the grid of the final energy."""
FINAL_GRID = 4
CURVATURE_GRID = 1
"""Enough for second derivatives: allyl's lowest modes differ by 1 cm^-1 from grid 2, at half the time. On grid 0
PySCF's analytic Hessian is wrong by 200 cm^-1, while gradient differences are right."""

CAVITY_ORDER = 17
"""Lebedev order of a continuum's surface on relaxing: 110 points per atom instead of 302. The energy shifts by some
1e-4 Eh for all structures alike, gradients by 5e-5 Eh/bohr (seen for CO2- in water)."""

LOWER_Eh = 1e-6
"""By how much a second electronic state must be lower to be taken."""
NEAR_BOHR = 0.6
"""The last density starts the next step if no nucleus has moved farther."""
SURFACE_VERSION = 3
"""Raised whenever energies or gradients change."""
_ROUND = 8
"""Decimals of a bohr that tell two geometries apart."""


class Surface:
    """Calling it with coordinates (atoms, 3) in bohr gives (energy in Eh, gradient (atoms, 3) in Eh/bohr).

    With a folder every answer is kept there as a small JSON file and the last density beside it, so that a repeated
    relaxation replays the steps already done and a kill loses one step at most.
    """

    def __init__(
        self,
        molecule: Molecule,
        level: Level,
        solvent: Solvent | None = None,
        folder: Path | None = None,
        settings: Settings = RELAXATION,
    ) -> None:
        self.molecule = molecule
        self.level = level
        self.solvent = solvent
        self.settings = settings
        self.computed = 0
        """Gradients computed by this object, replayed ones not counted."""
        self._last: tuple[Floats, Floats] | None = None
        """Coordinates and density of the last step."""
        self._folder = folder / f"surface-{self._key()[:16]}" if folder is not None else None

    def _key(self) -> str:
        question = {
            "surface_version": SURFACE_VERSION,
            "elements": self.molecule.elements,
            "charge": self.molecule.charge,
            "multiplicity": self.molecule.multiplicity,
            "level": self.level.to_dict(),
            "dielectric": self.solvent.dielectric if self.solvent else None,
            "settings": vars(self.settings),
            "engine": identity(self.level),
        }
        return hashlib.sha256(json.dumps(question, sort_keys=True).encode()).hexdigest()

    def __call__(self, coordinates_bohr: Floats) -> tuple[float, Floats]:
        coordinates = np.asarray(coordinates_bohr, dtype=np.float64).reshape(-1, 3)
        known = self._recall(coordinates)
        if known is not None:
            return known
        field = self.converged(coordinates)
        with library_errors(f"{self.level.id}, gradient"), suited_to(field.mol.nao):
            gradient = nuclear_gradient(field)
        self.computed += 1
        self._remember(coordinates, float(field.e_tot), gradient)
        return float(field.e_tot), gradient

    def converged(self, coordinates_bohr: Floats) -> Any:
        """A converged PySCF mean-field object at these coordinates, started from the last density.

        Raises ConvergenceError if no scheme of `converge` ends in a stationary state.
        """
        field = self.field(coordinates_bohr)
        guess = self._guess(coordinates_bohr, field.mol.nao)
        with library_errors(self.level.id), suited_to(field.mol.nao):
            converge(field, field.get_init_guess(key="minao") if guess is None else guess)
        if not field.converged:
            raise ConvergenceError(f"{self.level.id}: the self-consistent field did not converge on relaxing")
        self._last = np.array(coordinates_bohr), np.asarray(field.make_rdm1())
        return field

    @property
    def folder(self) -> Path | None:
        """Where steps of all surfaces are kept."""
        return self._folder.parent if self._folder is not None else None

    def on_grid(self, grid_level: int) -> Surface:
        """The same surface on another grid, beginning with the same density."""
        other = Surface(
            self.molecule,
            self.level,
            self.solvent,
            self.folder,
            replace(self.settings, grid_level=grid_level),
        )
        other._last = self._last
        return other

    def final_energy_Eh(self, coordinates_bohr: Floats) -> float:
        """The energy on a grid so fine that a turned molecule has the same one to 1e-6 Eh."""
        if not self.level.is_kohn_sham:
            return self(coordinates_bohr)[0]
        fine = self.on_grid(FINAL_GRID)
        coordinates = np.asarray(coordinates_bohr, dtype=np.float64).reshape(-1, 3)
        file = fine._file(coordinates, "energy") if fine._folder is not None else None
        try:
            if file is not None:
                return float(json.loads(file.read_text())["energy_Eh"])
        except (OSError, ValueError, KeyError):
            pass
        energy = float(fine.converged(coordinates).e_tot)
        if file is not None:
            write_atomically(file, json.dumps({"energy_Eh": energy}))
        return energy

    def knows(self, coordinates_bohr: Floats) -> bool:
        """True if the gradient at these coordinates is on disk."""
        return self._recall(np.asarray(coordinates_bohr, dtype=np.float64).reshape(-1, 3)) is not None

    def steady(self, coordinates_bohr: Floats) -> str:
        """Test the electronic state at these coordinates and go to a lower one nearby, if there is one.

        The next step then starts from it. Returns what was found as a sentence, empty if the state is stable.
        """
        field = self.converged(coordinates_bohr)
        verdict, curved = internal_stability(field)
        if verdict.stable is not False or verdict.direction is None or curved is None:
            return ""
        before = float(field.e_tot)
        best = None
        for length in (0.3, -0.3, 0.8, -0.8):
            second = self.field(coordinates_bohr)
            density = second.make_rdm1(curved.rotated(length * verdict.direction), field.mo_occ)
            converge(second, density)
            if second.converged and second.e_tot < before - LOWER_Eh:
                best = second
                break
        if best is None:
            return (
                f"the electronic state is unstable (curvature {verdict.lowest_Eh:.3f} Eh), no lower one found"
            )
        self._last = np.array(coordinates_bohr), np.asarray(best.make_rdm1())
        return f"the electronic state was unstable; a lower one was found {before - best.e_tot:.5f} Eh below"

    def field(self, coordinates_bohr: Floats) -> Any:
        """An unconverged mean-field object at these coordinates.

        Its grid stands still in space: one that turns with the molecule jumps when two moments are nearly equal,
        and a relaxation stumbles over steps of 1e-5 Eh (seen for CF3).
        """
        from pyscf import dft

        point = Point(self.molecule.moved(coordinates_bohr), self.level, self.solvent)
        field = mean_field(build_mole(point), self.level, self.solvent, self.settings)
        field.chkfile = None
        field.conv_check = False  # one more iteration for nothing: the gradient threshold is what counts
        if self.solvent is not None:
            field.with_solvent.lebedev_order = CAVITY_ORDER
        if self.level.is_kohn_sham:
            field.grids = dft.gen_grid.Grids(field.mol)
            field.grids.level = self.settings.grid_level
        return field

    # --- what is kept on disk ----------------------------------------

    def _file(self, coordinates: Floats, kind: str = "gradient") -> Path:
        assert self._folder is not None
        rounded = np.round(coordinates, _ROUND) + 0.0
        return self._folder / f"{kind}-{hashlib.sha256(rounded.tobytes()).hexdigest()[:32]}.json"

    def _recall(self, coordinates: Floats) -> tuple[float, Floats] | None:
        if self._folder is None:
            return None
        try:
            data = json.loads(self._file(coordinates).read_text())
            return float(data["energy_Eh"]), np.array(data["gradient_Eh_bohr"], dtype=np.float64)
        except (OSError, ValueError, KeyError):
            return None

    def _remember(self, coordinates: Floats, energy: float, gradient: Floats) -> None:
        if self._folder is None or self._last is None:
            return
        data = {
            "coordinates_bohr": coordinates.tolist(),
            "energy_Eh": energy,
            "gradient_Eh_bohr": gradient.tolist(),
        }
        write_atomically(self._file(coordinates), json.dumps(data))
        buffer = io.BytesIO()
        np.savez(buffer, coordinates_bohr=self._last[0], density=self._last[1])
        write_atomically(self._folder / "density.npz", buffer.getvalue())

    def _guess(self, coordinates: Floats, functions: int) -> Floats | None:
        """The last density, of this object or stored, if it was found nearby."""
        if self._last is None and self._folder is not None:
            try:
                with np.load(self._folder / "density.npz", allow_pickle=False) as data:
                    self._last = np.array(data["coordinates_bohr"]), np.array(data["density"])
            except (OSError, ValueError, KeyError):
                return None
        if self._last is None:
            return None
        where, density = self._last
        near = where.shape == coordinates.shape and abs(where - coordinates).max() <= NEAR_BOHR
        return density if near and density.shape == (2, functions, functions) else None
