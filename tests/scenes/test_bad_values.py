"""Bad single values of a scene: missing, of the wrong kind, without a unit, out of range, not finite.

Exact texts; each begins after the file's name.
"""

from __future__ import annotations

import pytest

from tests.scenes.made import faults, with_line

CASES: list[tuple[str, str, list[str]]] = [
    ("floor: 100 ft\n", "",
     ["1:1: floor: read nothing, wanted the team's own minimum height above the ground; there is no default: a "
      "length with its unit (m, ft, km, NM or cm), such as 100 ft"]),
    ("floor: 100 ft", "floor: none",
     ["5:8: floor: read none, wanted the team's own minimum height above the ground; there is no default: a length "
      "with its unit (m, ft, km, NM or cm), such as 100 ft"]),
    ("floor: 100 ft", "floor: 100",
     ["5:8: floor: read 100, wanted a length with its unit (m, ft, km, NM or cm), such as 100 ft"]),
    ("floor: 100 ft", "floor: 100 kt",
     ["5:8: floor: read 100 kt, wanted a length with its unit (m, ft, km, NM or cm), such as 100 ft"]),
    ("floor: 100 ft", "floor: -5 ft",
     ["5:8: floor: read -5 ft, wanted 0 ft to 9842 ft"]),
    ("floor: 100 ft", "floor: .nan",
     ["5:8: floor: read .nan, wanted a length with its unit (m, ft, km, NM or cm), such as 100 ft, finite"]),
    ("floor: 100 ft", "floor: [1]",
     ["5:8: floor: read a list, wanted a length with its unit (m, ft, km, NM or cm), such as 100 ft"]),
    ("floor: 100 ft", "floor:",
     ["5:7: floor: read nothing, wanted a length with its unit (m, ft, km, NM or cm), such as 100 ft"]),
    ("title: A loop", "title: 12",
     ["1:8: title: read 12, wanted a text, such as Right wing, nothing fails (did you mean \"12\"?)"]),
    ("title: A loop", "title: yes",
     ["1:8: title: read yes, wanted a text, such as Right wing, nothing fails (did you mean \"yes\"?)"]),
    ("title: A loop", "titel: A loop",
     ["1:1: titel: read the key titel, wanted one of title, airframe, day, ground, floor, script, fault, formation, "
      "break_out, watch, film, briefed, scatter, seed or notes (did you mean title?)",
      "1:1: title: read nothing, wanted what the scene shows, in a line: a text, such as Right wing, nothing fails"]),
    ("airframe: jet_trainer", "airframe: jet_trainr",
     ["2:11: airframe: read jet_trainr, wanted a shipped airframe (aerobatic_two_seater, jet_trainer or "
      "turboprop_trainer) or the path of a YAML file (did you mean jet_trainer?)"]),
    ("airframe: jet_trainer", "airframe: my/frame.yaml",
     ["2:11: airframe: read my/frame.yaml, and there is no such file, wanted a shipped airframe "
      "(aerobatic_two_seater, jet_trainer or turboprop_trainer) or the path of a YAML file"]),
    ("ground: heath", "ground: heeth",
     ["4:9: ground: read heeth, wanted a terrain: coast, dry_plain, farmland, heath or hills, or the path of an "
      "elevation file (did you mean heath?)"]),
    ("24 degC", "24",
     ["3:45: day.temperature: read 24, wanted a temperature with its unit (K, degC or degF), such as 24 degC"]),
    ("24 degC", "24 C",
     ["3:45: day.temperature: read 24 C, wanted a temperature with its unit (K, degC or degF), such as 24 degC (did "
      "you mean 24 degC?)"]),
    ("24 degC", "99 degC",
     ["3:45: day.temperature: read 99 degC, wanted -50 degC to 55 degC"]),
    ("8 kt", "8 m",
     ["3:83: day.wind.speed: read 8 m, wanted a speed with its unit (m/s, kt, km/h or ft/s), such as 385 kt"]),
    ("from: 240 deg", "from: west",
     ["3:67: day.wind.from: read west, wanted an angle with its unit (rad or deg), such as 80 deg"]),
    ("370 kt", "1e400 kt",
     ["7:20: script.0.level.speed: read 1e400 kt, wanted a speed with its unit (m/s, kt, km/h or ft/s), such as 385 "
      "kt, finite"]),
    ("370 kt, height: 300 ft, ", "370 kt, ",
     ["7:12: script.0.level.height: read nothing, wanted height above the field (first step: required): a length "
      "with its unit (m, ft, km, NM or cm), such as 300 ft"]),
    ("  - level: {speed: 370 kt, height: 300 ft, heading: 80 deg, for: 3 s}\n", "",
     ["7:5: script.0.loop: read the step loop first, wanted a list of steps, the first of them a level step with "
      "speed, height and heading"]),
    ("power: full\n", "power: 88\n",
     ["10:14: script.1.loop.power: read 88, wanted 0 % to 100 % (did you mean 88 %?)"]),
    ("power: full\n", "power: flat out\n",
     ["10:14: script.1.loop.power: read flat out, wanted full, idle, held or a percentage such as 88 %"]),
    ("power: full\n", "power: 120 %\n",
     ["10:14: script.1.loop.power: read 120 %, wanted 0 % to 100 %"]),
    ("close_at: 300 ft", "close_at: 300",
     ["11:17: script.1.loop.close_at: read 300, wanted a length with its unit (m, ft, km, NM or cm), such as 300 ft"]),
    ("close_at", "closes_at",
     ["11:7: script.1.loop.closes_at: read the key closes_at, wanted one of load_factor, power or close_at (did you "
      "mean close_at?)"]),
    ("{0: 1.2, 8: 4.6, 90: 3.1, 180: 0.6, 270: 2.8, 330: 4.9, 358: 1.2}", "{0: 1.2}",
     ["9:20: script.1.loop.load_factor: read 1 loop angle, wanted 2 to 32 of them"]),
    ("90: 3.1", "6: 3.1",
     ["9:37: script.1.loop.load_factor.6: read 6 after 8, wanted loop angles that rise"]),
    ("90: 3.1", "90 deg: 3.1",
     ["9:37: script.1.loop.load_factor.90 deg: read 90 deg, wanted a loop angle as a bare number of degrees, such as "
      "245"]),
    ("90: 3.1", "400: 3.1",
     ["9:37: script.1.loop.load_factor.400: read 400, wanted a loop angle from 0 to 360",
      "9:47: script.1.loop.load_factor.180: read 180 after 400, wanted loop angles that rise"]),
]


@pytest.mark.parametrize(("old", "new", "lines"), CASES, ids=[new or f"no {old}" for old, new, _ in CASES])
def test_complaint(old: str, new: str, lines: list[str]) -> None:
    """One thing wrong, and just that is said, with its line and column."""
    assert faults(with_line(old, new)) == [f"s.yaml:{line}" for line in lines]
