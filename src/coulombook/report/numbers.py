"""The numbers of `coulombook.prose.numbers`, under the name they had."""

from coulombook.prose.numbers import ABSENT, between, brief, fixed, plain, with_uncertainty

__all__ = ["ABSENT", "between", "brief", "fixed", "plain", "with_uncertainty"]
