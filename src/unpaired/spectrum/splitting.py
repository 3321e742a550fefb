"""What the numerics need to know: groups of equivalent nuclei, and which quantity is swept."""

from __future__ import annotations

from dataclasses import dataclass

from ..constants import BOHR_MAGNETON_MHZ_T, NUCLEAR_MAGNETON_MHZ_T


@dataclass(frozen=True)
class Splitting:
    """One group of equivalent nuclei."""

    twice_spin: int
    """2I of one nucleus."""
    count: int
    coupling_MHz: float
    """Signed a_iso of one nucleus, H = h a S.I."""
    nuclear_g: float
    """Signed g_N = mu/(I mu_N)."""

    @property
    def nuclear_MHz_per_mT(self) -> float:
        """Nuclear Zeeman energy per field and per unit of -m_I."""
        return self.nuclear_g * NUCLEAR_MAGNETON_MHZ_T * 1e-3

    @property
    def states(self) -> int:
        """Dimension (2I+1)^n of the group's product space."""
        return int((self.twice_spin + 1) ** self.count)


@dataclass(frozen=True)
class Sweep:
    """The experiment: the field is swept at a fixed frequency, or the frequency at a fixed field."""

    g_iso: float
    frequency_MHz: float | None = None
    """Fixed frequency; None if the frequency is swept."""
    field_mT: float | None = None
    """Fixed field; None if the field is swept."""

    def __post_init__(self) -> None:
        if (self.frequency_MHz is None) == (self.field_mT is None):
            raise ValueError("exactly one of frequency_MHz and field_mT is fixed")

    @property
    def electron_MHz_per_mT(self) -> float:
        """g mu_B / h."""
        return self.g_iso * BOHR_MAGNETON_MHZ_T * 1e-3

    @property
    def axis(self) -> str:
        """Name and unit of what is swept: `field_mT` or `frequency_MHz`."""
        return "field_mT" if self.field_mT is None else "frequency_MHz"

    @property
    def centre(self) -> float:
        """Position of the line without any coupling, in units of the axis."""
        if self.frequency_MHz is not None:
            return self.frequency_MHz / self.electron_MHz_per_mT
        assert self.field_mT is not None
        return self.field_mT * self.electron_MHz_per_mT

    @property
    def centre_mT(self) -> float:
        """Field of the line without any coupling."""
        return self.centre if self.field_mT is None else self.field_mT

    @property
    def axis_per_MHz(self) -> float:
        """How far the line moves along the axis when the electron's level gap grows by 1 MHz (signed)."""
        return -1.0 / self.electron_MHz_per_mT if self.field_mT is None else 1.0

    @property
    def axis_per_mT(self) -> float:
        """Length of 1 mT on the axis (positive): what turns a width in mT into units of the axis."""
        return 1.0 if self.field_mT is None else self.electron_MHz_per_mT
