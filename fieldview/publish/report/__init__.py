"""The measurement report: one HTML file with everything that was done, measured and assumed."""

from fieldview.publish.report.writing import write_report

__all__ = ["write_report"]
