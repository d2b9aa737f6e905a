"""The LaTeX document: model, cycles, spanning trees, stationary state and closed forms."""

from symbolic_response.appendix.document import appendix_text, write_appendix

__all__ = ["appendix_text", "write_appendix"]
