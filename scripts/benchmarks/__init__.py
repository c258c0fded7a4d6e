"""The sections of scripts/benchmark.py: one module for each kind of target."""
