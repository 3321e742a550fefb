"""What exists: basis sets, functionals and solvents, asked of PySCF and basis-set-exchange when needed.

Every function takes a name as a person spells it and raises ChoiceError, naming alternatives, if there is no
such thing. The spelling that comes back is canonical: two spellings of one thing give one level and one
stored result.
"""

from __future__ import annotations

import contextlib
import ctypes
import io
import math
import re
from collections.abc import Iterable, Sequence
from csv import DictReader
from functools import cache
from importlib import resources
from typing import Any

from .errors import ChoiceError, nearest
from .molecule import ATOMIC_NUMBER
from .point import Solvent

FOR_HYPERFINE = ("pcH-1", "pcH-2", "aug-cc-pVTZ-J", "IGLO-III", "pcJ-1", "pcJ-2", "acv3z-J", "UGBS")
"""Basis sets that describe the density at a nucleus, offered where a basis set lacks an element."""

Shell = list[Any]
"""PySCF's list of one shell: angular momentum, then [exponent, coefficient, ...] per primitive."""


# --- basis sets ----------------------------------------


def _fold(name: str) -> str:
    """Letters and signs that tell two names apart; hyphens, underscores, blanks and case do not."""
    return re.sub(r"[-_\s]", "", name).casefold()


@cache
def _exchange() -> dict[str, dict[str, Any]]:
    """Metadata of basis-set-exchange by folded name; a real name is never hidden by another's alias."""
    import basis_set_exchange

    sets = basis_set_exchange.get_metadata().values()
    found = {_fold(other): entry for entry in sets for other in entry["other_names"]}
    return found | {_fold(entry["display_name"]): entry for entry in sets}


@cache
def _own_names() -> dict[str, str]:
    """Basis sets that PySCF alone has, by folded name."""
    from pyscf.gto.basis import ALIAS

    return {_fold(name): name for name in ALIAS if _fold(name) not in _exchange()}


def _is_fitting_set(folded: str) -> bool:
    entry = _exchange().get(folded)
    if entry is not None:
        return bool(entry["role"] != "orbital")
    return folded.endswith(("fit", "ri", "+etb"))


@cache
def basis_name(text: str) -> str:
    """Canonical spelling: that of basis-set-exchange (`pcH-1`), or PySCF's for sets that PySCF alone has."""
    folded = _fold(text)
    if folded in _exchange():
        name = str(_exchange()[folded]["display_name"])
    elif folded in _own_names():
        name = _own_names()[folded]
    elif (pople := _pople_name(folded)) is not None:
        name = pople
    else:
        known = [entry["display_name"] for entry in _exchange().values()] + list(_own_names().values())
        raise ChoiceError(
            f'basis set "{text}" does not exist{nearest(text, known)} '
            f"(any of basis-set-exchange or PySCF; for hyperfine couplings: {', '.join(FOR_HYPERFINE[:4])})"
        )
    if _is_fitting_set(folded):
        raise ChoiceError(f'"{name}" is an auxiliary set for fitting, not a basis set for orbitals')
    return name


def _pople_name(folded: str) -> str | None:
    """`6-31G(2df,p)` and the like, whose polarisation functions PySCF adds by name; None if it cannot."""
    match = re.fullmatch(r"(321|431|631|6311)(\+{0,2}g)\((\d?[a-z]+)(,\d?[a-z]+)?\)", folded)
    if match is None or not _pyscf_shells(folded, "C"):
        return None
    digits, letters, heavy, light = match.groups()
    return f"{digits[0]}-{digits[1:]}{letters.upper()}({heavy}{light or ''})"


@cache
def _pyscf_shells(name: str, element: str) -> tuple[Shell, ...]:
    """PySCF's own data; empty if it has none."""
    from pyscf.gto import basis
    from pyscf.lib.exceptions import BasisNotFoundError

    # The blank keeps PySCF from taking a file of that name in the working directory for the basis set.
    try:
        return tuple(basis.load(f" {name}", element))
    except (BasisNotFoundError, OSError, KeyError):
        return ()


@cache
def _exchange_data(name: str, element: str) -> dict[str, Any]:
    import basis_set_exchange

    number = ATOMIC_NUMBER[element]
    data = basis_set_exchange.get_basis(name, elements=[number])
    return dict(data["elements"][str(number)])


def _has_element(name: str, element: str) -> bool:
    entry = _exchange().get(_fold(name))
    if entry is None:
        return bool(_pyscf_shells(name, element))
    listed = entry["versions"][entry["latest_version"]]["elements"]
    return str(ATOMIC_NUMBER[element]) in listed and "electron_shells" in _exchange_data(name, element)


def check_basis(name: str, elements: Iterable[str]) -> None:
    """Make sure that the basis set has functions for every element, core included.

    Raises ChoiceError that names the elements it lacks, or whose core it replaces by a potential, and basis
    sets that have them all.
    """
    name = basis_name(name)
    wanted = sorted(set(elements), key=ATOMIC_NUMBER.__getitem__)
    lacking = [element for element in wanted if not _has_element(name, element)]
    if lacking:
        raise ChoiceError(f'basis set "{name}" has no {_listed(lacking)}{_alternatives(wanted)}')
    replaced = [element for element in wanted if has_core_potential(name, element)]
    if replaced:
        raise ChoiceError(
            f'basis set "{name}" replaces the core of {_listed(replaced)} by a potential, so there is no '
            f"spin density at that nucleus{_alternatives(wanted)}"
        )


def _listed(elements: Sequence[str]) -> str:
    return " and ".join(filter(None, [", ".join(elements[:-1]), elements[-1]]))


def _alternatives(elements: Sequence[str]) -> str:
    fitting = [name for name in FOR_HYPERFINE if all(_has_element(name, element) for element in elements)]
    return f"; these have all elements of the molecule: {', '.join(fitting)}" if fitting else ""


def basis_for(name: str, element: str) -> list[Shell]:
    """Basis functions of one element in PySCF's list form: [l, [exponent, coefficient, ...], ...] per shell.

    The functions are those of basis-set-exchange, or PySCF's where only PySCF has the set; they are meant as
    spherical harmonics. Raises ChoiceError if the set lacks the element.
    """
    name = basis_name(name)
    if not _has_element(name, element):
        raise ChoiceError(f'basis set "{name}" has no {element}{_alternatives([element])}')
    if _fold(name) not in _exchange():
        return [list(shell) for shell in _pyscf_shells(name, element)]
    return _shells(_exchange_data(name, element)["electron_shells"])


def _shells(shells: Sequence[dict[str, Any]]) -> list[Shell]:
    """Shells of basis-set-exchange as PySCF's lists, lowest angular momentum first.

    A combined shell (sp) has one column of coefficients per angular momentum; otherwise every column is a
    contraction of one angular momentum.
    """
    converted: list[Shell] = []
    for shell in shells:
        exponents = [float(value) for value in shell["exponents"]]
        columns = [[float(value) for value in column] for column in shell["coefficients"]]
        momenta = shell["angular_momentum"]
        parts = (
            [(momenta[0], columns)]
            if len(momenta) == 1
            else [(momentum, [column]) for momentum, column in zip(momenta, columns, strict=True)]
        )
        for momentum, own in parts:
            rows = [list(row) for row in zip(exponents, *own, strict=True)]
            converted.append([momentum, *(row for row in rows if any(row[1:]))])
    return sorted(converted, key=lambda shell: int(shell[0]))


@cache
def has_core_potential(name: str, element: str) -> bool:
    """Whether the set replaces the core of this element by a potential: no density at the nucleus then."""
    name = basis_name(name)
    if _fold(name) in _exchange():
        return _has_element(name, element) and "ecp_potentials" in _exchange_data(name, element)
    from pyscf.gto import basis
    from pyscf.lib.exceptions import BasisNotFoundError

    try:
        return bool(basis.load_ecp(f" {name}", element))
    except (BasisNotFoundError, OSError, KeyError):
        return False


# --- functionals ----------------------------------------

_SPELLINGS = (
    "TPSSh",
    "revTPSSh",
    "revTPSS",
    "revPBE",
    "revPBE0",
    "r2SCAN",
    "r2SCANh",
    "r2SCAN0",
    "r2SCAN50",
    "rSCAN",
    "PBEsol",
    "BHandH",
    "BHandHLYP",
    "wB97",
    "wB97X",
    "wB97X-V",
    "wB97M-V",
    "revB3LYP",
    "revSCAN",
    "revM06",
    "revM06-L",
    "revM11",
    "tau-HCTH",
    "LC-wPBE",
    "LRC-wPBE",
    "LRC-wPBEh",
    "mPW91",
    "mPW1K",
    "mPW1PW",
    "mPW1PBE",
    "mPW3PW",
    "mPW3LYP",
)
"""Usual mixed-case spellings; everything else is written in upper case."""

_DOUBLE_HYBRID = re.compile(
    r"(b2|mpw2|b2gp|b2k|b2t|wb2|rsx)\w*plyp|dsd.*|dod.*|pwpb95.*|ptpss.*|xyg\w+|wb97x2\w*|wb97m\(?2\)?|pbe0dh|pbe02|"
    r"pbeqidh|.*qidh|.*0dh|revdsd.*",
)


@cache
def _functionals() -> dict[str, str]:
    """Canonical spelling of every functional that has a name of its own, by folded name."""
    from pyscf.dft import libxc

    short = set(libxc.XC_ALIAS)
    for key in libxc.XC_CODES:
        if re.match(r"(HYB_)?(LDA|GGA|MGGA)_XC_", key):
            short.add(re.sub(r"^(HYB_)?(LDA|GGA|MGGA)_XC_", "", key))
        elif not re.match(r"(HYB_)?(LDA|GGA|MGGA)_", key):
            short.add(key)
    short = {key for key in short if _adds_dispersion(key) is None}
    found: dict[str, str] = {}
    # Spellings with separators come last and win: CAM_B3LYP over CAMB3LYP.
    for key in sorted(short, key=lambda key: (key.count("_"), key)):
        hyphened = key.replace("_", "-")
        found[_fold(key)] = hyphened if _parsed(hyphened) == _parsed(key) else key
    for spelling in _SPELLINGS:
        if _fold(spelling) in found and _parsed(spelling) is not None:
            found[_fold(spelling)] = spelling
    return found


def _parsed(text: str) -> Any:
    """libxc identifiers and weights as PySCF reads the text; None if it cannot."""
    from pyscf.dft import libxc

    with contextlib.redirect_stderr(io.StringIO()):  # PySCF remarks on ambiguous names there
        try:
            return libxc.parse_xc(text)
        except (KeyError, ValueError, AssertionError, NotImplementedError, TypeError, IndexError):
            return None


@cache
def functional_name(text: str) -> str:
    """Canonical spelling of a functional of libxc or of a combination of them (`0.3*HF+0.7*B88,LYP`).

    Raises ChoiceError if it does not exist or cannot be converged self-consistently here.
    """
    compact = re.sub(r"\s", "", text)
    folded = re.sub(r"^(hyb)?(lda|gga|mgga)xc", "", _fold(compact))
    if re.fullmatch(r".+d[34](bj|zero|bjm|zerom|op)?", folded) and "_" not in compact:
        raise ChoiceError(
            f'functional "{text}" contains a dispersion correction, which changes no coupling; '
            "name the functional alone"
        )
    if _DOUBLE_HYBRID.fullmatch(folded):
        raise ChoiceError(
            f'functional "{text}" is a double hybrid, whose perturbation part has no spin density here; '
            "take a hybrid such as B3LYP or PBE0"
        )
    name = _functionals().get(folded)
    if name is None or _parsed(name) != _parsed(compact) is not None:
        name = compact.upper()
    if not compact or _parsed(name) is None:
        raise ChoiceError(
            f'functional "{text}" does not exist{nearest(text, _functionals().values())} '
            "(any of libxc, such as B3LYP, PBE0, TPSSh, or a combination such as 0.3*HF+0.7*B88,LYP)"
        )
    _require_runnable(text, name)
    return name


def _require_runnable(text: str, name: str) -> None:
    from pyscf.dft import libxc

    (exact, long_range, _), _ = _parsed(name)
    evaluator = libxc.XCFunctionalCache(name, 1)  # held, because it frees its functionals when it goes
    kinds = [_information(functional, "kind") for functional in evaluator.xc_objs]
    flags = [_information(functional, "flags") for functional in evaluator.xc_objs]
    reason = None
    if _KINETIC in kinds:
        reason = "contains a functional of the kinetic energy, which Kohn-Sham calculations do not use"
    elif not exact and not long_range and not {_EXCHANGE, _BOTH} & set(kinds):
        reason = "has no exchange part"
    elif any(not flag & _THREE_DIMENSIONS for flag in flags):
        reason = "is not for electrons in three dimensions"
    elif any(not flag & _ENERGY or not flag & _POTENTIAL for flag in flags):
        reason = "gives a potential without an energy or an energy without a potential"
    elif libxc.needs_laplacian(name):
        reason = "needs the Laplacian of the density, which PySCF cannot use self-consistently"
    elif (alone := _adds_dispersion(name)) is not None:
        reason = (
            f"comes with a dispersion correction, which changes no coupling; its functional alone is {alone}"
        )
    elif not _gives_potential(name):
        reason = "gives no finite energy and potential"
    if reason is not None:
        raise ChoiceError(f'functional "{text}" {reason}')


_EXCHANGE, _BOTH, _KINETIC = 0, 2, 3  # libxc: XC_EXCHANGE, XC_EXCHANGE_CORRELATION, XC_KINETIC
_ENERGY, _POTENTIAL, _THREE_DIMENSIONS = 1, 2, 128  # libxc: XC_FLAGS_HAVE_EXC, XC_FLAGS_HAVE_VXC, XC_FLAGS_3D


def _information(functional: Any, what: str) -> int:
    """`kind` or `flags` that libxc gives for one of its functionals."""
    from pyscf.dft import libxc

    library = libxc._itrf
    library.xc_func_get_info.restype = ctypes.c_void_p
    information = ctypes.c_void_p(library.xc_func_get_info(functional))
    return int(getattr(library, f"xc_func_info_get_{what}")(information))


def _adds_dispersion(name: str) -> str | None:
    """The spelling without the dispersion energy that PySCF ties to some names; None for all others."""
    from pyscf.scf.dispersion import parse_dft

    with contextlib.suppress(NotImplementedError):
        if parse_dft(name)[2] is None:
            return None
    return ",".join(_libxc_name(number) for number, _ in _parsed(name)[1])


def _gives_potential(name: str) -> bool:
    """Try the functional on a few points of a spin-polarised exponential density."""
    import numpy as np
    from pyscf.dft import libxc

    kind = libxc.xc_type(name)
    if kind == "HF":
        return True
    radius = np.linspace(0.2, 3.0, 7)
    density = np.exp(-2 * radius)
    gradient, zero = -2 * density, np.zeros_like(radius)
    values = np.array([density, gradient, zero, zero, gradient**2 / (8 * density) + 0.1 * density ** (5 / 3)])
    values = values[: {"LDA": 1, "GGA": 4, "MGGA": 5}[kind]]
    try:
        energy, potential = libxc.eval_xc_eff(name, np.stack([values, 0.6 * values]), deriv=1, spin=1)[:2]
    except (NotImplementedError, RuntimeError, ValueError):
        return False
    return bool(np.isfinite(energy).all() and np.isfinite(potential).all() and np.any(energy))


def _libxc_name(number: int) -> str:
    from pyscf.dft import libxc

    name_of = libxc._itrf.xc_functional_get_name
    name_of.restype = ctypes.c_char_p
    return str(name_of(ctypes.c_int(int(number))).decode().upper())


def _components(functional: Any) -> list[tuple[int, float]]:
    """(identifier, weight) of the functionals that libxc sums for one of its own; empty if it sums none.

    Only exchange and correlation in one can be a sum; others use auxiliary functionals without weights.
    """
    from pyscf.dft import libxc

    if _information(functional, "kind") != _BOTH:
        return []
    library = libxc._itrf
    count = library.xc_num_aux_funcs(functional)
    if count <= 0:
        return []
    numbers, weights = (ctypes.c_int * count)(), (ctypes.c_double * count)()
    library.xc_aux_func_ids(functional, numbers)
    library.xc_aux_func_weights(functional, weights)
    return list(zip(numbers, weights, strict=True))


@cache
def functional_as_libxc(name: str) -> str:
    """What libxc runs for a functional: components with their weights, exact exchange, range separation.

    `B3LYP` gives `0.08*LDA_X + 0.72*GGA_X_B88 + 0.19*LDA_C_VWN_RPA + 0.81*GGA_C_LYP + 0.2*exact exchange`.
    """
    from pyscf.dft import libxc

    name = functional_name(name)
    evaluator = libxc.XCFunctionalCache(name, 1)
    terms = []
    for number, factor, functional in zip(evaluator.fn_ids, evaluator.facs, evaluator.xc_objs, strict=True):
        for part, weight in _components(functional) or [(number, 1.0)]:
            terms.append(f"{factor * weight:.10g}*{_libxc_name(part)}")
    omega, long_range, difference = (float(value) for value in evaluator.rsh_coeff)
    if omega:
        terms.append(
            f"exact exchange {long_range + difference:.10g} at short and {long_range:.10g} at long range "
            f"(omega {omega:.10g} bohr^-1)"
        )
    elif evaluator.hybrid_coeff:
        terms.append(f"{float(evaluator.hybrid_coeff):.10g}*exact exchange")
    if evaluator.is_nlc:
        terms.extend(f"VV10 (b {b:.10g}, C {c:.10g})" for (b, c), _ in evaluator.nlc_coeff)
    return " + ".join(terms)


# --- solvents ----------------------------------------


def _solvent_key(text: str) -> str:
    return re.sub(r"[-_,'\s]", "", text).casefold()


@cache
def _solvents() -> dict[str, Solvent]:
    """Solvents by folded spelling: PySCF's table, then our names, spellings and additions."""
    from pyscf.solvent.smd import solvent_db

    found = {
        _solvent_key(name): Solvent(name, float(values[5])) for name, values in solvent_db.items() if name
    }
    table = resources.files("unpaired").joinpath("data/solvents.csv").read_text(encoding="utf-8")
    for row in DictReader(table.splitlines()):
        in_pyscf = row["name_in_pyscf"]
        dielectric = float(solvent_db[in_pyscf][5]) if in_pyscf else float(row["dielectric"])
        solvent_found = Solvent(row["name"], dielectric)
        for spelling in filter(None, [row["name"], in_pyscf, *row["other_spellings"].split("; ")]):
            found[_solvent_key(spelling)] = solvent_found
    return found


def solvent(value: str | float) -> Solvent:
    """A continuum by name (`THF`, `dimethyl sulfoxide`) or by its dielectric constant, 1 or more."""
    if isinstance(value, bool) or not isinstance(value, (str, int, float)):
        raise ChoiceError(f"solvent {value!r} is neither a name nor a dielectric constant")
    if isinstance(value, str):
        with contextlib.suppress(ValueError):
            value = float(value)
    if isinstance(value, str):
        found = _solvents().get(_solvent_key(value))
        if found is None:
            known = [item.name for item in _solvents().values()]
            raise ChoiceError(
                f'solvent "{value}" is not known{nearest(value, known)} '
                "(a name such as water or toluene, or a dielectric constant; leave it out for the gas phase)"
            )
        return found
    if not (math.isfinite(value) and value >= 1):
        raise ChoiceError(f"solvent {value:g}: a dielectric constant is a finite number from 1 up")
    return Solvent(f"{value:g}", float(value))
