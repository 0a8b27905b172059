"""The one decorator for functions that end up inside the compiled programming loop."""

from __future__ import annotations

from numba import njit

# No cache of their own: the loop that fuses them is cached as a whole, under a digest of all it reaches. A cached callee
# would be checked by numba against its own file only, and could serve stale code when a helper elsewhere changes.
compiled = njit(error_model="numpy", nogil=True)

# For the few helpers in the innermost path that must not cost a call.
compiled_inline = njit(error_model="numpy", nogil=True, forceinline=True)
