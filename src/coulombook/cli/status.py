"""Exit status of the command."""

DONE, FAULTS, WRONG_CALL, OUR_FAULT, INTERRUPTED = 0, 1, 2, 3, 130
