"""The command line: text for people, JSON for programs."""
