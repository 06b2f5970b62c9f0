"""Coverage-guided fuzzing of what reads the bench's files, for development only; see `python -m tests.fuzz --help`."""
