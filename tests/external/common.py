"""What the external checks share: where things are, running the program with
its memory and time measured, reading its CSV, and counting.

Every check script makes one `Checks`, runs its checks with `checks.run(name,
function)`, and ends with `checks.finish()`. A check fails by an exception;
each prints `ok NAME` or `FAIL NAME: why`, which `run` counts.
"""

import csv
import json
import os
import resource
import signal
import subprocess
import sys
import tempfile
import threading
import time
import traceback
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
PROGRAM = Path(os.environ.get("COUNTERFOIL_PROGRAM", ROOT / "target/release/counterfoil"))
MODELS = ROOT / "beam-models"
SAMPLES = ROOT / "sample-plans"
WORK = ROOT / "target/external-work"

# Exit statuses of the program.
WITHIN, BEYOND, FAILED, INCOMPLETE = 0, 1, 2, 3


class Checks:
    """Runs and counts the checks of one script."""

    def __init__(self):
        self.passed = 0
        self.failed = 0

    def run(self, name, check, *arguments):
        try:
            check(*arguments)
        except Exception as error:  # a check may fail in any way; it must be counted
            self.failed += 1
            why = str(error) or type(error).__name__
            if not isinstance(error, AssertionError):
                frame = traceback.extract_tb(error.__traceback__)[-1]
                why = f"{type(error).__name__} at {Path(frame.filename).name}:{frame.lineno}: {why}"
            print(f"FAIL {name}: {' '.join(why.split())}", flush=True)
        else:
            self.passed += 1
            print(f"ok {name}", flush=True)

    def finish(self):
        sys.exit(1 if self.failed or not self.passed else 0)


@dataclass
class Ran:
    """How a run of the program ended."""

    status: int  # exit status; negative for a signal
    out: str
    err: str
    seconds: float
    peak_mb: float

    def assert_status(self, *wanted):
        assert self.status in wanted, (
            f"exit status {self.status}, not {' or '.join(map(str, wanted))}: {self.err.strip()[-600:]}"
        )


def run_program(*arguments, cwd=ROOT, kill_after_seconds=120):
    """Runs the program; its own peak memory (resident) and wall time are measured.

    An ended run is always returned, however it ended; the caller judges.
    """
    with tempfile.TemporaryFile() as out, tempfile.TemporaryFile() as err:
        started = time.monotonic()
        process = subprocess.Popen(
            [str(PROGRAM), *map(str, arguments)],
            cwd=cwd,
            stdin=subprocess.DEVNULL,
            stdout=out,
            stderr=err,
            env={"PATH": os.environ["PATH"], "HOME": str(WORK), "NO_COLOR": "1"},
        )
        killer = threading.Timer(kill_after_seconds, lambda: os.kill(process.pid, signal.SIGKILL))
        killer.start()
        # wait4 gives the resources of this very child, not of all children so far.
        _, raw, usage = os.wait4(process.pid, 0)
        killer.cancel()
        seconds = time.monotonic() - started
        process.returncode = os.waitstatus_to_exitcode(raw)
        texts = []
        for stream in (out, err):
            stream.seek(0)
            texts.append(stream.read().decode("utf-8"))
    # Linux gives ru_maxrss in KiB.
    return Ran(process.returncode, *texts, seconds, usage.ru_maxrss / 1024)


def read_json(path):
    """The program's JSON for one plan."""
    ran = run_program("read", "--json", path)
    ran.assert_status(WITHIN)
    return json.loads(ran.out)


def rows_of(path):
    """The rows of a CSV file, each a dictionary by column name."""
    with open(path, newline="", encoding="utf-8") as file:
        return list(csv.DictReader(file))


def scratch(name):
    """An empty folder for a check's files."""
    WORK.mkdir(parents=True, exist_ok=True)
    return Path(tempfile.mkdtemp(prefix=f"{name}-", dir=WORK))


def sample_plans():
    """The DICOM files of sample-plans; none only when the folder has none at all."""
    return sorted(SAMPLES.rglob("*.dcm"))


def close(name, found, expected, tolerance):
    """Asserts that two numbers agree."""
    found = float(found)
    assert abs(found - expected) <= tolerance, (
        f"{name}: found {found}, expected {expected} within {tolerance}"
    )


def children_peak_mb():
    """Peak memory over all children so far, MB; for reports only."""
    return resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss / 1024
