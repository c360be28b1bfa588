"""``python -m geoskew``."""

from __future__ import annotations

import sys

if __name__ == "__main__":
    try:
        from geoskew.cli import main
    except ModuleNotFoundError as error:
        sys.exit(
            f"geoskew: the library {error.name} is not installed here; "
            "set up as the README's first command does: "
            "python3 -m venv --without-pip .venv && "
            "pip --python .venv/bin/python install -c constraints.txt -e '.[test]'"
        )
    sys.exit(main())
