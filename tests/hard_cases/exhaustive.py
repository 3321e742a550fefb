"""The lowest solution of every hard case, by brute force and with plain PySCF alone.

    python tests/hard_cases/exhaustive.py [CASE...]

Each case: PySCF's default start, the core Hamiltonian and random rotations of occupied into virtual orbitals, of alpha
and beta separately; from each DIIS, then second order, then as many rounds of stability test and descent as it takes.
The lowest converged energy goes to lowest.csv with the number of starts and how many of them ended there; `plain.csv`
gets what PySCF's defaults give (one kernel() from the default guess, a stability test with its defaults).
Nothing of `unpaired` is used. The file is written after every case.
"""

from __future__ import annotations

import csv
import sys
import time
import warnings
from pathlib import Path

import basis_set_exchange
import numpy as np
from pyscf import dft, gto, scf

HERE = Path(__file__).parent
SEED = 20240229
warnings.simplefilter("ignore")


def read(name: str) -> list[dict[str, str]]:
    path = HERE / name
    if not path.exists():
        return []
    with path.open(newline="") as file:
        return list(csv.DictReader(file))


def write(name: str, rows: list[dict[str, object]]) -> None:
    with (HERE / name).open("w", newline="") as file:
        writer = csv.DictWriter(file, list(rows[0]))
        writer.writeheader()
        writer.writerows(rows)


def key(row: dict[str, str]) -> tuple[str, ...]:
    return row["case"], row["scf"], row["functional"], row["basis"]


def molecule(case: dict[str, str]) -> gto.Mole:
    lines = (HERE / f"{case['case']}.xyz").read_text().splitlines()[2:]
    elements = {line.split()[0] for line in lines if line.strip()}
    basis = {
        element: gto.basis.parse(basis_set_exchange.get_basis(case["basis"], elements=element, fmt="nwchem"))
        for element in elements
    }
    return gto.M(
        atom="\n".join(lines), basis=basis, charge=int(case["charge"]),
        spin=int(case["multiplicity"]) - 1, verbose=0,
    )  # fmt: skip


def field(case: dict[str, str], mole: gto.Mole):
    if case["functional"]:
        made = getattr(dft, case["scf"])(mole)
        made.xc, made.grids.level = case["functional"], 4
        return made
    return getattr(scf, case["scf"])(mole)


def descend(made) -> bool:
    """Second order, stability, down, until stable; True if converged and stable."""
    for _ in range(8):
        newton = made.newton()
        newton.max_cycle, newton.conv_tol = 60, 1e-10
        newton.kernel(made.mo_coeff, made.mo_occ)
        made.mo_coeff, made.mo_occ, made.mo_energy = newton.mo_coeff, newton.mo_occ, newton.mo_energy
        made.e_tot, made.converged = newton.e_tot, newton.converged
        rotated, _, stable, _ = made.stability(return_status=True, nroots=1, verbose=0)
        if stable:
            return bool(made.converged)
        made.mo_coeff = rotated
    return False


def shaken(made, draw: np.random.Generator):
    """Orbitals of the default guess, occupied and virtual mixed at random."""
    fock = made.get_fock(dm=made.get_init_guess())
    energy, orbitals = made.eig(fock, made.get_ovlp())
    occupations = made.get_occ(energy, orbitals)

    def turn(c):
        size = c.shape[1]
        raw = draw.standard_normal((size, size)) * draw.choice([0.15, 0.4, 1.0])
        unitary, _ = np.linalg.qr(np.eye(size) + (raw - raw.T) / np.sqrt(size))
        return c @ unitary

    if np.ndim(orbitals) == 2:
        return turn(orbitals), occupations
    return np.stack([turn(c) for c in orbitals]), occupations


def search(case: dict[str, str]) -> dict[str, object]:
    mole = molecule(case)
    draw = np.random.default_rng(SEED)
    count = 6 if case["functional"] else 24 if mole.nao < 40 else 8
    ends = []
    for number in range(count):
        made = field(case, mole)
        made.conv_tol, made.max_cycle = 1e-10, 60
        if number == 0:
            made.kernel()
        elif number == 1:
            made.kernel(dm0=made.get_init_guess(key="1e"))
        else:
            orbitals, occupations = shaken(made, draw)
            made.kernel(dm0=made.make_rdm1(orbitals, occupations))
        try:
            if descend(made):
                ends.append((float(made.e_tot), float(made.spin_square()[0])))
        except (np.linalg.LinAlgError, ValueError, RuntimeError):
            continue
    energy, s_squared = min(ends)
    hits = sum(one - energy < 2e-6 for one, _ in ends)
    others = sorted({round(one, 5) for one, _ in ends if one - energy > 2e-6})
    return {name: case[name] for name in ("case", "scf", "functional", "basis")} | {
        "energy_Eh": f"{energy:.8f}", "s_squared": f"{s_squared:.4f}", "starts": count,
        "converged_and_stable": len(ends), "ended_lowest": hits, "next_Eh": others[0] if others else "",
    }  # fmt: skip


def plain(case: dict[str, str]) -> dict[str, object]:
    made = field(case, molecule(case))
    if case["functional"]:
        made.grids.level = 4
    made.kernel()
    stable = bool(made.stability(return_status=True, verbose=0)[2]) if made.converged else ""
    return {name: case[name] for name in ("case", "scf", "functional", "basis")} | {
        "converged": made.converged, "energy_Eh": f"{made.e_tot:.8f}", "stable": stable,
    }  # fmt: skip


def main() -> None:
    wanted = set(sys.argv[1:])
    for case in sorted(read("cases.csv"), key=lambda case: bool(case["functional"])):  # the quick ones first
        for name, work in (("plain.csv", plain), ("lowest.csv", search)):
            if wanted and case["case"] not in wanted:
                continue
            if not wanted and key(case) in {key(row) for row in read(name)}:
                continue
            begun = time.time()
            made = work(case)
            known = {key(row): row for row in read(name)} | {key(case): made}
            write(name, [known[key(one)] for one in read("cases.csv") if key(one) in known])
            print(name, *made.values(), f"{time.time() - begun:.0f} s", flush=True)


if __name__ == "__main__":
    main()
