"""One module for each command, with its options (`give_options`) and its work (`run`, which returns the exit status).

A module is loaded only when its command is named; its words of help stand in `coulombook.cli.texts`.
"""
