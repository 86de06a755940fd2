"""For all tests: hypothesis without a deadline, since a test must not depend on how busy the machine is."""

from __future__ import annotations

from hypothesis import settings

settings.register_profile("latepull", deadline=None)
settings.load_profile("latepull")
