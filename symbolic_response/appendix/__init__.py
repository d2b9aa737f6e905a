"""The LaTeX document: model, cycles, spanning trees, stationary state and closed forms."""

from symbolic_response.appendix.document import appendix_text, write_appendix
from symbolic_response.appendix.page import Layout

__all__ = ["Layout", "appendix_text", "write_appendix"]
