"""What a finished workup says: documents for programs, advice for people."""
