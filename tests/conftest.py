"""Settings for all tests."""

from hypothesis import settings

# The same examples in every run, so that a change is never held up by luck, and no deadline, as
# shared machines stall.
settings.register_profile("steady", derandomize=True, deadline=None)
settings.load_profile("steady")
