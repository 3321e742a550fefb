"""Nothing here needs a network: a run with every socket blocked gives its couplings."""

from __future__ import annotations

import socket
from pathlib import Path

import pytest

from unpaired.cli import main


def test_a_run_opens_no_socket(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys) -> None:
    def refuse(*_: object, **__: object) -> None:
        raise AssertionError("a socket was opened")

    for name in ("socket", "create_connection", "getaddrinfo"):
        monkeypatch.setattr(socket, name, refuse)
    (tmp_path / "h.xyz").write_text("2\nby hand\nO 0 0 0\nH 0 0 0.97\n")
    (tmp_path / "h.yaml").write_text("radical: hydroxyl\nstructure: h.xyz\nsolvent: water\n")
    with pytest.raises(SystemExit) as ended:
        main(["run", str(tmp_path / "h.yaml"), "--out", str(tmp_path / "results")])
    assert ended.value.code in (0, None)
    assert "UKS-B3LYP/pcH-1" in capsys.readouterr().out
