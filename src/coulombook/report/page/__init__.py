"""The page `report.html`: a day as one file that needs nothing beside it, on a screen or on paper."""

from coulombook.report.page.document import page_html

NAME = "report.html"

__all__ = ["NAME", "page_html"]
