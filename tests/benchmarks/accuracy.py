"""Largest error of each accuracy on each kind of nucleus, against exact integrals on the fine grid.

    python tests/benchmarks/accuracy.py [quick|standard ...] [--radicals CH3,NH2]

Small radicals with H, B, C, N, O, F, Si, P, S and Cl, UHF and UKS-B3LYP in pcH-1. Both calculations of a pair start from
the reference density, so that they are the same state. An error is judged by the larger of 0.003 mT and 0.1 % of the
coupling: 1.00 is just allowed.
"""

from __future__ import annotations

import sys
from collections import defaultdict

import numpy as np
from numpy.typing import NDArray

from unpaired.constants import BOHR_ANGSTROM
from unpaired.electronic import fitting
from unpaired.electronic.converge import converge
from unpaired.electronic.meanfield import mean_field
from unpaired.electronic.mole import build_mole
from unpaired.electronic.settings import SETTINGS
from unpaired.errors import ConvergenceError
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.nuclei import table_isotope
from unpaired.properties.contact import spin_density_at_nuclei

# name: atoms in angstrom, charge, multiplicity. Sensible distances, not relaxed: both sides take the same.
RADICALS = {
    "F2-": ("F 0 0 0; F 0 0 1.98", -1, 2),
    "P": ("P 0 0 0", 0, 4),
    "N": ("N 0 0 0", 0, 4),
    "BH3-": ("B 0 0 0; H 0 1.23 0; H 1.0652 -0.615 0; H -1.0652 -0.615 0", -1, 2),
    "BF2": ("B 0 0 0; F 0 1.12 0.70; F 0 -1.12 0.70", 0, 2),
    "CH3": ("C 0 0 0; H 0 1.079 0; H 0.93444 -0.5395 0; H -0.93444 -0.5395 0", 0, 2),
    "CF3": ("C 0 0 0.33; F 0 1.26 0; F 1.0912 -0.63 0; F -1.0912 -0.63 0", 0, 2),
    "NH2": ("N 0 0 0; H 0 0.80 0.634; H 0 -0.80 0.634", 0, 2),
    "H2CN": ("C 0 0 0; N 0 0 1.247; H 0 0.94 -0.56; H 0 -0.94 -0.56", 0, 2),
    "CN": ("C 0 0 0; N 0 0 1.172", 0, 2),
    "HO2": ("O 0 0 0; O 0 0 1.33; H 0 0.942 -0.244", 0, 2),
    "O2": ("O 0 0 0; O 0 0 1.208", 0, 3),
    "SiH3": ("Si 0 0 0.4; H 0 1.41 0; H 1.2211 -0.705 0; H -1.2211 -0.705 0", 0, 2),
    "PH2": ("P 0 0 0; H 0 1.02 0.985; H 0 -1.02 0.985", 0, 2),
    "PF2": ("P 0 0 0; F 0 1.20 1.03; F 0 -1.20 1.03", 0, 2),
    "HSO": ("S 0 0 0; O 0 0 1.50; H 0 1.32 -0.35", 0, 2),
    "CH3S": ("C 0 0 0; S 0 0 1.80; H 0 1.03 -0.36; H 0.892 -0.515 -0.36; H -0.892 -0.515 -0.36", 0, 2),
    "CHCl2": ("C 0 0 0; Cl 0 1.48 0.86; Cl 0 -1.48 0.86; H 0 0 -1.08", 0, 2),
}
METHODS = (("UHF", None), ("UKS", "B3LYP"))
ABSOLUTE_mT, RELATIVE = 0.003, 0.001


def molecule(name: str) -> Molecule:
    """One of RADICALS."""
    text, charge, multiplicity = RADICALS[name]
    rows = [atom.split() for atom in text.split(";")]
    coordinates = np.array([[float(x) for x in row[1:]] for row in rows]) / BOHR_ANGSTROM
    return Molecule(tuple(row[0] for row in rows), coordinates, charge, multiplicity)


def errors(
    name: str, scf: str, functional: str | None, accuracies: list[str]
) -> tuple[NDArray[np.float64], dict[str, NDArray[np.float64]]]:
    """Reference couplings in mT and, for each accuracy, what it differs by."""
    from unpaired.point import Point

    level = Level(scf, "pcH-1", functional)
    radical = molecule(name)
    mole = build_mole(Point(radical, level))
    exact = mean_field(mole, level, None, SETTINGS["reference"])
    converge(exact, exact.get_init_guess())
    if not exact.converged:
        raise ConvergenceError(f"{name} {scf}: the reference did not converge")
    density = np.asarray(exact.make_rdm1())
    values = couplings_mT(radical, mole, density)
    found = {}
    for accuracy in accuracies:
        field = mean_field(mole, level, None, SETTINGS[accuracy])
        field.kernel(dm0=density)
        fitting.release()
        if not field.converged:
            raise ConvergenceError(f"{name} {scf}: {accuracy} did not converge")
        found[accuracy] = couplings_mT(radical, mole, np.asarray(field.make_rdm1())) - values
    return values, found


def couplings_mT(radical: Molecule, mole: object, density: NDArray[np.float64]) -> NDArray[np.float64]:
    """Isotropic couplings of the table isotopes from alpha and beta densities."""
    from unpaired.constants import CONTACT_MHZ, MHZ_PER_MT

    at_nuclei = mole.eval_gto("GTOval", mole.atom_coords())  # type: ignore[attr-defined]
    rho = spin_density_at_nuclei(density[0] - density[1], at_nuclei)
    nuclear = np.array([table_isotope(element).nuclear_g for element in radical.elements])  # type: ignore[union-attr]
    return np.asarray(CONTACT_MHZ * nuclear * rho / (radical.multiplicity - 1) / MHZ_PER_MT)


def share_of_limit(errors_mT: NDArray[np.float64], values_mT: NDArray[np.float64]) -> NDArray[np.float64]:
    """Errors over what is allowed."""
    return np.asarray(np.abs(errors_mT) / np.maximum(ABSOLUTE_mT, RELATIVE * np.abs(values_mT)))


def main() -> None:
    """Print every error, then the largest of each nucleus."""
    arguments = sys.argv[1:]
    names = list(RADICALS)
    if "--radicals" in arguments:
        place = arguments.index("--radicals")
        names = arguments[place + 1].split(",")
        del arguments[place : place + 2]
    accuracies = arguments or ["quick", "standard"]
    worst: dict[tuple[str, str], tuple[float, float]] = defaultdict(lambda: (0.0, 0.0))
    for name in names:
        for scf, functional in METHODS:
            try:
                values, found = errors(name, scf, functional, accuracies)
            except ConvergenceError as error:
                print(f"LEFT OUT: {error}", flush=True)
                continue
            for accuracy, off in found.items():
                shares = share_of_limit(off, values)
                print(f"{name:6}{scf:4} {accuracy:9} largest error {np.abs(off).max():.5f} mT, "
                      f"{shares.max():5.2f} of the limit", flush=True)  # fmt: skip
                for element, wrong, share in zip(molecule(name).elements, off, shares, strict=True):
                    before = worst[accuracy, element]
                    worst[accuracy, element] = max(before[0], abs(wrong)), max(before[1], share)
    print("\nnucleus " + "".join(f"{accuracy:>22}" for accuracy in accuracies))
    for element in sorted({element for _, element in worst}):
        cells = (worst[accuracy, element] for accuracy in accuracies)
        print(f"{element:8}" + "".join(f"{wrong:10.5f} mT ({share:5.2f})" for wrong, share in cells))


if __name__ == "__main__":
    main()
