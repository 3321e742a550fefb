"""The README's example of reading a spin-system file runs as it stands there."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest
from spin_samples import splitting, system

from unpaired.constants import ELECTRON_G
from unpaired.spectrum.exact import blocks, solve_at
from unpaired.spectrum.splitting import Splitting, Sweep
from unpaired.spinsystem import systems_text

README = (Path(__file__).parent.parent / "README.md").read_text(encoding="utf-8")


def example() -> str:
    """The fenced block between the marker comments."""
    between = README.split("<!-- begin: spin-system -->")[1].split("<!-- end: spin-system -->")[0]
    found = re.search(r"```python\n(.*?)```", between, re.DOTALL)
    assert found is not None
    return found.group(1)


def test_the_example_builds_the_hamiltonian(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    methyl = system(("1H", 3, -2.3), g_iso=ELECTRON_G, radical="methyl")
    Path("methyl.json").write_text(systems_text([methyl]), encoding="utf-8")
    exec(compile(example(), "README.md", "exec"), {})
    printed = [float(word) for word in capsys.readouterr().out.strip("[]\n ").split()]
    # Ours, without the nuclear Zeeman term that the example leaves out: total spin 3/2 once and 1/2 twice.
    coupling_MHz = methyl.groups[0].a_iso_MHz
    protons = splitting("1H", 3, coupling_MHz)
    bare = Splitting(protons.twice_spin, protons.count, coupling_MHz, nuclear_g=0.0)
    electron = Sweep(ELECTRON_G, field_mT=339.0).electron_MHz_per_mT
    ours = [
        energy
        for twice_j in (3, 1, 1)
        for block in solve_at(blocks([bare], [twice_j], electron), 339.0).energy_MHz
        for energy in block
    ]
    assert printed == pytest.approx(np.sort(ours).tolist(), abs=0.01)
