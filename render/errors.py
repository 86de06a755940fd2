"""What can go wrong for a user, with the exit code that goes with it.

Rooms raise these (or ``scenes.reader.SceneError``); only the command line prints them.
"""

from __future__ import annotations

from typing import Any


class LatepullError(Exception):
    """A fault that is reported to the user as a plain message; exit code 2 (the input is wrong)."""

    exit_code = 2

    def details(self) -> dict[str, Any]:
        """What a program reads under ``--json``, beside the message: {} unless a subclass has more."""
        return {}


class FlightError(LatepullError):
    """A flight that can't be flown as asked: a loop that can't close, a point never reached, a limit left.

    time_s: when, from the start of the script (None if the flight never began); quantity: what
    was out of its range, in words with its unit; value and limit: in that unit.
    """

    def __init__(
        self,
        message: str,
        *,
        time_s: float | None = None,
        quantity: str | None = None,
        value: float | None = None,
        limit: float | None = None,
    ) -> None:
        super().__init__(message)
        self.time_s = time_s
        self.quantity = quantity
        self.value = value
        self.limit = limit

    def details(self) -> dict[str, Any]:
        """Time, quantity, value and limit, those that are known."""
        known = {"time_s": self.time_s, "quantity": self.quantity, "value": self.value, "limit": self.limit}
        return {key: value for key, value in known.items() if value is not None}


class MachineError(LatepullError):
    """This machine can't do it: no software OpenGL, no encoder, a full disk; exit code 3."""

    exit_code = 3


class OutputExists(LatepullError):
    """An output is already there and ``--force`` was not given."""

    def __init__(self, path: object) -> None:
        super().__init__(f"{path} is already there and is kept; give --force to replace it, or --out with another name")
        self.path = str(path)

    def details(self) -> dict[str, Any]:
        """The path that was kept."""
        return {"path": self.path}
