"""Results for use elsewhere: a Python module without dependencies, and JSON."""

from __future__ import annotations

from symbolic_response.export.writing import (
    export_files,
    export_functions,
    export_json,
    functions_text,
    json_text,
)

__all__ = ["export_files", "export_functions", "export_json", "functions_text", "json_text"]
