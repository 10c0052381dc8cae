"""Recordings, taps, spectra and measured modes. Knows nothing of pipes."""
