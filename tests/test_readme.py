"""The README is what the program does: its scene is read, its keys are the reader's, its commands exist."""

from __future__ import annotations

import re
import shlex
from pathlib import Path

import pytest

from render.command import build_parser
from scenes.reader import read_scene_text
from scenes.reference import with_table

README = (Path(__file__).parents[1] / "README.md").read_text(encoding="utf-8")


def test_table_of_keys_is_the_readers() -> None:
    """To renew it: ``with_table`` of scenes.reference on the README's text."""
    assert with_table(README) == README


@pytest.mark.parametrize("text", re.findall(r"```yaml\n(.*?)```", README, re.DOTALL))
def test_scenes_of_the_readme_are_read(text: str) -> None:
    assert read_scene_text(text).title


def test_commands_of_the_readme_are_the_programs() -> None:
    lines = re.findall(r"^(?:.*&& )?\.venv/bin/latepull ([^#\n]+)", README, re.MULTILINE)
    assert len(lines) > 6
    for line in lines:
        assert build_parser().parse_args(shlex.split(line)).command


def test_cautions_stand_before_the_first_command() -> None:
    assert 0 < README.index("A training illustration, not a clearance") < README.index("<!-- film command -->")
    assert "safe" not in README.lower().replace("safely", "")
