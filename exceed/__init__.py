"""exceed: decide from flight recorder logs whether an aeroplane left its limits."""

from __future__ import annotations

__version__ = "0.1.0"
