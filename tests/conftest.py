"""What all tests share: laws are tried on the same numbers of examples, however busy the machine is."""

from __future__ import annotations

from hypothesis import settings

# A slow machine is not a failed law.
settings.register_profile("laws", deadline=None)
settings.load_profile("laws")
