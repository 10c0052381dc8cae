"""Live capture on screen: set-up, guided tap test, running recording, calibration."""
