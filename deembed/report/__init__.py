"""The report: one self-contained page, verdict first."""

from deembed.report.page import report_html

__all__ = ["report_html"]
