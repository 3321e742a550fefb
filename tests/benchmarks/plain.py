"""The plain script that the benchmark races: PySCF's defaults and nothing else.

    python tests/benchmarks/plain.py molecules/benzyl.xyz UKS pcH-1 [B3LYP]

Exact integrals, default grid and thresholds, 8000 MB so that it does not fall off the in-core cliff. Prints the energy
and the isotropic couplings in mT as one line of JSON. Imports nothing of this project: it is what a chemist would write.
"""

import json
import sys
from pathlib import Path

import basis_set_exchange
import numpy as np
from pyscf import dft, gto, scf

path, method, basis, *functional = sys.argv[1:]
lines = Path(path).read_text().splitlines()
atoms = "; ".join(lines[2 : 2 + int(lines[0])])
elements = {atom.split()[0] for atom in atoms.split(";")}
mol = gto.M(
    atom=atoms,
    basis={
        e: gto.parse(basis_set_exchange.get_basis(basis, elements=[e], fmt="nwchem", header=False))
        for e in elements
    },
    spin=int(gto.M(atom=atoms, basis="sto-3g", spin=None).nelectron % 2),
    max_memory=8000,
    verbose=0,
)
mf = {"UHF": scf.UHF, "ROHF": scf.ROHF, "UKS": dft.UKS, "ROKS": dft.ROKS}[method](mol)
if functional:
    mf.xc = functional[0]
mf.kernel()
alpha, beta = mf.make_rdm1()
ao = mol.eval_gto("GTOval", mol.atom_coords())
density = np.einsum("ap,pq,aq->a", ao, alpha - beta, ao)
print(
    json.dumps({"energy_Eh": mf.e_tot, "converged": bool(mf.converged), "spin_density_au": density.tolist()})
)
