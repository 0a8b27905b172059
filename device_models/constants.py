"""Physical constants, exact by definition of the SI (2019)."""

from __future__ import annotations

BOLTZMANN = 1.380649e-23  # J/K
ELEMENTARY_CHARGE = 1.602176634e-19  # C
