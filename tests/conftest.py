"""Shared set-up: hypothesis profiles with fixed seeds, so that a run can be repeated."""

from hypothesis import settings

settings.register_profile("repeatable", derandomize=True, deadline=None)
settings.load_profile("repeatable")
