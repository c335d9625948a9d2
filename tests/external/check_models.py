"""The shipped tables are what `beam-models/make.py` makes, byte for byte."""

import subprocess
import sys

from common import MODELS, Checks, scratch


def made_again():
    folder = scratch("models")
    subprocess.run([sys.executable, MODELS / "make.py", folder], check=True)
    return {path.relative_to(folder): path.read_bytes() for path in sorted(folder.rglob("*.csv"))}


def shipped():
    tables = [path for path in sorted(MODELS.rglob("*.csv")) if path.parent != MODELS]
    return {path.relative_to(MODELS): path.read_bytes() for path in tables}


def check_same_files(made, found):
    assert made, "make.py made nothing"
    assert set(made) == set(found), f"made {sorted(map(str, made))}, shipped {sorted(map(str, found))}"


def check_same_bytes(made, found):
    assert made == found, "shipped and made differ: run beam-models/make.py and commit what it writes"


def main():
    checks = Checks()
    made, found = made_again(), shipped()
    checks.run("models: every table is made by make.py", check_same_files, made, found)
    for path, content in made.items():
        checks.run(f"models: {path} is as made", check_same_bytes, content, found.get(path))
    checks.finish()


if __name__ == "__main__":
    main()
