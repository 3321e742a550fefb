"""What exists: basis sets, functionals and solvents, asked of PySCF and basis-set-exchange when needed.

Every function takes a name as a person spells it and raises ChoiceError, naming alternatives, if there is no
such thing. The spelling that comes back is canonical: two spellings of one thing give one level and one
stored result.
"""

from .basis import basis_for, basis_name, check_basis, has_core_potential
from .functional import functional_as_libxc, functional_name
from .solvents import solvent

__all__ = [
    "basis_for",
    "basis_name",
    "check_basis",
    "functional_as_libxc",
    "functional_name",
    "has_core_potential",
    "solvent",
]
