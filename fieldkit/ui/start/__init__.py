"""Where a session starts: the first screen, picking a file, describing a new pipe."""
