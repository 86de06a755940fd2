"""For all tests: hypothesis without a deadline, since a test must not depend on how busy the machine is."""

from __future__ import annotations

import pytest
from hypothesis import settings

settings.register_profile("latepull", deadline=None)
settings.load_profile("latepull")


def pytest_addoption(parser: pytest.Parser) -> None:
    """Options of our own."""
    parser.addoption("--update-baselines", action="store_true", help="renew the pictures of tests/picture/baseline")
