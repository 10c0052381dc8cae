"""From evidence and span to a cure: excitation, match, fixes, verdicts."""
