"""Check records: one line a file.

Exit status 0: all valid; 1: one is invalid; 2: else one is malformed or cannot be read; 3: else
one is beyond a size limit.
"""

import importlib.util
import os
import sys
from types import ModuleType


def package() -> ModuleType:
    """Return this folder as a package of its own, whatever it is called from."""
    folder = os.path.dirname(os.path.abspath(__file__))
    found = importlib.util.spec_from_file_location(
        "checker", os.path.join(folder, "__init__.py"), submodule_search_locations=[folder])
    assert found is not None and found.loader is not None
    module = importlib.util.module_from_spec(found)
    sys.modules["checker"] = module
    found.loader.exec_module(module)
    return module


def main(paths: list[str]) -> int:
    """Check files, print a line for each, and return the exit status."""
    if not paths or paths[0] in ("-h", "--help"):
        print("usage: python -I -S symbolic_response/checker FILE...", file=sys.stderr)
        return 0 if paths else 2
    checker, verdicts = package(), []
    for path in paths:
        verdicts.append(checker.check_file(path))
        line = " ".join(f"{path}: {verdicts[-1]}".split())
        print(line.encode("ascii", "backslashreplace").decode(), flush=True)
    return int(checker.exit_status(verdicts))


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
