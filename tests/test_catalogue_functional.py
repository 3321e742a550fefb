"""Functionals by name, and what libxc runs for them."""

from __future__ import annotations

import pytest

from unpaired.catalogue import functional_as_libxc, functional_name
from unpaired.errors import ChoiceError


@pytest.mark.parametrize(
    ("text", "canonical"),
    [
        ("b3lyp", "B3LYP"),
        ("HYB_GGA_XC_B3LYP", "B3LYP"),
        ("pbe0", "PBE0"),
        ("TPSSH", "TPSSh"),
        ("camb3lyp", "CAM-B3LYP"),
        ("CAM_B3LYP", "CAM-B3LYP"),
        ("m06-2x", "M06-2X"),
        ("m062x", "M06-2X"),
        ("wb97x-v", "wB97X-V"),
        ("svwn", "SVWN"),
        ("0.3*HF + 0.7*b88, lyp", "0.3*HF+0.7*B88,LYP"),
    ],
)
def test_spellings_become_one(text: str, canonical: str) -> None:
    assert functional_name(text) == canonical
    assert functional_name(canonical) == canonical


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("b3lpy", 'did you mean "B3LYP"?'),
        ("", "does not exist"),
        ("402", "does not exist"),
        ("B3LYP,,", "does not exist"),
        ("LDA_K_TF", "kinetic energy"),
        (",LYP", "no exchange part"),
        ("LDA_X_2D", "three dimensions"),
        ("GGA_X_LB", "without an energy"),
        ("MGGA_X_BR89,", "Laplacian"),
        ("B2PLYP", "double hybrid"),
        ("DSD-BLYP", "double hybrid"),
        ("B3LYP-D3BJ", "dispersion"),
        ("wB97X-D", "its functional alone is HYB_GGA_XC_WB97X_D"),
    ],
)
def test_what_cannot_be_run_is_refused_with_the_reason(text: str, said: str) -> None:
    with pytest.raises(ChoiceError) as caught:
        functional_name(text)
    assert said in caught.value.message
    assert "\n" not in caught.value.message


def test_the_way_out_that_a_refusal_names_works() -> None:
    assert functional_name("HYB_GGA_XC_WB97X_D") == "HYB_GGA_XC_WB97X_D"


@pytest.mark.parametrize(
    ("name", "libxc"),
    [
        # Stephens, Devlin, Chabalowski, Frisch, J. Phys. Chem. 98, 11623 (1994); libxc takes VWN's RPA fit
        # (physics notes, section 9).
        ("B3LYP", "0.08*LDA_X + 0.72*GGA_X_B88 + 0.19*LDA_C_VWN_RPA + 0.81*GGA_C_LYP + 0.2*exact exchange"),
        ("PBE", "1*GGA_X_PBE + 1*GGA_C_PBE"),
        # Adamo, Barone, J. Chem. Phys. 110, 6158 (1999): a quarter of exact exchange.
        ("PBE0", "0.75*GGA_X_PBE + 1*GGA_C_PBE + 0.25*exact exchange"),
        # Staroverov and co-workers, J. Chem. Phys. 119, 12129 (2003): a tenth.
        ("TPSSh", "0.9*MGGA_X_TPSS + 1*MGGA_C_TPSS + 0.1*exact exchange"),
        ("M06-2X", "1*HYB_MGGA_X_M06_2X + 1*MGGA_C_M06_2X + 0.54*exact exchange"),
        ("HF", "1*exact exchange"),
        (
            "0.5*B3LYP",
            "0.04*LDA_X + 0.36*GGA_X_B88 + 0.095*LDA_C_VWN_RPA + 0.405*GGA_C_LYP + 0.1*exact exchange",
        ),
    ],
)
def test_components_and_weights(name: str, libxc: str) -> None:
    assert functional_as_libxc(name) == libxc


def test_range_separation_is_said() -> None:
    """CAM-B3LYP: Yanai, Tew, Handy, Chem. Phys. Lett. 393, 51 (2004): 0.19, 0.65, 0.33."""
    assert "exact exchange 0.19 at short and 0.65 at long range (omega 0.33 bohr^-1)" in functional_as_libxc(
        "CAM-B3LYP"
    )


def test_every_named_functional_that_is_accepted_has_its_components() -> None:
    from unpaired.catalogue.functional import _functionals

    accepted = 0
    for name in sorted(set(_functionals().values())):
        try:
            canonical = functional_name(name)
        except ChoiceError:
            continue
        assert functional_name(canonical) == canonical
        assert functional_as_libxc(canonical)
        accepted += 1
    assert accepted > 200
