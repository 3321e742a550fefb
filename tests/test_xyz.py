"""Reading and writing XYZ files: what is accepted, and the sentence for what is not."""

from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays
from mendeleev.fetch import fetch_table

from unpaired.constants import BOHR_ANGSTROM
from unpaired.errors import StructureError
from unpaired.molecule import SYMBOLS, Molecule
from unpaired.structures.distances import COVALENT_RADIUS_ANGSTROM, neighbours
from unpaired.structures.file import read_structure
from unpaired.structures.xyz import parse_xyz, read_xyz, xyz_text

WATER = "3\nfrom a book\nO 0 0 0\nH 0.96 0 0\nH -0.24 0.93 0\n"


def test_reads_elements_positions_and_comment() -> None:
    geometry = parse_xyz(WATER, "water.xyz")
    assert geometry.elements == ("O", "H", "H")
    assert geometry.comment == "from a book"
    np.testing.assert_allclose(geometry.coordinates_bohr[1], [0.96 / BOHR_ANGSTROM, 0, 0], rtol=1e-15)


def test_symbols_in_any_case_windows_lines_and_empty_last_lines_are_fine() -> None:
    text = "2\r\n\r\ncl 0 0 0\r\nH\t1.3e0 .0 -0.\r\n\r\n\r\n"
    assert parse_xyz(text, "hcl.xyz").elements == ("Cl", "H")


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", 'a.xyz:1: the number of atoms is expected, found ""'),
        ("0\n\n", 'a.xyz:1: the number of atoms is expected, found "0"'),
        ("C 0 0 0\n", 'a.xyz:1: the number of atoms is expected, found "C 0 0 0"'),
        ("3\n\nO 0 0 0\nH 1 0 0\n", "a.xyz:5: line 1 says 3 atoms, the file ends after 2 lines of atoms"),
        (
            "1\n\nO 0 0 0\nH 1 0 0\n",
            "a.xyz:4: line 1 says 1 atoms, one structure per file; there are 2 lines of atoms",
        ),
        ("1\n\nXx 0 0 0\n", 'a.xyz:3: unknown element "Xx"'),
        ("1\n\nCa1 0 0 0\n", 'a.xyz:3: unknown element "Ca1"; a symbol such as C is expected'),
        ("1\n\nD 0 0 0\n", "a.xyz:3: write H for D and name the isotope in the recipe (isotopes: {H1: 2H})"),
        ("1\n\nH 0 zero 0\n", 'a.xyz:3: a coordinate in angstrom is expected, found "zero"'),
        ("1\n\nH 0 nan 0\n", 'a.xyz:3: a coordinate in angstrom is expected, found "nan"'),
        ("1\n\nH 0 1e300 0\n", 'a.xyz:3: a coordinate in angstrom is expected, found "1e300"'),
        ("1\n\nH 0 1_0 0\n", 'a.xyz:3: a coordinate in angstrom is expected, found "1_0"'),
        ("1\n\nH 0 0\n", 'a.xyz:3: an element and three coordinates are expected, found "H 0 0"'),
        ("1\n\nH 0 0 0 0\n", 'a.xyz:3: an element and three coordinates are expected, found "H 0 0 0 0"'),
        (
            "2\n\nO 0 0 0\nH 0.2 0 0\n",
            "a.xyz: line 3 (O1) and line 4 (H2) overlap: 0.200 angstrom apart, nuclei need at least 0.5",
        ),
        (
            "3\n\nC 0 0 0\nH 1.1 0 0\nN 8 0 0\n",
            "a.xyz: line 5 (N3) is 6.90 angstrom from the rest (nearest line 4 (H2)): more than 3.2, "
            "so these are two molecules; give one radical",
        ),
        (
            "3\n\nO 0 0 0\nH 1.81 0 0\nH -0.45 1.75 0\n",
            "a.xyz: every atom is more than half a bond length too far from its neighbours; "
            "coordinates are read in angstrom, are these in bohr?",
        ),
    ],
)
def test_refused_with_file_and_line(text: str, message: str) -> None:
    with pytest.raises(StructureError) as caught:
        parse_xyz(text, "a.xyz")
    assert caught.value.message == message


@pytest.mark.parametrize(
    "text",
    [
        "2\nF2-, a three-electron bond\nF 0 0 0\nF 0 0 1.97\n",
        "2\nH2+ squeezed to 1 bohr\nH 0 0 0\nH 0 0 0.5292\n",
        "5\nhydroxyl and water, a hydrogen bond\nO 0 0 0\nH 0.97 0 0\nO 2.9 0 0\nH 3.2 .9 0\nH 3.2 -.9 0\n",
    ],
)
def test_long_and_short_bonds_that_exist_are_accepted(text: str) -> None:
    assert parse_xyz(text, "a.xyz").comment == text.split("\n")[1]


def test_unreadable_files_are_refused(tmp_path: Path) -> None:
    missing = tmp_path / "missing.xyz"
    with pytest.raises(StructureError, match=r"missing.xyz: cannot be read \(No such file or directory\)"):
        read_xyz(missing)
    binary = tmp_path / "binary.xyz"
    binary.write_bytes(b"\xff\xfe\x00")
    with pytest.raises(StructureError, match=r"binary.xyz: is not a text file in UTF-8"):
        read_xyz(binary)
    with pytest.raises(StructureError, match=r'a structure file ends in .xyz, .sdf, .mol, found ".pdb"'):
        read_structure(tmp_path / "a.pdb")


@given(arrays(np.float64, (3, 3), elements=st.floats(-0.1, 0.1)))
def test_written_and_read_is_the_same_to_the_last_digit_written(shift: np.ndarray) -> None:
    positions = np.array([[0, 0, 0], [1.8, 0, 0], [-0.5, 1.7, 0]]) + shift
    molecule = Molecule(("O", "H", "H"), positions, 0, 1)
    back = parse_xyz(xyz_text(molecule, "two\nlines"), "a.xyz")
    assert back.elements == molecule.elements
    assert back.comment == "two lines"
    np.testing.assert_allclose(back.coordinates_bohr, positions, atol=1.1e-10, rtol=0)


def test_covalent_radii_agree_with_a_general_purpose_table() -> None:
    """mendeleev's column of the same paper (Cordero et al. 2008), in pm.

    It has sp2 carbon and the mean of low and high spin for three metals; the paper gives both.
    """
    table = fetch_table("elements").set_index("symbol")["covalent_radius_cordero"]
    ours = {symbol: round(100 * COVALENT_RADIUS_ANGSTROM[symbol]) for symbol in SYMBOLS}
    different = {s: (ours[s], round(table[s])) for s in SYMBOLS if ours[s] != round(table[s])}
    assert different == {"C": (76, 73), "Mn": (139, 150), "Fe": (132, 142), "Co": (126, 138)}


def test_neighbours_of_water() -> None:
    geometry = parse_xyz(WATER, "water.xyz")
    assert neighbours(geometry.elements, geometry.coordinates_bohr * BOHR_ANGSTROM) == [(1, 2), (0,), (0,)]
