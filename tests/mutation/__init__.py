"""How many small changes of the core the tests notice; for development only, see `python -m tests.mutation --help`."""
