"""Settings for all tests."""

from hypothesis import settings

# how long an example takes says how busy the machine is, and timing belongs in benchmarks
settings.register_profile("unhurried", deadline=None)
settings.load_profile("unhurried")
