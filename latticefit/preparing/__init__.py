"""Preparing: a measurement becomes the points that are fitted, each with its standard uncertainty."""

from .prepare import prepare

__all__ = ["prepare"]
