"""An independent check of point certificates: standard library only, nothing else of the project.

Written from the statement of the record in DEVELOPERS.md. Runs on its own as
``python -I -S symbolic_response/checker FILE...``.
"""

from .checking import check_file, check_record
from .reading import Verdict, exit_status

__all__ = ["Verdict", "check_file", "check_record", "exit_status"]
