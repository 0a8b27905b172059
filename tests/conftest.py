"""Settings for all tests."""

from hypothesis import settings

# The same examples every time: a failure must be there again tomorrow.
settings.register_profile("repeatable", derandomize=True, deadline=None)
settings.load_profile("repeatable")
