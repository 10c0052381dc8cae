"""fieldkit: find why a pipe shakes, and the smallest change that cures it."""

__version__ = "0.1.0"
