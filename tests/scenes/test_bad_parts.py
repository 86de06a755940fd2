"""Bad faults, places, break-outs, eyes, films, and values that don't go together.

Exact texts; each begins after the file's name.
"""

from __future__ import annotations

import pytest

from tests.scenes.made import faults, with_line

CASES: list[tuple[str, str, list[str]]] = [
    ("kind: freeze", "kind: jam",
     ["13:15: fault.kind: read jam, wanted freeze, authority, slow, trail, engines or idle"]),
    ("kind: freeze", "kind: frozen",
     ["13:15: fault.kind: read frozen, wanted freeze, authority, slow, trail, engines or idle (did you mean freeze?)"]),
    ("kind: freeze, ", "",
     ["13:8: fault.kind: read nothing, wanted what fails: freeze, authority, slow, trail, engines or idle"]),
    ("kind: freeze", "kind: authority",
     ["13:8: fault.fraction: read nothing, wanted part of the asked movement that arrives: a part of the whole such "
      "as 40 %"]),
    ("kind: freeze", "kind: freeze, fraction: 40 %",
     ["13:23: fault.fraction: read the key fraction with the kind freeze, wanted it only with the kind authority"]),
    ("kind: freeze", "kind: authority, fraction: 40",
     ["13:36: fault.fraction: read 40, wanted 0 to 1 (did you mean 40 %?)"]),
    ("kind: freeze", "kind: slow, rate: 90 deg/s",
     ["13:27: fault.rate: read 90 deg/s, wanted 0 deg/s to 60 deg/s"]),
    ("kind: freeze", "kind: engines, lost: both",
     ["13:30: fault.lost: read both, wanted all, or a whole number from 1 to 4"]),
    ("{loop_angle: 245 deg}", "{loop_angle: 245}",
     ["13:40: fault.at.loop_angle: read 245, wanted an angle with its unit (rad or deg), such as 80 deg"]),
    ("{loop_angle: 245 deg}", "{loop_angle: 245 deg, time: 3 s}",
     ["13:27: fault.at: read loop_angle and time, wanted just one of loop_angle, time, after_top or height"]),
    ("{loop_angle: 245 deg}", "{}",
     ["13:27: fault.at: read none of them, wanted just one of loop_angle, time, after_top or height"]),
    ("{loop_angle: 245 deg}", "{height: 900 ft, going: dawn}",
     ["13:51: fault.at.going: read dawn, wanted down or up (did you mean down?)"]),
    ("{loop_angle: 245 deg}", "{time: 3 s, going: up}",
     ["13:39: fault.at.going: read the key going, wanted no going with time: it goes with height"]),
    ("{loop_angle: 245 deg}", "245 deg",
     ["13:27: fault.at: read 245 deg, wanted a mapping with one of loop_angle, time, after_top or height, such as "
      "{loop_angle: 245 deg}"]),
    ("fault: {kind: freeze, at: {loop_angle: 245 deg}}", "fault: freeze",
     ["13:8: fault: read freeze, wanted none, or a mapping such as {kind: freeze, at: {loop_angle: 245 deg}} (did "
      "you mean {kind: freeze, at: ...}?)"]),
    ("right: {aft: 0 m, right: 14 m, down: 0 m}", "ri/ght: {aft: 0 m, right: 14 m, down: 0 m}",
     ["15:3: formation.ri/ght: read a slot named ri/ght, wanted a name of letters, digits and _, other than lead, at "
      "most 24 long",
      "19:14: film.from: read right, wanted a slot of the formation or the lead: lead, ri/ght or left (did you mean "
      "ri/ght?)"]),
    ("right: {aft: 0 m, right: 14 m, down: 0 m}", "right: {right: 14 m}",
     ["15:10: formation.right.aft: read nothing, wanted behind the lead, along the path he has flown: a length with "
      "its unit (m, ft, km, NM or cm), such as 8 m",
      "15:10: formation.right.down: read nothing, wanted below the lead, above negative: a length with its unit (m, "
      "ft, km, NM or cm), such as 1 m"]),
    ("load_factor: 6.0", "load_factor: six",
     ["17:26: break_out.load_factor: read six, wanted a load factor such as 4.5 g"]),
    ("3 g/s", "3",
     ["17:38: break_out.onset: read 3, wanted a load factor onset with its unit (g/s), such as 3 g/s"]),
    ("gauges_every: never", "gauges_every: 2 s",
     ["18:38: watch.gauges_every: read 2 s, wanted more than the look itself takes, 2.5 s"]),
    ("gauges_every: never", "gauges_every: nver",
     ["18:38: watch.gauges_every: read nver, wanted never or a time with its unit (s, ms or min), such as 3 s (did "
      "you mean never?)"]),
    ("call: none", "call: 3",
     ["18:51: watch.call: read 3, wanted none or a time with its unit (s, ms or min), such as 3 s"]),
    ("size: 1280x720", "size: 1281x720",
     ["19:42: film.size: read 1281x720, wanted a size that an H.264 film takes: both even, from 160x90, not more "
      "than 36864 blocks of 16x16 pixels (did you mean 1280x720?)"]),
    ("size: 1280x720", "size: 8000x6000",
     ["19:42: film.size: read 8000x6000, wanted a size that an H.264 film takes: both even, from 160x90, not more "
      "than 36864 blocks of 16x16 pixels (did you mean 4096x2304?)"]),
    ("size: 1280x720", "size: 10x10",
     ["19:42: film.size: read 10x10, wanted a size that an H.264 film takes: both even, from 160x90, not more than "
      "36864 blocks of 16x16 pixels (did you mean 160x90?)"]),
    ("size: 1280x720", "size: big",
     ["19:42: film.size: read big, wanted width x height in pixels, such as 1280x720"]),
    ("from: right", "from: rihgt",
     ["19:14: film.from: read rihgt, wanted a slot of the formation or the lead: lead, right or left (did you mean "
      "right?)"]),
    ("rate: 30", "rate: 29.97",
     ["19:58: film.rate: read 29.97, wanted a whole number"]),
    ("rate: 30", "rate: 500",
     ["19:58: film.rate: read 500, wanted 5 to 60"]),
    ("field: 75 deg", "field: 75",
     ["19:28: film.field: read 75, wanted an angle with its unit (rad or deg), such as 80 deg"]),
    ("  - level: {for: 3 s}", "  - level: {for: 3 s}\n  - loop: {load_factor: {0: 1, 90: 2}}",
     ["11:17: script.1.loop.close_at: read close_at in a script of 2 loops, wanted a script of one loop",
      "14:40: fault.at.loop_angle: read loop_angle with a script of 2 loops, wanted a script of one loop, or a point "
      "by time or height"]),
    ("  - level: {for: 3 s}", "  - lvel: {for: 3 s}",
     ["12:5: script.2.lvel: read the step lvel, wanted level, loop, roll, climb, dive or pull_out (did you mean "
      "level?)"]),
    ("  - level: {for: 3 s}", "  - level: {for: 3 s}\n    roll: {}",
     ["12:5: script.2: read 2 keys (level or roll), wanted one step of level, loop, roll, climb, dive or pull_out, "
      "such as level: {for: 3 s}"]),
    ("  - level: {for: 3 s}", "  - level",
     ["12:5: script.2: read level, wanted one step of level, loop, roll, climb, dive or pull_out, such as level: "
      "{for: 3 s}"]),
    ("  - level: {for: 3 s}", "  - level:",
     ["12:11: script.2.level: read nothing, wanted a mapping of speed, height, heading, for or power"]),
]


@pytest.mark.parametrize(("old", "new", "lines"), CASES, ids=[new or f"no {old}" for old, new, _ in CASES])
def test_complaint(old: str, new: str, lines: list[str]) -> None:
    """One thing wrong, and just that is said, with its line and column."""
    assert faults(with_line(old, new)) == [f"s.yaml:{line}" for line in lines]
