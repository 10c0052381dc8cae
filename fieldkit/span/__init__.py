"""The pipe span as a structure: layout, elements, modes, static answers. Knows nothing of signals."""
