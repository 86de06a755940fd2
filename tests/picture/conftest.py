"""Stages share what they are built of."""

from __future__ import annotations

from tests.built_once import built_once

__all__ = ["built_once"]
