"""The registry of columns: every column of every table, with its unit and meaning, in file order."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Column:
    """One column of a table."""

    name: str
    unit: str
    """Empty for text and pure numbers."""
    meaning: str


def _block(*rows: tuple[str, str, str]) -> tuple[Column, ...]:
    return tuple(Column(*row) for row in rows)


_LEVEL = (
    ("radical", "", "name from the recipe"),
    ("level", "", "level id, such as UHF/pcH-1, or the level's own name"),
)
_METHOD = (
    *_LEVEL,
    ("scf", "", "UHF, ROHF, UKS or ROKS"),
    ("functional", "", "density functional; empty for UHF and ROHF"),
    ("basis", "", "basis set"),
)
_FLAGS = ("flags", "", "codes of the flags that touch this row, joined by ;")

TABLES: dict[str, tuple[Column, ...]] = {
    "couplings": _block(
        *_METHOD,
        ("atom", "", "element and 1-based place in structure.xyz"),
        ("isotope", "", "isotope whose moment is used"),
        ("group", "", "group of equivalent nuclei, called by its first atom"),
        ("group_size", "", "number of nuclei in the group"),
        (
            "spin_density_au",
            "bohr^-3",
            "alpha minus beta density at the nucleus for M_S = S, not divided by 2S",
        ),
        ("a_iso_MHz", "MHz", "isotropic hyperfine coupling, signed"),
        ("a_iso_mT", "mT", "the same in field units at g_e"),
        ("a_group_mT", "mT", "mean over the group, the value that an averaged spectrum shows"),
        (
            "a_averaged_mT",
            "mT",
            "thermal mean over conformers and their equal copies; empty if there is one conformer",
        ),
        ("direct_mT", "mT", "part of a_iso_mT that the singly occupied orbitals make themselves"),
        ("polarisation_mT", "mT", "the rest: spin polarisation of paired electrons, 0 for ROHF and ROKS"),
        ("a_iso_projected_MHz", "MHz", "a_iso of the pure-spin part; UHF only, else empty"),
        ("a_iso_projected_mT", "mT", "the same in field units at g_e"),
        ("a_group_projected_mT", "mT", "its mean over the group"),
        *(
            (f"t_{axes}_MHz", "MHz", "dipolar tensor in the axes of structure.xyz, traceless")
            for axes in ("xx", "yy", "zz", "xy", "xz", "yz")
        ),
        *(
            (f"t_{place}_MHz", "MHz", "principal value of the dipolar tensor, ascending")
            for place in (1, 2, 3)
        ),
        *(
            (f"A_{place}_MHz", "MHz", f"principal value of the full tensor, a_iso + t_{place}")
            for place in (1, 2, 3)
        ),
        _FLAGS,
    ),
    "states": _block(
        *_METHOD,
        ("basis_functions", "", "number of basis functions"),
        ("energy_Eh", "Eh", "total energy"),
        ("s_squared", "", "<S^2> of the determinant"),
        ("s_squared_exact", "", "S(S+1)"),
        ("contamination", "", "s_squared - s_squared_exact"),
        ("converged", "", "true if the self-consistent field converged"),
        ("stable", "", "true if no nearby lower solution exists; empty if not tested"),
        ("iterations", "", "iterations of the original calculation"),
        ("wall_s", "s", "wall time of the original calculation"),
        ("pure_spin_weight", "", "weight of spin S in the determinant; UHF only, else empty"),
        ("s_squared_without_next_spin", "", "<S^2> with the part of spin S+1 removed; UHF only, else empty"),
        ("minimum", "", "true if the structure is a proven minimum, false for a saddle; empty if unknown"),
        ("lowest_mode_cm", "cm^-1", "lowest vibration of the structure; negative stands for imaginary"),
        ("state_label", "", "symmetry species of the open shell, or spin populations where it has none"),
        ("solution", "", "place of the solution taken in solutions.csv, 1 is the lowest"),
        ("solutions_found", "", "number of solutions found"),
        (
            "energy_gap_to_next_Eh",
            "Eh",
            "energy of the nearest other solution minus this one's; empty if none was found",
        ),
        _FLAGS,
    ),
    "solutions": _block(
        *_LEVEL,
        ("solution", "", "place by energy, 1 is the lowest"),
        ("taken", "", "true for the one that the other tables are about"),
        ("state_label", "", "symmetry species of the open shell, or spin populations where it has none"),
        ("energy_Eh", "Eh", "total energy"),
        ("energy_above_lowest_Eh", "Eh", "above the lowest solution of the level"),
        ("s_squared", "", "<S^2> of the determinant"),
        ("stable", "", "true if no nearby lower solution exists; empty if not tested"),
        ("origin", "", "the start that led to it"),
        ("atom", "", "element and 1-based place in structure.xyz"),
        ("isotope", "", "isotope whose moment is used"),
        ("a_iso_mT", "mT", "isotropic hyperfine coupling in this solution"),
    ),
    "polarisation": _block(
        *_LEVEL,
        ("atom", "", "nucleus that feels the pair"),
        ("pair", "", "atom or bond that the pair of electrons sits on"),
        ("kind", "", "core or valence; sigma or pi where there is a plane or an axis"),
        ("contribution_mT", "mT", "what the pair's polarisation adds to a_iso_mT of the atom"),
    ),
    "populations": _block(
        *_LEVEL,
        ("atom", "", "element and 1-based place in structure.xyz"),
        (
            "spin_population",
            "",
            "alpha minus beta electrons in the atom's intrinsic orbitals; they sum to 2S",
        ),
        ("pi_spin_population", "", "the part in p functions that leave the plane; empty without a plane"),
    ),
    "conformers": _block(
        *_LEVEL,
        ("conformer", "", "1 is the lowest, the structure of structure.xyz"),
        ("relative_kJ_mol", "kJ/mol", "electronic energy above the lowest, at the level of the relaxation"),
        ("zero_point_kJ_mol", "kJ/mol", "harmonic zero-point energy; empty without a full Hessian"),
        (
            "weight",
            "",
            "share at temperature_K, equal copies counted; with zero-point energy if all have one",
        ),
        ("minimum", "", "true if the curvature of this conformer is proven positive"),
        ("lowest_mode_cm", "cm^-1", "its lowest vibration; negative stands for imaginary"),
        ("atom", "", "element and 1-based place"),
        ("isotope", "", "isotope whose moment is used"),
        ("a_iso_mT", "mT", "isotropic hyperfine coupling in this conformer, signed"),
    ),
    "flags": _block(
        *_LEVEL,
        ("atom", "", "atom that the flag belongs to; empty for the whole level"),
        ("code", "", "short name of the finding"),
        ("severity", "", "note, caution or bad"),
        ("value", "", "what was found"),
        ("limit", "", "where the finding begins"),
        ("advice", "", "what it means and what to do"),
    ),
}


def names(table: str) -> tuple[str, ...]:
    """Column names of a table, in file order."""
    return tuple(column.name for column in TABLES[table])


def markdown() -> str:
    """Every table's columns as markdown, for the README: `python -m unpaired.columns`."""
    text = []
    for table, block in TABLES.items():
        text.append(f"**{table}.csv**\n\n| column | unit | meaning |\n| --- | --- | --- |")
        text += [f"| `{column.name}` | {column.unit} | {column.meaning} |" for column in block]
        text.append("")
    return "\n".join(text)


if __name__ == "__main__":
    print(markdown(), end="")
