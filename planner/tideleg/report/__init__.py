"""Reports: page one on the terminal, one HTML file, pictures, and the folder of results."""

from tideleg.report.folder import write_results
from tideleg.report.page_one import print_page

__all__ = ["print_page", "write_results"]
