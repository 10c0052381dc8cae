"""The views: one step of the work each."""
