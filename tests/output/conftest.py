"""The invented studies that tests of outputs share."""

from __future__ import annotations

import pytest

from render.types import Study
from tests.built_once import built_once
from tests.output.made_up import made_up_study

__all__ = ["built_once", "healthy_study", "study"]


@pytest.fixture(scope="session")
def study() -> Study:
    """A faulted scene that ends in contact."""
    return made_up_study()


@pytest.fixture(scope="session")
def healthy_study() -> Study:
    """A scene without a fault, in metres."""
    return made_up_study(fault=False, units="metres")
