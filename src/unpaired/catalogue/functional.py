"""Functionals: any of libxc through PySCF, and combinations of them."""

from __future__ import annotations

import contextlib
import ctypes
import io
import re
from functools import cache
from typing import Any

from ..errors import ChoiceError, nearest
from .basis import fold

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
    short = {key for key in short if _parsed(key) not in _with_dispersion()}
    found: dict[str, str] = {}
    # Spellings with separators come last and win: CAM_B3LYP over CAMB3LYP.
    for key in sorted(short, key=lambda key: (key.count("_"), key)):
        hyphened = key.replace("_", "-")
        found[fold(key)] = hyphened if _parsed(hyphened) == _parsed(key) else key
    for spelling in _SPELLINGS:
        if fold(spelling) in found and _parsed(spelling) is not None:
            found[fold(spelling)] = spelling
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
    folded = re.sub(r"^(hyb)?(lda|gga|mgga)xc", "", fold(compact))
    by_libxc_name = re.match(r"(HYB_)?(LDA|M?GGA)_", compact.upper()) is not None
    if re.fullmatch(r".+d[34](bj|zero|bjm|zerom|op)?", folded) and not by_libxc_name:
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
    if re.fullmatch(r"\d*", name) or _parsed(name) is None:
        raise ChoiceError(
            f'functional "{text}" does not exist{nearest(text, _functionals().values())} '
            "(any of libxc, such as B3LYP, PBE0, TPSSh, or a combination such as 0.3*HF+0.7*B88,LYP)"
        )
    if not by_libxc_name and _parsed(name) in _with_dispersion():
        raise ChoiceError(
            f'functional "{text}" comes with a dispersion correction, which changes no coupling; its functional '
            f"alone is {_with_dispersion()[_parsed(name)]}"
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


@cache
def _with_dispersion() -> dict[Any, str]:
    """Functionals that PySCF ties to a dispersion correction, as it reads them, and libxc's names for them alone."""
    from pyscf.dft import libxc
    from pyscf.scf.dispersion import parse_dft

    tied: dict[Any, str] = {}
    for key in [*libxc.XC_ALIAS, *libxc.XC_CODES]:
        short = re.sub(r"^(HYB_)?(LDA|M?GGA)_XC_", "", key)
        try:
            added = parse_dft(short.replace("_", "-"))[2] is not None
        except NotImplementedError:
            added = True
        if added and (parsed := _parsed(key)) is not None:
            tied[parsed] = ",".join(_libxc_name(number) for number, _ in parsed[1])
    return tied


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
