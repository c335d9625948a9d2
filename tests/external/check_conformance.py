"""Every sample plan conforms to the RT Plan IOD by `dciodvfy`, apart from the
faults that are planted in `sample-plans/faulty`, which are listed here with
their reason."""

import re
import subprocess

import pydicom

from common import SAMPLES, Checks, sample_plans, scratch

# Errors of faulty plans that are meant: file name, pattern of the error, why. Faults that the standard allows
# (a wrong number, say) give no error and are not listed.
MEANT = [
]


def errors(path):
    ran = subprocess.run(["dciodvfy", path], capture_output=True, text=True, check=False)
    lines = (ran.stderr + ran.stdout).splitlines()
    assert any(line.strip() == "RTPlan" for line in lines), f"not looked at as an RT Plan: {lines[:3]}"
    return [line.strip() for line in lines if line.startswith("Error")]


def check(path):
    found = errors(path)
    name = path.relative_to(SAMPLES).as_posix()
    meant = [(pattern, why) for file, pattern, why in MEANT if file == name]
    for pattern, why in meant:
        assert any(re.search(pattern, line) for line in found), f"no longer there: {pattern} ({why})"
    other = [line for line in found if not any(re.search(pattern, line) for pattern, _ in meant)]
    assert not other, "; ".join(other[:4])


def check_the_checker():
    """dciodvfy does object: the first sample without its beams' numbers, written by pydicom."""
    ds = pydicom.dcmread(sample_plans()[0])
    for beam in ds.BeamSequence:
        del beam.BeamNumber
    path = scratch("conformance") / "without-numbers.dcm"
    ds.save_as(path)
    assert any("BeamNumber" in line for line in errors(path)), "a beam without a number gives no error"


def check_some():
    assert sample_plans(), f"no .dcm file in {SAMPLES}"
    names = {path.relative_to(SAMPLES).as_posix() for path in sample_plans()}
    gone = {file for file, _, _ in MEANT} - names
    assert not gone, f"listed and not there: {sorted(gone)}"


def main():
    checks = Checks()
    checks.run("conformance: there are sample plans", check_some)
    checks.run("conformance: the checker objects to a faulty plan", check_the_checker)
    for path in sample_plans():
        checks.run(f"conformance: {path.relative_to(SAMPLES)}", check, path)
    checks.finish()


if __name__ == "__main__":
    main()
