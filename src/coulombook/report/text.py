"""The words of `coulombook.prose.text`, under the name they had."""

from coulombook.prose.text import LONGEST, crop, visible

__all__ = ["LONGEST", "crop", "visible"]
