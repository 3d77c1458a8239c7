"""Size of an installation without extras: run in its environment, it prints sizes by library.

``python3 -m venv lean && lean/bin/python -m pip install -q . && lean/bin/python THIS``
"""

import sys
from importlib.metadata import distributions

NOT_OURS = {"pip", "setuptools"}


def megabytes(distribution):
    """Return what the files of a distribution take, compiled copies left out."""
    paths = (distribution.locate_file(file) for file in distribution.files or ())
    kept = (path for path in paths if path.is_file() and path.suffix != ".pyc")
    return sum(path.stat().st_size for path in kept) / 1e6


if __name__ == "__main__":
    sizes = {item.metadata["Name"]: megabytes(item) for item in distributions()}
    ours = {name: size for name, size in sizes.items() if name not in NOT_OURS}
    for name, size in sorted(ours.items(), key=lambda pair: -pair[1]):
        sys.stdout.write(f"{size:7.1f} MB  {name}\n")
    sys.stdout.write(f"{sum(ours.values()):7.1f} MB  in all\n")
