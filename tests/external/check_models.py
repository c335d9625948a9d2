#!/usr/bin/env python3
"""Holds the tables of the shipped beam models against the script that makes them, byte for byte.

Runs beam-models/make.py into a temporary folder and compares. Exit status 1 when a table differs, is missing, or is not made by the
script. Needs numpy, as make.py does.
"""

import subprocess
import sys
import tempfile
from pathlib import Path

MODELS = Path(__file__).resolve().parents[2] / "beam-models"


def tables(folder):
    return {path.relative_to(folder).as_posix(): path.read_bytes() for path in sorted(folder.glob("*/*/*.csv"))}


def main():
    with tempfile.TemporaryDirectory() as made:
        subprocess.run([sys.executable, "-B", MODELS / "make.py", made], check=True)
        fresh, committed = tables(Path(made)), tables(MODELS)
    wrong = sorted(name for name in fresh.keys() | committed.keys() if fresh.get(name) != committed.get(name))
    for name in wrong:
        print(f"beam-models/{name}: differs from what beam-models/make.py makes")
    print(f"models: {len(fresh)} tables made, {len(wrong)} differ")
    return 1 if wrong or not fresh else 0


if __name__ == "__main__":
    sys.exit(main())
