"""ruff and mypy over the tree, as part of the tests."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parent.parent


@pytest.mark.parametrize(
    "command",
    [("ruff", "check", "."), ("mypy", "--cache-dir", ".mypy_cache")],
    ids=lambda command: command[0],
)
def test_the_tree_is_clean(command: tuple[str, ...]) -> None:
    pytest.importorskip(command[0], reason=f"{command[0]} isn't installed (extra 'test')")
    done = subprocess.run([sys.executable, "-m", *command], cwd=ROOT, capture_output=True, text=True, timeout=600,
                          check=False)
    if done.returncode != 0:
        pytest.fail(f"{' '.join(command)}\n{done.stdout}{done.stderr}", pytrace=False)
