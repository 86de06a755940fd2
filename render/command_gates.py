"""The command ``gates``: the gate card of a scene's loop, its figures as text and for a program."""

from __future__ import annotations

import argparse
from collections.abc import Callable
from pathlib import Path

from render.command_work import CaseBar, may_replace, plain_json, say

# stage, its part of the time in percent and its flights, as measured with late_freeze
STAGES = (("the loop as briefed", 1, 0), ("the gate at top", 41, 1090), ("the gate at vertical down", 12, 550),
          ("the base height", 24, 770), ("the largest float", 8, 210), ("another day", 14, 380))
CARD, TABLE, FIGURES = "gate_card", "gates.txt", "gates.json"


def add_gates(add: Callable[[str, str], argparse.ArgumentParser]) -> None:
    """Give the command line its ``gates``."""
    sub = add("gates", "solve the least heights at the top and at vertical down, and draw the gate card")
    sub.add_argument("scene", metavar="SCENE", help="a shipped name or a path; its fault is left out")
    sub.add_argument("--want", required=True, metavar="TIME", help="what is to be left after any freeze, such as 1.5s")
    sub.add_argument("--at", choices=("hand", "notice"), default="hand",
                     help="left when his hand moves, after his reaction (default), or when he notices")
    sub.add_argument("--spread", default="20 kt", metavar="SPEED",
                     help="how much slower and faster the ends of the curves are entered (default 20 kt)")
    sub.add_argument("--out", type=Path, help="folder (default out/<scene>)")
    sub.add_argument("--force", action="store_true", help="replace a card that is there")


def option(name: str, dim: str, text: str, least: float, most: float) -> float:
    """An option's value with its unit, in SI. Raises LatepullError: not such a value, or out of range."""
    from render.errors import LatepullError
    from scenes.units import UnitError, parse_value, range_text

    try:
        value, unit = parse_value(dim, text)
    except UnitError as exc:
        raise LatepullError(f"{name}: read {text}, wanted {exc.wanted}") from None
    if not least <= value <= most:
        raise LatepullError(f"{name}: read {text}, wanted {range_text(dim, least, most, unit)}")
    return value


class Ticker:
    """What is being worked on, how much of it is done and the time left, on stderr where somebody watches.

    Nobody knows beforehand how many flights a solve takes; each stage counts as the part of the whole that it was
    measured to take.
    """

    def __init__(self) -> None:
        self._bar, self._stage = CaseBar("%"), 0
        self._flights = 0

    def tell(self, what: str) -> None:
        """A new stage."""
        self._stage = next((i for i, (name, _, _) in enumerate(STAGES) if name == what), self._stage)
        self._flights = 0
        self._show()

    def count(self, flights: int) -> None:
        """So many more flights are done."""
        self._flights += flights
        self._show()

    def _show(self) -> None:
        name, part, flights = STAGES[self._stage]
        inside = min(self._flights / max(flights, 1), 0.95)
        self._bar.show(round(sum(p for _, p, _ in STAGES[: self._stage]) + part * inside), 100, name)

    def close(self) -> None:
        """Leave the line clean."""
        self._bar.clear()


def gates_command(args: argparse.Namespace) -> int:
    """Solve and draw the gates; returns the exit code."""
    from render.decide.gate_sheet import solve_gates
    from render.files import write_text
    from render.output.gate_card import write_gate_card
    from render.output.gate_words import plain_sheet, sheet_text
    from scenes.reader import read_airframe, read_scene
    from terrain.ground import read_ground

    want_s = option("--want", "time", args.want, 0.0, 30.0)
    spread_mps = option("--spread", "speed", args.spread, 0.5, 100.0)
    scene = read_scene(args.scene)
    folder = args.out or Path("out") / scene.name
    force = may_replace(args, folder, (f"{CARD}.png", f"{CARD}.pdf", TABLE, FIGURES))
    ticker = Ticker()
    try:
        sheet = solve_gates(scene, read_airframe, read_ground(scene.ground, scene.seed), want_s,
                            from_hand=args.at == "hand", spread_mps=spread_mps, count=ticker.count, tell=ticker.tell)
    finally:
        ticker.close()
    made = [*write_gate_card(sheet, folder / CARD, force=force)]
    text, figures = sheet_text(sheet), plain_sheet(sheet)
    made.append(write_text(folder / TABLE, text, force=force))
    made.append(write_text(folder / FIGURES, plain_json(figures), force=force))
    return say(args, text, figures, made)
