"""What all tests share: examples that are drawn anew are the same on every machine, so a red run can be repeated."""

from hypothesis import settings

settings.register_profile("repeatable", derandomize=True, deadline=None)
settings.load_profile("repeatable")
