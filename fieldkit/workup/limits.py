"""Between which frequencies modes are looked for."""

LEAST_HZ = 2.0
NYQUIST_SHARE = 0.4
"""Highest frequency analysed, as a share of the sampling rate."""
UP_TO_HZ = 200.0
"""Where no job says how high to look."""
