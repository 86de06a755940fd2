"""The demand over the back half of a loop that leaves the most in the worst case.

The shape of the pull after the top decides how late a freeze of the lead's pitch control
shows, and whether it clears the ground by itself.  This module seeks the demand (load factor
against loop angle at a few knots) whose worst freeze point leaves the wing pilot the most time,
within limits of load factor, onset, buffet and smoothness, closing at the base height.
"""

from __future__ import annotations
