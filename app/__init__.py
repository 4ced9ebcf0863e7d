"""Rillbook: which field to water, how much, for how many hours and by when, and why."""

__version__ = "0.1.0"
