"""The isotope table against other tables, against measured ratios, and as it is asked."""

from __future__ import annotations

import math
from functools import cache
from typing import Any

import pytest
from scipy.constants import physical_constants

from unpaired.constants import contact_coupling_MHz
from unpaired.errors import ChoiceError
from unpaired.molecule import SYMBOLS
from unpaired.nuclei import Isotope, all_isotopes, isotope, isotopes_of, natural_composition, table_isotope

NAMES = [nucleus.name for nucleus in all_isotopes()]
LIMIT = 1e-3
"""Relative difference from which on a difference to another table is explained below."""

# --- against mendeleev ----------------------------------------

INTERVAL = "mendeleev has the middle of the interval that IUPAC gives, the table IUPAC's representative value"
ABUNDANCES_THAT_DIFFER = {
    "2H": INTERVAL,
    "6Li": INTERVAL,
    "7Li": INTERVAL,
    "10B": INTERVAL,
    "11B": INTERVAL,
    "13C": INTERVAL,
    "15N": INTERVAL,
    "17O": INTERVAL,
    "25Mg": INTERVAL,
    "29Si": INTERVAL,
    "33S": INTERVAL,
    "37Cl": INTERVAL,
    "3He": "mendeleev rounds helium of the air to 0.0002 %, the table has 1.34e-6",
}
TENTH = "mendeleev has ten times the value; 0.0694, 0.0603, 0.075 and 0.0734 barn are the known ones (from memory)"
QUADRUPOLES_THAT_DIFFER = {"33S": TENTH, "39K": TENTH, "40K": TENTH, "41K": TENTH}


@cache
def _mendeleev() -> dict[str, Any]:
    from mendeleev.fetch import fetch_table

    table = fetch_table("isotopes")
    table = table[table.atomic_number <= 36]
    return {f"{row.mass_number}{SYMBOLS[row.atomic_number - 1]}": row for row in table.itertuples()}


def _differs(ours: float, theirs: float) -> bool:
    return not math.isclose(ours, theirs, rel_tol=LIMIT, abs_tol=1e-12)


@pytest.mark.parametrize("name", NAMES)
def test_spin_moment_and_mass_agree_with_mendeleev(name: str) -> None:
    """Rows whose source is mendeleev can only show here that they were copied well; the others are a check."""
    from fractions import Fraction

    ours, theirs = isotope(name), _mendeleev()[name]
    assert Fraction(theirs.spin) == ours.spin
    assert not _differs(ours.nuclear_g, theirs.g_factor)
    assert ours.mass_u == pytest.approx(theirs.mass, rel=1e-9)


@pytest.mark.parametrize("name", NAMES)
def test_abundance_differs_from_mendeleev_only_where_explained(name: str) -> None:
    theirs = _mendeleev()[name].abundance
    theirs = 0.0 if math.isnan(theirs) else theirs / 100
    assert _differs(isotope(name).abundance, theirs) == (name in ABUNDANCES_THAT_DIFFER)


@pytest.mark.parametrize("name", [name for name in NAMES if isotope(name).quadrupole_barn is not None])
def test_quadrupole_moment_differs_from_mendeleev_only_where_explained(name: str) -> None:
    ours = isotope(name).quadrupole_barn
    assert ours is not None
    theirs = _mendeleev()[name].quadrupole_moment
    assert _differs(ours, theirs) == (name in QUADRUPOLES_THAT_DIFFER)
    if name in QUADRUPOLES_THAT_DIFFER:
        assert theirs == pytest.approx(10 * ours, rel=LIMIT)


def test_every_natural_isotope_with_a_spin_is_there() -> None:
    natural = {
        name for name, row in _mendeleev().items() if row.abundance > 0 and str(row.spin) not in ("0", "None")
    }
    assert natural <= set(NAMES)
    assert set(NAMES) - natural == {"3H"}


# --- against PySCF ----------------------------------------

NEWER = (
    "PySCF's table cites moments compiled in 2005; the later value has another correction for the shielding"
)
G_FACTORS_THAT_DIFFER = {
    "55Mn": NEWER + " (3.4533 there against 3.4669; the resonance frequencies below speak for the later one)",
    "57Fe": NEWER + " (0.09045 there against 0.09064)",
    "59Co": NEWER + " (4.627 there against 4.615)",
    "63Cu": NEWER + " (2.2236 there against 2.2259)",
    "73Ge": NEWER + " (-0.87947 there against -0.87824)",
    "77Se": NEWER + " (0.53504 there against 0.53356)",
}


@cache
def _pyscf() -> dict[str, tuple[float, float]]:
    from pyscf.data.nucprop import ISOTOPE_GYRO

    return {
        f"{row[0][0]}{SYMBOLS[number - 1]}": (row[0][1], row[0][2])
        for number, row in enumerate(ISOTOPE_GYRO[:37])
        if number and row[0][1]
    }


@pytest.mark.parametrize("name", [name for name in NAMES if name in _pyscf()])
def test_g_factor_differs_from_pyscf_only_where_explained(name: str) -> None:
    spin, nuclear_g = _pyscf()[name]
    ours = isotope(name)
    assert ours.spin == spin
    assert _differs(ours.nuclear_g, nuclear_g) == (name in G_FACTORS_THAT_DIFFER)


def test_pyscf_has_one_isotope_of_every_element_of_the_table() -> None:
    assert set(_pyscf()) <= set(NAMES)
    assert len(_pyscf()) == 35  # H to Kr without Ar


# --- against measurements ----------------------------------------

XI = {
    # Resonance frequency in per cent of that of 1H in tetramethylsilane: R. K. Harris and co-workers, IUPAC
    # Recommendations 2001, Pure Appl. Chem. 73, 1795 (from memory).
    "2H": 15.350609, "3H": 106.663974, "3He": 76.179437, "6Li": 14.716086, "7Li": 38.863797, "9Be": 14.051813,
    "10B": 10.743658, "11B": 32.083974, "13C": 25.145020, "14N": 7.226317, "15N": 10.136767, "17O": 13.556457,
    "19F": 94.094011, "21Ne": 7.894296, "23Na": 26.451900, "25Mg": 6.121635, "27Al": 26.056859, "29Si": 19.867187,
    "31P": 40.480742, "33S": 7.676000, "35Cl": 9.797909, "37Cl": 8.155725, "39K": 4.666373, "40K": 5.802018,
    "41K": 2.561305, "43Ca": 6.730029, "45Sc": 24.291747, "47Ti": 5.637534, "49Ti": 5.639037, "50V": 9.970309,
    "51V": 26.302948, "53Cr": 5.652496, "55Mn": 24.789218, "57Fe": 3.237778, "59Co": 23.727074, "61Ni": 8.936051,
    "63Cu": 26.515473, "65Cu": 28.403693, "67Zn": 6.256803, "69Ga": 24.001354, "71Ga": 30.496704, "73Ge": 3.488315,
    "75As": 17.122614, "77Se": 19.071513, "79Br": 25.053980, "81Br": 27.006518, "83Kr": 3.847600,
}  # fmt: skip


@pytest.mark.parametrize("name", XI)
def test_moment_agrees_with_the_resonance_frequency(name: str) -> None:
    """Frequencies follow |g_N| but for the shielding, under 0.6 % up to krypton, cobalt complexes included."""
    expected = isotope("1H").nuclear_g * XI[name] / 100
    assert abs(isotope(name).nuclear_g) == pytest.approx(expected, rel=6e-3)


PAIRS = [
    (a.name, b.name) for a in all_isotopes() for b in isotopes_of(a.element) if a.mass_number < b.mass_number
]


@pytest.mark.parametrize(("light", "heavy"), [pair for pair in PAIRS if "1H" not in pair])
def test_isotopes_of_one_element_keep_the_measured_ratio_of_frequencies(light: str, heavy: str) -> None:
    """The shielding cancels: 0.01 %, the digits that are printed."""
    ours = abs(isotope(heavy).nuclear_g / isotope(light).nuclear_g)
    assert ours == pytest.approx(XI[heavy] / XI[light], rel=1e-4)


@pytest.mark.parametrize(
    ("name", "partner", "measured_MHz", "measured_partner_MHz"),
    [
        ("2H", "1H", 327.384352522 / 1.5, 1420.405751767),  # physics notes, section 2 (published)
        ("3H", "1H", 1516.701470773, 1420.405751767),  # tritium maser, from memory
        (
            "6Li",
            "7Li",
            152.1368393,
            401.7520433,
        ),  # 7Li physics notes; 6Li Beckmann and co-workers 1974, memory
    ],
)
def test_hyperfine_intervals_of_atoms_have_the_ratio_of_the_moments(
    name: str, partner: str, measured_MHz: float, measured_partner_MHz: float
) -> None:
    """Once the reduced mass, (1 + m_e/M)^-3, is taken out, what is left is under 0.05 %."""

    def reduced(nucleus: Isotope) -> float:
        electron_u = physical_constants["electron mass in u"][0]
        return nucleus.nuclear_g * (1 + electron_u / nucleus.mass_u) ** -3

    ratio = reduced(isotope(name)) / reduced(isotope(partner))
    assert ratio == pytest.approx(measured_MHz / measured_partner_MHz, rel=5e-4)


@pytest.mark.parametrize(
    ("name", "constant"), [("1H", "proton"), ("2H", "deuteron"), ("3H", "triton"), ("3He", "helion")]
)
def test_lightest_nuclei_agree_with_codata(name: str, constant: str) -> None:
    """CODATA 2022 through SciPy; Stone's deuteron and CODATA's differ in the ninth digit."""
    assert isotope(name).nuclear_g == pytest.approx(physical_constants[f"{constant} g factor"][0], rel=1e-8)


MOMENTS = {
    # Stone, INDC(NDS)-0794 (2019), as printed in the physics notes (published).
    "1H": 2.792847351, "2H": 0.857438231, "6Li": 0.822043, "7Li": 3.256407, "10B": 1.8004636, "11B": 2.688378,
    "13C": 0.702369, "14N": 0.403573, "15N": -0.2830569, "17O": -1.893543, "19F": 2.628321, "31P": 1.130925,
    "9Be": -1.177430,
}  # fmt: skip


@pytest.mark.parametrize("name", MOMENTS)
def test_published_moments_stand_verbatim_and_nobody_else_claims_them(name: str) -> None:
    assert isotope(name).moment_mu_N == MOMENTS[name]
    assert {item.name for item in all_isotopes() if "INDC(NDS)-0794" in item.source} == set(MOMENTS)


@pytest.mark.parametrize(
    ("name", "coupling_MHz"), [("1H", 4469.88), ("13C", 1124.12), ("14N", 322.954), ("15N", -453.025)]
)
def test_coupling_per_unit_spin_density(name: str, coupling_MHz: float) -> None:
    """800.2374 g_N MHz for 1 bohr^-3 in a doublet (design, section 7), by hand."""
    computed = contact_coupling_MHz(1.0, isotope(name).nuclear_g, multiplicity=2)
    assert computed == pytest.approx(coupling_MHz, rel=1e-5)


def test_hydrogen_atom_has_its_exact_first_order_coupling() -> None:
    """1422.80758 MHz for an infinitely heavy nucleus (physics notes, section 2: exact)."""
    computed = contact_coupling_MHz(1 / math.pi, isotope("1H").nuclear_g, multiplicity=2)
    assert computed == pytest.approx(1422.80758, abs=1e-5)


@pytest.mark.parametrize("name", ["15N", "17O", "29Si", "3He"])
def test_negative_moments(name: str) -> None:
    """Design, section 7."""
    assert isotope(name).nuclear_g < 0


# --- as it is asked ----------------------------------------


@pytest.mark.parametrize("text", ["13C", "C13", "C-13", "13-c", " 13c "])
def test_usual_spellings(text: str) -> None:
    assert isotope(text).name == "13C"


def test_deuterium_and_tritium_have_letters_of_their_own() -> None:
    assert (isotope("D").name, isotope("t").name) == ("2H", "3H")


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("12C", 'isotope "12C" has no nuclear spin (C in the table: 13C)'),
        ("16O", 'isotope "16O" has no nuclear spin (O in the table: 17O)'),
        ("11C", 'isotope "11C" is not in the table (C in the table: 13C)'),
        ("36Ar", 'isotope "36Ar" has no nuclear spin (Ar has no stable isotope with a spin)'),
        ("129Xe", 'isotope "129Xe" is not in the table (the table goes from H to Kr)'),
        ("13X", 'isotope "13X" does not exist; did you mean "13C"? (mass number and element, such as 13C)'),
        ("carbon", 'isotope "carbon" does not exist (mass number and element, such as 13C)'),
    ],
)
def test_unknown_isotopes_are_refused_in_one_sentence(text: str, said: str) -> None:
    with pytest.raises(ChoiceError) as caught:
        isotope(text)
    assert caught.value.message == said


@pytest.mark.parametrize(
    ("element", "name"),
    [("H", "1H"), ("He", "3He"), ("C", "13C"), ("N", "14N"), ("O", "17O"), ("Cl", "35Cl"), ("V", "51V")],
)
def test_table_isotope_is_the_most_abundant_one_with_a_spin(element: str, name: str) -> None:
    found = table_isotope(element)
    assert found is not None
    assert found.name == name


def test_elements_without_a_magnetic_isotope_have_no_table_isotope() -> None:
    assert table_isotope("Ar") is None


@pytest.mark.parametrize("element", SYMBOLS[:36])
def test_natural_shares_sum_to_one_and_fall(element: str) -> None:
    shares = [share for _, share in natural_composition(element)]
    assert sum(shares) == pytest.approx(1.0, abs=1e-12)
    assert shares == sorted(shares, reverse=True)
    assert all(share > 0 for share in shares)


@pytest.mark.parametrize(("element", "main"), [("C", None), ("O", None), ("H", "1H"), ("Br", "79Br")])
def test_main_isotope_comes_first(element: str, main: str | None) -> None:
    first = natural_composition(element)[0][0]
    assert (first.name if first else None) == main


def test_a_composition_beyond_the_table_is_refused() -> None:
    with pytest.raises(ChoiceError, match="no isotope data for Xe"):
        natural_composition("Xe")


@pytest.mark.parametrize("name", NAMES)
def test_only_a_spin_above_one_half_has_a_quadrupole_moment(name: str) -> None:
    nucleus = isotope(name)
    assert (nucleus.quadrupole_barn is None) == (nucleus.spin == 0.5)
    assert (nucleus.spin % 1 == 0.5) == (nucleus.mass_number % 2 == 1)
    assert nucleus.source
