"""The job document: what it holds, how it is read, edited and saved."""
