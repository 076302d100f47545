"""One table: for each quantity of the check values, the call of our own physics that gives it.

The functions only convert units and hand the inputs over; the physics is nowhere repeated here.
"""

from __future__ import annotations

from exceed.reference.computed_flight import AIR, FORCES, LIMITS, TURNS, Compute
from exceed.reference.computed_records import BALANCE, CERTAINTY, COUNTS, GUSTS

COMPUTED: dict[str, Compute] = {**AIR, **TURNS, **FORCES, **LIMITS, **GUSTS, **COUNTS, **CERTAINTY, **BALANCE}
