"""The commands gates and scatter as a user gives them: what they refuse, what they write."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from render.command import main
from render.decide import gate_sheet
from tests.output.test_gate_card import sheet


@pytest.mark.parametrize(("words", "said"), [
    (["gates", "late_freeze", "--want", "1.5"], "--want: read 1.5, wanted a time with its unit"),
    (["gates", "late_freeze", "--want", "40s"], "--want: read 40s, wanted 0 s to 30 s"),
    (["gates", "late_freeze", "--want", "1s", "--spread", "20"], "--spread: read 20, wanted a speed with its unit"),
    (["gates", "no_such", "--want", "1s"], "read no_such, wanted a shipped scene"),
    (["gates", "engines_after_takeoff", "--want", "1s"], "has no loop in its script"),
    (["scatter", "turboprop_vic"], "no scatter in the scene; wanted a scatter: block"),
    (["scatter", "healthy_loop", "--passes", "4"], "has no fault"),
    (["scatter", "late_freeze", "--passes", "1"], "--passes: read 1, wanted 2 to 20000"),
    (["scatter", "late_freeze", "--passes", "4", "--tracks", "nowhere"], "nowhere: 0 tracks found, wanted at least 5"),
])
def test_wrong_input_is_said_and_ends_with_2(
    words: list[str], said: str, capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    assert main([*words, "--out", str(tmp_path / "out")]) == 2
    err = capsys.readouterr().err
    assert said in err and "Traceback" not in err
    assert not list((tmp_path / "out").glob("*.png")) if (tmp_path / "out").exists() else True


def test_gates_writes_card_text_and_figures(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    asked: dict[str, object] = {}

    def solved(scene: object, airframe_of: object, ground: object, want_s: float, **more: object) -> object:
        asked.update(more, want_s=want_s)
        return sheet("short")

    monkeypatch.setattr(gate_sheet, "solve_gates", solved)
    words = ["gates", "late_freeze", "--want", "1500 ms", "--at", "notice", "--out", str(tmp_path)]
    assert main(words) == 0
    assert asked["want_s"] == pytest.approx(1.5) and asked["from_hand"] is False
    assert sorted(p.name for p in tmp_path.iterdir()) == ["gate_card.pdf", "gate_card.png", "gates.json", "gates.txt"]
    assert capsys.readouterr().out.startswith("made\nGates that leave 1.5 s left when his hand moves")
    assert main(words) == 2  # what is there stays
    assert "gate_card.png" in capsys.readouterr().err
    assert main([*words, "--force", "--json"]) == 0
    figures = json.loads(capsys.readouterr().out)
    assert figures["want_s"] == 1.5 and len(figures["written"]) == 4
