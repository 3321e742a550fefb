"""From a record to spin systems: level, couplings, g, isotopes, mixtures, satellites."""

from __future__ import annotations

import pytest
from spin_samples import LEVELS, record

from unpaired.constants import ELECTRON_G, MHZ_PER_MT
from unpaired.errors import ChoiceError, InputError
from unpaired.nuclei import isotope, natural_composition
from unpaired.result import Result
from unpaired.spectrum.isotopologues import Question, spin_systems, taken_notes
from unpaired.spinsystem import SpinSystem

METHYL = [("13C", 1, 3.8), ("1H", 3, -2.3)]


def one(result: Result, question: Question | None = None) -> SpinSystem:
    (found,) = spin_systems(result, question or Question())
    return found


def test_the_main_isotopologue_has_no_13C() -> None:
    found = one(record(METHYL))
    assert [(group.group, group.isotope, group.count) for group in found.groups] == [("H2", "1H", 3)]
    assert found.groups[0].a_iso_mT == -2.3
    assert found.groups[0].a_iso_MHz == pytest.approx(-2.3 * MHZ_PER_MT)
    assert (found.isotopologue, found.share) == ("main", 1.0)


def test_isotopes_of_the_recipe_are_added() -> None:
    found = one(record(METHYL, isotopes={"C1": "13C"}))
    assert [group.group for group in found.groups] == ["C1", "H2"]


def test_the_last_level_is_taken_unless_another_is_asked_for() -> None:
    assert one(record(METHYL)).level == LEVELS[1].id
    asked = one(record(METHYL), Question(level="UHF/pcH-1"))
    assert (asked.level, asked.groups[0].a_iso_mT) == ("UHF/pcH-1", -4.6)


def test_a_level_that_is_not_there_lists_those_that_are() -> None:
    with pytest.raises(ChoiceError, match=r"levels there: UHF/pcH-1, UKS-B3LYP/pcH-1"):
        spin_systems(record(METHYL), Question(level="ROHF/pcH-1"))


def test_a_level_without_couplings_says_why_and_what_there_is() -> None:
    why = {"level": LEVELS[1].id, "severity": "bad", "code": "not-converged", "advice": "no state was found"}
    result = record([("1H", 2, None)], flags=[why])
    with pytest.raises(InputError, match=r"has no couplings .not-converged: no state was found"):
        spin_systems(result, Question())


def test_labelled_variants_scale_with_the_nuclear_g() -> None:
    found = one(record(METHYL), Question(labels={"C1": "13C", "H3": "2H"}))
    assert [(g.group, g.isotope, g.count) for g in found.groups] == [
        ("C1", "13C", 1),
        ("H2", "1H", 2),
        ("H3", "2H", 1),
    ]
    # Moments from Stone (2019) as in physics notes section 1: g_N(2H)/g_N(1H) = 0.857438231/(2 * 2.792847351).
    assert found.groups[2].a_iso_mT == pytest.approx(-2.3 * 0.857438231 / (2 * 2.792847351), rel=1e-9)
    assert found.groups[2].nuclear_spin == 1.0
    assert found.isotopologue == "13C(C1) 2H(H3)"


def test_an_element_labels_all_its_atoms_and_an_atom_outranks_it() -> None:
    found = one(record(METHYL), Question(labels={"H2": "1H", "H": "2H"}))
    assert [(g.group, g.isotope, g.count) for g in found.groups] == [("H2", "1H", 1), ("H3", "2H", 2)]


@pytest.mark.parametrize(
    ("labels", "words"),
    [
        ({"C9": "13C"}, r'"C9" is neither an atom nor an element of sample .there are C1, H2, H3, H4, C, H.'),
        ({"C1": "2H"}, "C1 cannot be 2H: that is an isotope of H"),
        ({"C1": "12C"}, "has no nuclear spin"),
    ],
)
def test_labels_that_cannot_be_are_refused(labels: dict[str, str], words: str) -> None:
    with pytest.raises(ChoiceError, match=words):
        spin_systems(record(METHYL), Question(labels=labels))


def test_chlorine_is_a_mixture_by_default() -> None:
    heavy, light = sorted(
        spin_systems(record([("1H", 2, -2.0), ("35Cl", 1, 0.3)]), Question()), key=lambda s: s.share
    )
    assert [light.isotopologue, heavy.isotopologue] == ["35Cl(Cl3)", "37Cl(Cl3)"]
    assert light.share == pytest.approx(0.7576, abs=1e-3)  # IUPAC 2013, from memory
    ratio = isotope("37Cl").nuclear_g / isotope("35Cl").nuclear_g
    assert heavy.groups[1].a_iso_mT == pytest.approx(0.3 * ratio, rel=1e-12)


@pytest.mark.parametrize(("name", "count"), [("81Br", 1), ("11B", 1), ("11B", 2)])
def test_bromine_and_boron_are_mixtures_by_default(name: str, count: int) -> None:
    systems = spin_systems(record([(name, count, 1.0)]), Question())
    assert len(systems) == count + 1
    assert sum(system.share for system in systems) == pytest.approx(1.0)


def test_equivalent_chlorines_share_out_binomially() -> None:
    systems = spin_systems(record([("35Cl", 3, 0.3)]), Question())
    light = next(share for item, share in natural_composition("Cl") if item == isotope("35Cl"))
    expected = {
        "35Cl(Cl1+Cl2+Cl3)": light**3,
        "35Cl(Cl1+Cl2) 37Cl(Cl3)": 3 * light**2 * (1 - light),
        "35Cl(Cl1) 37Cl(Cl2+Cl3)": 3 * light * (1 - light) ** 2,
        "37Cl(Cl1+Cl2+Cl3)": (1 - light) ** 3,
    }
    assert {system.isotopologue: system.share for system in systems} == pytest.approx(expected)


def test_satellites_go_down_to_the_share_asked_for() -> None:
    benzene = record([("13C", 6, 0.28), ("1H", 6, -0.38)])
    systems = spin_systems(benzene, Question(least_share=0.005))
    heavy = isotope("13C").abundance
    rest = (1 - isotope("2H").abundance) ** 6
    assert [system.isotopologue for system in systems] == ["main", "13C(C1)"]
    assert systems[0].share == pytest.approx((1 - heavy) ** 6 * rest, rel=1e-4)
    assert systems[1].share == pytest.approx(6 * heavy * (1 - heavy) ** 5 * rest, rel=1e-4)
    more = spin_systems(benzene, Question(least_share=0.001))
    assert [system.isotopologue for system in more] == ["main", "13C(C1)", "13C(C1+C2)"]


def test_the_main_isotopologue_stays_however_much_is_asked_for() -> None:
    assert one(record([("13C", 60, 0.1)]), Question(least_share=0.9)).isotopologue == "main"


@pytest.mark.parametrize("share", [0.0, 1.0, -0.1, float("nan")])
def test_a_share_lies_between_0_and_1(share: float) -> None:
    with pytest.raises(InputError, match="between 0 and 1"):
        spin_systems(record(METHYL), Question(least_share=share))


def test_averaged_couplings_are_taken_where_there_are_any() -> None:
    result = record(METHYL, isotopes={"C1": "13C"}, averaged={"C1": 4.9})
    found = one(result)
    assert found.coupling_kind == "averaged"
    assert [group.a_iso_mT for group in found.groups] == [4.9, -2.3]
    assert (
        "averaged couplings (equilibrium ones, for want of an average, for H2)"
        in taken_notes(result, [found])[0]
    )


def test_equilibrium_couplings_are_taken_when_asked_for() -> None:
    result = record(METHYL, isotopes={"C1": "13C"}, averaged={"C1": 4.9})
    found = one(result, Question(coupling="equilibrium"))
    assert found.coupling_kind == "equilibrium"
    assert found.groups[0].a_iso_mT == 3.8
    assert "equilibrium couplings" in taken_notes(result, [found])[0]


def test_a_labelled_average_says_that_the_mass_effect_is_not_in_it() -> None:
    result = record(METHYL, averaged={"C1": 4.9, "H2": -2.4})
    systems = spin_systems(result, Question(labels={"H": "2H"}))
    assert "for another isotope of H2 (2H); the effect of the mass" in " ".join(taken_notes(result, systems))
    assert "mass" not in " ".join(taken_notes(result, spin_systems(result, Question())))


def test_an_unknown_kind_of_coupling_names_the_known_ones() -> None:
    with pytest.raises(ChoiceError, match="there are averaged, equilibrium"):
        spin_systems(record(METHYL), Question(coupling="mean"))


def test_g_is_given_or_measured_or_that_of_the_free_electron() -> None:
    measured = record(METHYL, g={"value": 2.0026, "source": "a handbook"})
    free = one(record(METHYL))
    assert (free.g_iso, free.g_source.split(",")[0]) == (ELECTRON_G, "free electron")
    assert (one(measured).g_iso, one(measured).g_source) == (2.0026, "measured, from the recipe: a handbook")
    assert one(measured, Question(g_iso=2.01)).g_iso == 2.01
    assert one(measured, Question(g_iso=2.01)).g_source == "given with the command"


@pytest.mark.parametrize("g_iso", [0.0, -2.0, float("inf"), float("nan")])
def test_g_must_be_positive(g_iso: float) -> None:
    with pytest.raises(InputError, match="g must be positive"):
        spin_systems(record(METHYL), Question(g_iso=g_iso))


def test_dipolar_tensors_are_handed_over_and_scaled() -> None:
    result = record([("1H", 1, 1.0)], tensor=[1.0, 2.0, -3.0, 4.0, 5.0, 6.0])
    tensor = one(result).groups[0].nuclei[0].dipolar_MHz
    assert tensor == ((1.0, 4.0, 5.0), (4.0, 2.0, 6.0), (5.0, 6.0, -3.0))
    heavy = one(result, Question(labels={"H": "2H"})).groups[0].nuclei[0].dipolar_MHz
    assert heavy is not None
    ratio = isotope("2H").nuclear_g / isotope("1H").nuclear_g
    assert heavy[2] == pytest.approx((5 * ratio, 6 * ratio, -3 * ratio))


def test_findings_go_with_the_couplings() -> None:
    flag = {"level": LEVELS[1].id, "severity": "bad", "code": "contaminated", "advice": "do not use it"}
    result = record(METHYL, flags=[flag, flag | {"level": LEVELS[0].id, "code": "other"}])
    found = one(result)
    assert found.provenance["findings"] == ["contaminated (bad)"]
    assert "findings at this level: contaminated (bad)" in " ".join(taken_notes(result, [found]))
