"""Rillbook: which field to water, how much, for how long and by when, with every number defended."""

__version__ = "0.1.0"
