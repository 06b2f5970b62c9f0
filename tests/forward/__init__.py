"""A forward model of a day at the bench: from a known truth to the files that the truth would leave behind.

It is written from the measurement equations and the file contract alone and shares no code with the package,
so that what the package finds in the files can be held against what was put into them.
"""
