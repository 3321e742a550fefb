"""Basis sets by name: canonical spelling, refusals that help, and the very functions that were published."""

from __future__ import annotations

import numpy as np
import pytest

from unpaired.catalogue import basis_for, basis_name, check_basis, has_core_potential
from unpaired.errors import ChoiceError


@pytest.mark.parametrize(
    ("text", "canonical"),
    [
        ("pch-1", "pcH-1"),
        ("PCH1", "pcH-1"),
        ("6-31g(d,p)", "6-31G(d,p)"),
        ("def2tzvp", "def2-TZVP"),
        ("Aug-cc-pVTZ-J", "aug-cc-pVTZ-J"),
        ("iglo-iii", "IGLO-III"),
        ("DZP", "dzp"),  # PySCF alone
        ("6-31g(2d,2p)", "6-31G(2d,2p)"),  # put together by PySCF
    ],
)
def test_spellings_become_one(text: str, canonical: str) -> None:
    assert basis_name(text) == canonical
    assert basis_name(canonical) == canonical


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("pch-9", 'did you mean "pcH-'),
        ("def2-universal-jkfit", "auxiliary set"),
        ("gth-dzvp", "pseudopotentials"),
        (
            "EPR-III",
            "for hyperfine couplings: pcH-1",
        ),  # not in basis-set-exchange 0.12 (physics notes, section 3)
        ("", "does not exist"),
    ],
)
def test_a_name_that_cannot_be_used_is_refused(text: str, said: str) -> None:
    with pytest.raises(ChoiceError) as caught:
        basis_name(text)
    assert said in caught.value.message


def test_missing_elements_are_named_with_basis_sets_that_have_them() -> None:
    with pytest.raises(ChoiceError) as caught:
        check_basis("pcH-1", ["H", "Br", "C", "Fe", "H"])
    assert (
        'basis set "pcH-1" has no Fe and Br; these have all elements of the molecule: '
        in caught.value.message
    )
    with pytest.raises(ChoiceError, match="aug-cc-pVTZ-J"):
        check_basis("pcH-1", ["Fe"])


def test_a_basis_set_that_has_every_element_passes() -> None:
    check_basis("pcH-1", ["H", "C", "N", "O", "F", "Si", "P", "S", "Cl"])


@pytest.mark.parametrize(
    ("name", "element", "has"),
    [
        ("def2-TZVP", "I", True),
        ("def2-TZVP", "C", False),
        ("LANL2DZ", "Br", True),
        ("pcH-1", "Cl", False),
        ("ccecpccpvdz", "C", True),
        ("PAW-L1", "O", True),
    ],
)
def test_core_potentials_are_recognised(name: str, element: str, has: bool) -> None:
    assert has_core_potential(name, element) is has


def test_a_core_potential_is_refused() -> None:
    with pytest.raises(ChoiceError, match="replaces the core of I by a potential"):
        check_basis("def2-TZVP", ["C", "I"])


@pytest.mark.parametrize(
    ("name", "element"),
    [("6-31G", "C"), ("cc-pVTZ", "N"), ("pcH-1", "O"), ("STO-3G", "Na"), ("pcseg-1", "Cl")],
)
def test_functions_are_those_that_pyscf_reads_from_the_same_source(name: str, element: str) -> None:
    """Overlap of our functions with PySCF's own reading of basis-set-exchange: the two span one space."""
    import basis_set_exchange
    from pyscf import gto

    text = basis_set_exchange.get_basis(name, elements=[element], fmt="nwchem", header=False)
    theirs, ours = gto.Mole(), gto.Mole()
    for mole, basis in ((theirs, gto.basis.parse(text)), (ours, basis_for(name, element))):
        mole.atom, mole.spin, mole.basis, mole.verbose = [[element, (0, 0, 0)]], None, {element: basis}, 0
        mole.build(dump_input=False, parse_arg=False)
    assert ours.nao == theirs.nao
    cross = gto.intor_cross("int1e_ovlp", ours, theirs)
    projected = cross @ np.linalg.solve(theirs.intor("int1e_ovlp"), cross.T)
    assert np.abs(projected - ours.intor("int1e_ovlp")).max() < 1e-10


def test_exponents_and_coefficients_are_the_published_ones() -> None:
    """STO-3G hydrogen: Hehre, Stewart, Pople, J. Chem. Phys. 51, 2657 (1969), as in basis-set-exchange."""
    assert basis_for("sto-3g", "H") == [
        [0, [3.425250914, 0.1543289673], [0.6239137298, 0.5353281423], [0.168855404, 0.4446345422]]
    ]


def test_what_comes_back_can_be_changed_without_harm() -> None:
    basis_for("STO-3G", "H").clear()
    assert len(basis_for("STO-3G", "H")) == 1


@pytest.mark.parametrize("name", ["iglo3", "minao", "6-31G(2d,2p)"])
def test_sets_of_pyscf_alone_come_as_plain_shells(name: str) -> None:
    for shell in basis_for(name, "C"):
        assert isinstance(shell[0], int)
        assert all(isinstance(row, list | tuple) for row in shell[1:])


def test_an_element_that_is_missing_is_refused_where_functions_are_asked_for() -> None:
    with pytest.raises(ChoiceError, match='"pcH-1" has no Xe'):
        basis_for("pcH-1", "Xe")


def test_a_file_of_that_name_is_not_read(tmp_path: object, monkeypatch: pytest.MonkeyPatch) -> None:
    from pathlib import Path

    folder = Path(str(tmp_path))
    (folder / "minao").write_text("not a basis set")
    monkeypatch.chdir(folder)
    assert len(basis_for("minao", "N")) > 0
