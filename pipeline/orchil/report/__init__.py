"""The report: one HTML file that needs nothing else."""

from .write import ReportRequest, report_html, write_report

__all__ = ["ReportRequest", "report_html", "write_report"]
