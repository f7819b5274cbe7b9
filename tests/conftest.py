"""Settings shared by the tests: property tests draw the same examples every time."""

from hypothesis import settings

settings.register_profile("seeded", derandomize=True, database=None, deadline=None)
settings.load_profile("seeded")
