"""Every field that `counterfoil read --json` gives equals what pydicom reads:
from pydicom's own RT plans, from every sample plan, and from variants written
by pydicom. Nothing is left out: a key that only one side has is a failure,
and each field must have been stated somewhere, or it was never compared.
"""

import re
import warnings
from pathlib import Path

import pydicom
from pydicom import config
from pydicom.datadict import tag_for_keyword

import pydicom_reading
from common import Checks, read_json, sample_plans, scratch, SAMPLES
from make_variants import variants

config.settings.reading_validation_mode = config.IGNORE
# pydicom guesses the syntax of files without meta group, and says so.
warnings.simplefilter("ignore")

NOTE_KEYS = {"scope", "kind", "effect", "place", "message", "measured", "limit"}
NOTE_KINDS = set(
    "repeated_attribute repeated_number dangling_reference malformed_value incredible_value count_mismatch "
    "meterset_weights missing_value aperture unsupported remark".split()
)
EFFECTS = {"none", "blocks_scope", "blocks_plan"}
PLACE = re.compile(r"^(?:(?P<path>(?:\w+\[\d+\]\.)*))(?P<keyword>\w+) \((?P<tag>[0-9A-F]{4},[0-9A-F]{4})\)$")

stated_somewhere = set()
all_fields = set()


# Without a counterpart in the standard: only verification control points carry a weight beside a depth.
NEVER_STATED = {"plan.beams[].control_points[].referenced_doses[].point_depth.cumulative_weight"}


def compare(path, found, expected):
    """Differences between the program's JSON and pydicom's reading, as sentences."""
    if expected is ...:
        # Words of explanation: only that there are some.
        return [] if isinstance(found, str) and found.strip() else [f"{path}: no explanation"]
    if isinstance(expected, dict):
        if not isinstance(found, dict):
            return [f"{path}: {found!r} where an object belongs"]
        out = [f"{path}.{key}: pydicom's reading does not know it" for key in found.keys() - expected.keys()]
        out += [f"{path}.{key}: the program does not give it" for key in expected.keys() - found.keys()]
        record(path, expected)
        for key in expected.keys() & found.keys():
            out += compare(f"{path}.{key}", found[key], expected[key])
        return out
    if isinstance(expected, list):
        if not isinstance(found, list) or len(found) != len(expected):
            count = len(found) if isinstance(found, list) else found
            return [f"{path}: {count!r} items, pydicom has {len(expected)}"]
        record_list(path, expected)
        out = []
        for index, (one, other) in enumerate(zip(found, expected)):
            out += compare(f"{path}[{index}]", one, other)
        return out
    if isinstance(expected, bool) or isinstance(found, bool) or isinstance(expected, str):
        same = found is expected if isinstance(expected, bool) else found == expected
        return [] if same else [f"{path}: {found!r}, pydicom has {expected!r}"]
    if expected is None or found is None:
        return [] if expected is found else [f"{path}: {found!r}, pydicom has {expected!r}"]
    # The very same doubles: both sides parse one decimal string and divide by ten.
    same = isinstance(found, (int, float)) and found == expected
    return [] if same else [f"{path}: {found!r}, pydicom has {expected!r}"]


def plain(path):
    return re.sub(r"\[\d+\]", "[]", path)


def record(path, expected):
    if "standing" in expected:
        all_fields.add(plain(path))
        if expected["standing"] != "absent":
            stated_somewhere.add((plain(path)))


def record_list(path, expected):
    all_fields.add(plain(path))
    if expected:
        stated_somewhere.add(plain(path))


def check_notes(notes, ds, blocking):
    """A note's place must be an attribute by pydicom's dictionary; effects only where they are meant."""
    for note in notes:
        assert set(note) == NOTE_KEYS, f"keys of a note: {sorted(note)}"
        assert note["kind"] in NOTE_KINDS and note["effect"] in EFFECTS, f"{note}"
        assert note["message"].strip(), f"a note without words: {note}"
        match = PLACE.match(note["place"])
        assert match, f"a note's place is no attribute path: {note['place']}"
        keyword, tag = match["keyword"], match["tag"].replace(",", "")
        known = tag_for_keyword(keyword)
        assert known == int(tag, 16), f"{note['place']}: pydicom knows {keyword} as {known}"
        walk_to(ds, match["path"])
        scope = note["scope"]
        if isinstance(scope, dict):
            (name, index), = scope.items()
            sequence = {"beam": "BeamSequence", "fraction_group": "FractionGroupSequence"}[name]
            assert 0 <= index < len(ds[sequence].value), f"{scope} is not in the plan"
        else:
            assert scope == "plan", f"{scope}"
    if blocking is not None:
        stops = {(note["kind"], note["place"].split(" (")[0]) for note in notes if note["effect"] != "none"}
        assert not stops - blocking, f"a clean value is said to stop something: {sorted(stops - blocking)}"
        assert not blocking - stops, f"not noted: {sorted(blocking - stops)}"


def walk_to(ds, path):
    for step in path.split(".")[:-1]:
        keyword, index = re.match(r"(\w+)\[(\d+)\]", step).groups()
        assert keyword in ds, f"{path}: no {keyword} there"
        ds = ds[keyword].value[int(index)]


def check_file(path, blocking):
    """`blocking` None: a sample plan, whose faults its own list tells."""
    ds = pydicom.dcmread(path, force=True)
    found = read_json(path)
    notes = found.pop("notes")
    expected = pydicom_reading.plan(ds)
    differences = compare("plan", found, expected)
    assert not differences, "; ".join(differences[:5]) + (f" ... {len(differences)} in all" if differences[5:] else "")
    check_notes(notes, ds, blocking)


def check_the_comparison(path):
    """The comparison sees every single change: each leaf of the program's JSON is changed in turn."""
    expected = pydicom_reading.plan(pydicom.dcmread(path))
    found = read_json(path)
    found.pop("notes")
    count = 0
    for holder, key in leaves_of(found):
        before = holder[key]
        holder[key] = (before + 1e-6) if isinstance(before, (int, float)) and not isinstance(before, bool) else "other"
        if before is True or before is False:
            holder[key] = not before
        # An explanation in words may be any.
        assert key == "how" or compare("plan", found, expected), f"a changed {key} ({before!r}) was not seen"
        holder[key] = before
        count += 1
    assert count > 200 and not compare("plan", found, expected), f"{count} leaves"


def leaves_of(node):
    for key, value in list(node.items() if isinstance(node, dict) else enumerate(node)):
        if isinstance(value, (dict, list)):
            yield from leaves_of(value)
        else:
            yield node, key


def check_coverage():
    never = sorted(all_fields - stated_somewhere - NEVER_STATED)
    assert not never, f"never stated in any file, hence never compared: {', '.join(never)}"


def bundled_plans():
    """pydicom's RT plans that come with the package (nothing is fetched), whole ones."""
    folder = Path(pydicom.__file__).parent
    out = []
    for path in sorted(folder.rglob("*.dcm")):
        try:
            ds = pydicom.dcmread(path, force=True)
            if ds.get("SOPClassUID") == "1.2.840.10008.5.1.4.1.1.481.5" and "truncated" not in path.name:
                out.append(path)
        except Exception:  # other test files are damaged on purpose
            continue
    return out


def check_sample_plans_are_there():
    assert sample_plans(), f"no .dcm file in {SAMPLES}"


def main():
    checks = Checks()
    plans = bundled_plans()
    base = next(path for path in plans if path.name == "rtplan.dcm")
    for path in plans:
        checks.run(f"reader: pydicom's {path.name}", check_file, path, frozenset())
    written = variants(scratch("variants"), base)
    full = next(variant for variant in written if variant.name == "everything explicit")
    checks.run("reader: the comparison sees every change", check_the_comparison, full.path)
    for variant in written:
        checks.run(f"reader: variant {variant.name}", check_file, variant.path, variant.blocking)
    checks.run("reader: every field was stated in some variant", check_coverage)
    checks.run("reader: there are sample plans", check_sample_plans_are_there)
    for path in sample_plans():
        name = path.relative_to(SAMPLES)
        checks.run(f"reader: sample {name}", check_file, path, None)
    checks.finish()


if __name__ == "__main__":
    main()
