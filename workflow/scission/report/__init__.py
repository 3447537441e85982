"""Pictures and the page to look at, and the summary for the terminal.

``canvas`` comes first: it decides where matplotlib may write before anything else imports matplotlib.
"""

from scission.report.canvas import save
from scission.report.figure import draw_scan
from scission.report.page import write_report
from scission.report.summary import summary_text

__all__ = ["draw_scan", "save", "summary_text", "write_report"]
