"""Hostile and damaged files, one fault each, made byte by byte: the program
must give every one a row with a message, within 200 MB and 2 s, and never end
by a signal. Whatever can still be read as a plan must not become a clean
verdict by the damage.
"""

import random
import re
import struct
import zlib

from common import BEYOND, FAILED, INCOMPLETE, MODELS, WITHIN, Checks, close, rows_of, run_program, scratch

LIMIT_MB = 200
LIMIT_SECONDS = 2.0

RT_PLAN = b"1.2.840.10008.5.1.4.1.1.481.5"
EXPLICIT, IMPLICIT, BIG = b"1.2.840.10008.1.2.1", b"1.2.840.10008.1.2", b"1.2.840.10008.1.2.2"
DEFLATED = b"1.2.840.10008.1.2.1.99"
LONG = {b"OB", b"OW", b"OF", b"OD", b"OL", b"SQ", b"UC", b"UN", b"UR", b"UT"}
UNDEFINED = 0xFFFFFFFF


def padded(value, vr):
    return value + (b"\0" if vr in (b"UI", b"OB") else b" ") * (len(value) % 2)


def element(tag, vr, value, length=None):
    """One element in explicit little endian; `length` declares another one than the value has."""
    value = padded(value, vr)
    declared = len(value) if length is None else length
    head = struct.pack("<HH", tag >> 16, tag & 0xFFFF) + vr
    if vr in LONG:
        return head + b"\0\0" + struct.pack("<I", declared) + value
    return head + struct.pack("<H", declared) + value


def item(content, length=None):
    return struct.pack("<HHI", 0xFFFE, 0xE000, len(content) if length is None else length) + content


ITEM_END = struct.pack("<HHI", 0xFFFE, 0xE00D, 0)
SEQUENCE_END = struct.pack("<HHI", 0xFFFE, 0xE0DD, 0)


def sequence(tag, *items):
    return element(tag, b"SQ", b"".join(item(one) for one in items))


def meta(syntax=EXPLICIT):
    group = element(0x00020002, b"UI", RT_PLAN) + element(0x00020010, b"UI", syntax)
    return bytes(128) + b"DICM" + element(0x00020000, b"UL", struct.pack("<I", len(group))) + group


def start(uid=b"2.25.1840002.1"):
    return element(0x00080016, b"UI", RT_PLAN) + element(0x00080018, b"UI", uid)


# 100 MU of the shipped ROWAN-1, 6 MV, 10 x 10 at the isocentre, 10 cm deep at SSD 90, are its reference
# field: 0.790 cGy/MU by its machine.toml, 0.790 Gy. So the sound plan is within, and a damaged value that
# were passed over in silence would show as a clean pass.
def fraction_groups(meterset=b"100"):
    reference = (
        element(0x300A0082, b"DS", b"0\\0\\0")
        + element(0x300A0084, b"DS", b"0.79")
        + element(0x300A0086, b"DS", meterset)
        + element(0x300C0006, b"IS", b"1")
    )
    group = (
        element(0x300A0071, b"IS", b"1")
        + element(0x300A0078, b"IS", b"10")
        + sequence(0x300C0004, reference)
    )
    return sequence(0x300A0070, group)


def beams(gantry=b"0", sad=b"1000", jaws=b"-50\\50", ssd=b"900", extra=b"", inside=b""):
    position = b"".join(
        item(element(0x300A00B8, b"CS", kind) + element(0x300A011C, b"DS", jaws)) for kind in (b"ASYMX", b"ASYMY")
    )
    first = (
        element(0x300A0112, b"IS", b"0")
        + element(0x300A0114, b"DS", b"6")
        + element(0x300A011A, b"SQ", position)
        + element(0x300A011E, b"DS", gantry)
        + element(0x300A0120, b"DS", b"0")
        + element(0x300A0122, b"DS", b"0")
        + element(0x300A012C, b"DS", b"0\\0\\0")
        + element(0x300A0130, b"DS", ssd)
        + element(0x300A0134, b"DS", b"0")
        + inside
    )
    last = element(0x300A0112, b"IS", b"1") + element(0x300A0134, b"DS", b"1")
    device = b"".join(
        item(element(0x300A00B8, b"CS", kind) + element(0x300A00BC, b"IS", b"1")) for kind in (b"ASYMX", b"ASYMY")
    )
    beam = (
        element(0x300A00B2, b"SH", b"ROWAN-1")
        + element(0x300A00B3, b"CS", b"MU")
        + element(0x300A00B4, b"DS", sad)
        + element(0x300A00B6, b"SQ", device)
        + element(0x300A00C0, b"IS", b"1")
        + element(0x300A00C4, b"CS", b"STATIC")
        + element(0x300A00C6, b"CS", b"PHOTON")
        + element(0x300A00CE, b"CS", b"TREATMENT")
        + element(0x300A010E, b"DS", b"1")
        + extra
        + element(0x300A0110, b"IS", b"2")
        + sequence(0x300A0111, first, last)
        + element(0x300C006A, b"IS", b"1")
    )
    return sequence(0x300A00B0, beam)


SETUP = sequence(0x300A0180, element(0x00185100, b"CS", b"HFS") + element(0x300A0182, b"IS", b"1"))
APPROVED = element(0x300E0002, b"CS", b"APPROVED")
UNAPPROVED = element(0x300E0002, b"CS", b"UNAPPROVED")


def data_set(**parts):
    """A whole plan that calculates; parts are put in place of its own."""
    return (
        parts.get("start", start())
        + parts.get("early", b"")
        + parts.get("groups", fraction_groups())
        + parts.get("beams", beams())
        + parts.get("setup", SETUP)
        + parts.get("approval", APPROVED)
        + parts.get("late", b"")
    )


def plan(**parts):
    return meta() + data_set(**parts)


def nested(levels, explicit_lengths):
    """Sequences in sequences, under a tag that plans do have."""
    tag = 0x300A0010
    if explicit_lengths:
        content = b""
        for _ in range(levels):
            content = element(tag, b"SQ", item(content))
        return content
    opened = element(tag, b"SQ", b"", UNDEFINED) + item(b"", UNDEFINED)
    return opened * levels + (ITEM_END + SEQUENCE_END) * levels


def deflate(content):
    packer = zlib.compressobj(9, zlib.DEFLATED, -15)
    return packer.compress(content) + packer.flush()


def deflate_bomb(size):
    """A plan whose inflated data set has `size` bytes; made in pieces."""
    packer = zlib.compressobj(9, zlib.DEFLATED, -15)
    out = [packer.compress(start() + element(0x300A0016, b"UT", b"", size))]
    zeros = bytes(1 << 20)
    for _ in range(size >> 20):
        out.append(packer.compress(zeros))
    return meta(DEFLATED) + b"".join(out) + packer.flush()


def implicit(tag, value, length=None):
    return struct.pack("<HHI", tag >> 16, tag & 0xFFFF, len(value) if length is None else length) + value


def whole():
    """Files that are damaged or unusual as a whole. Name, bytes, and what the row must say (a pattern), or None where
    the file is a sound plan after all and must be audited."""
    sound = plan()
    private_un = element(0x30050010, b"LO", b"INVENTED") + (
        element(0x30051001, b"UN", b"", UNDEFINED)
        + item(implicit(0x00100020, b"X1"), UNDEFINED)
        + ITEM_END
        + SEQUENCE_END
    )
    return [
        ("sound", sound, None),
        ("nesting 2000, undefined lengths", plan(early=nested(2000, False)), "nested"),
        ("nesting 2000, explicit lengths", plan(early=nested(2000, True)), "nested"),
        ("nesting 2000, never closed", meta() + start() + nested(2000, False)[: 2000 * 20], "nested|truncated"),
        ("length FFFFFFF0 in OB", plan(late=element(0x7FE00010, b"OB", b"x" * 100, 0xFFFFFFF0)), "truncated"),
        ("length FFFFFFF0 in SQ", plan(late=element(0x7FE00010, b"SQ", b"", 0xFFFFFFF0)), "truncated"),
        ("length FFFFFFF0 in UT, 3 kB", meta() + start() + element(0x300A0016, b"UT", bytes(3000), 0xFFFFFFF0), "truncated"),
        ("length FFFFFFF0, implicit", meta(IMPLICIT) + implicit(0x00080016, padded(RT_PLAN, b"UI"))
            + implicit(0x300A0002, b"AB", 0xFFFFFFF0), "truncated"),
        ("item length FFFFFFF0", plan(late=element(0x300C0060, b"SQ", item(b"", 0xFFFFFFF0))), "damaged|truncated"),
        ("item longer than its sequence", plan(late=element(0x300C0060, b"SQ", item(b"", 40)) + bytes(80)), "damaged"),
        ("private UN of undefined length", plan(early=b"", late=b"", groups=private_un + fraction_groups()), None),
        ("private UN never closed", plan(late=element(0x30111001, b"UN", b"", UNDEFINED) + item(b"", UNDEFINED)), "truncated"),
        ("FL of 6 bytes", plan(late=element(0x7FE00008, b"FL", b"123456")), "multiple"),
        ("US of 3 bytes", plan(late=element(0x7FE00011, b"US", b"", 3) + b"abc"), "multiple"),
        ("FD of 4 bytes in a beam", plan(beams=beams(extra=element(0x300A010F, b"FD", b"1234"))), "multiple"),
        ("unknown VR", plan(late=element(0x300E0004, b"ZZ", b"20")), "value representation|VR"),
        ("VR of zeros", plan(late=struct.pack("<HH", 0x300E, 0x0004) + bytes(40)), "value representation|VR"),
        ("trailing text", sound + b"this is no DICOM", "after its end|damaged|truncated"),
        ("trailing zeros", sound + bytes(512), "after its end|damaged|truncated"),
        ("trailing FF", sound + b"\xff" * 512, "after its end|damaged|truncated"),
        ("two plans in one file", sound + plan(start=start(b"2.25.1840002.2")), "after its end|damaged|truncated"),
        ("no preamble, meta", sound[128:], None),
        ("no preamble, no meta", data_set(), None),
        ("declared implicit, written explicit", meta(IMPLICIT) + data_set(), None),
        ("declared big endian, written little", meta(BIG) + data_set(), None),
        ("declared deflated, written plain", meta(DEFLATED) + data_set(), None),
        ("unknown syntax", meta(b"1.2.3.4.5") + data_set(), None),
        ("deflated", meta(DEFLATED) + deflate(data_set()), None),
        ("deflated, cut", meta(DEFLATED) + deflate(data_set())[:-40], "deflate|truncated"),
        ("deflated, rubbish after", meta(DEFLATED) + deflate(data_set()) + b"rubbish", "deflate"),
        ("deflated, damaged", meta(DEFLATED) + deflate(data_set())[:60] + b"\xff" * 60, "deflate|damaged"),
        ("deflate bomb of 1 GB", deflate_bomb(1 << 30), "inflates|more than"),
        ("half written", sound[: len(sound) // 2] + bytes(len(sound) - len(sound) // 2), "damaged|truncated|unexpected"),
        ("line endings changed", sound.replace(b"\n", b"\r\n") if b"\n" in sound else sound.replace(b"\0", b"\r\n", 1), "."),
        ("read as text and written as UTF-8", sound.decode("latin-1").encode("utf-8"), "."),
        ("group length that lies", sound[:140] + struct.pack("<I", 0x7FFFFFFF) + sound[144:], None),
        ("delimiter with a length", plan(late=element(0x300C0060, b"SQ", b"", UNDEFINED)
            + struct.pack("<HHI", 0xFFFE, 0xE0DD, 8) + bytes(8)), "."),
        ("item without a sequence", plan(late=item(b"")), "unexpected|damaged"),
        ("300,000 empty elements", plan(early=b"".join(element(0x00080100, b"SH", b"") for _ in range(300_000))), "more than"),
        ("300,000 items", plan(late=element(0x300C0060, b"SQ", item(b"") * 300_000)), "more than"),
        ("9,000 beams", meta() + start() + fraction_groups()
            + element(0x300A00B0, b"SQ", item(element(0x300A00C0, b"IS", b"1")) * 9_000), "more than"),
    ]


def rubbish():
    """Bytes that are no plan: passed over or unreadable, but listed."""
    dice = random.Random(8)
    noise = dice.randbytes(40 << 20)
    return [
        ("40 MB of noise", noise),
        ("40 MB of noise after a marker", bytes(128) + b"DICM" + noise),
        ("40 MB of zeros", bytes(40 << 20)),
        ("a marker only", bytes(128) + b"DICM"),
        ("a preamble cut", bytes(100)),
        ("one byte", b"x"),
        ("text", b"beam,dose\n1,2\n"),
        ("an archive's head", b"PK\x03\x04" + bytes(3000)),
    ]


def values():
    """Sound files with one impossible value. Name, bytes, what beams.csv or findings.csv must say."""
    long_digits = b"9" * 60_000
    return [
        ("DS NaN", plan(beams=beams(gantry=b"NaN")), "NaN|number"),
        ("DS inf in SSD", plan(beams=beams(ssd=b"inf")), "inf|number"),
        ("DS -Infinity in SAD", plan(beams=beams(sad=b"-Infinity")), "Infinity|number"),
        ("DS 1e999 as MU", plan(groups=fraction_groups(b"1e999")), "1e999|number"),
        ("DS of 60,000 digits", plan(groups=fraction_groups(long_digits)), "meterset|number"),
        ("DS with a comma", plan(beams=beams(sad=b"1000,0")), "comma"),
        ("DS as hexadecimal", plan(beams=beams(gantry=b"0x10")), "number"),
        ("MU below zero", plan(groups=fraction_groups(b"-100")), "meterset"),
        ("jaws with four positions", plan(beams=beams(jaws=b"-50\\50\\-50\\50")), "values"),
        ("jaws inverted", plan(beams=beams(jaws=b"50\\-50")), "inverted"),
        ("approved twice", plan(approval=UNAPPROVED + APPROVED), "more than once|stands"),
        ("meterset twice", plan(groups=sequence(0x300A0070, element(0x300A0071, b"IS", b"1")
            + element(0x300A0078, b"IS", b"10") + sequence(0x300C0004,
                element(0x300A0082, b"DS", b"0\\0\\0") + element(0x300A0084, b"DS", b"0.79")
                + element(0x300A0086, b"DS", b"100") + element(0x300A0086, b"DS", b"200")
                + element(0x300C0006, b"IS", b"1")))), "more than once"),
        ("beams twice", plan(beams=beams() + beams(gantry=b"90")), "more than once"),
    ]


most = {"MB": 0.0, "s": 0.0}


def audit(content):
    folder = scratch("attack")
    path = folder / "attack.dcm"
    path.write_bytes(content)
    ran = run_program("audit", path, "--models", MODELS, "--out", folder / "report", "--jobs", 1, kill_after_seconds=30)
    assert ran.status >= 0, f"ended by signal {-ran.status}: {ran.err[-300:]}"
    assert ran.status != 101 and "panicked" not in ran.err, f"panic: {ran.err[-300:]}"
    assert ran.peak_mb < LIMIT_MB, f"{ran.peak_mb:.0f} MB"
    assert ran.seconds < LIMIT_SECONDS, f"{ran.seconds:.2f} s"
    path.unlink()
    most["MB"], most["s"] = max(most["MB"], ran.peak_mb), max(most["s"], ran.seconds)
    return ran, folder / "report"


def check_whole(name, content, says):
    ran, report = audit(content)
    (file,) = rows_of(report / "files.csv")
    if says is None:
        assert file["outcome"] == "audited", file
        (beam,) = rows_of(report / "beams.csv")
        ran.assert_status(WITHIN)
        assert beam["verdict"] == "within", beam
        close("dose", beam["independent_dose_gy"], 0.79, 1e-9)
        return
    ran.assert_status(INCOMPLETE)
    assert file["outcome"] == "unreadable", file
    assert re.search(says, file["message"]), f"message: {file['message']}"
    assert not rows_of(report / "beams.csv"), "a damaged file has beam rows"


def check_rubbish(name, content):
    """Alone it is nothing to audit (2) or an unreadable plan (3); beside a sound plan it is a row."""
    ran, report = audit(content)
    ran.assert_status(FAILED, INCOMPLETE)
    if ran.status == FAILED:
        assert "nothing to audit" in ran.err, ran.err
    else:
        (file,) = rows_of(report / "files.csv")
        assert file["outcome"] == "unreadable" and file["message"], file


def check_beside(attacks):
    """All of the damaged files and the sound one in one folder: one bad file never stops the others."""
    folder = scratch("attacks")
    for index, (name, content, _) in enumerate(attacks):
        (folder / f"{index:03}.dcm").write_bytes(content)
    ran = run_program("audit", folder, "--models", MODELS, "--out", folder / "report")
    assert ran.status in (BEYOND, INCOMPLETE), f"exit status {ran.status}: {ran.err[-300:]}"
    rows = rows_of(folder / "report/files.csv")
    assert len(rows) == len(attacks), f"{len(rows)} rows for {len(attacks)} files"
    # The sound variants carry one UID with different bytes: every one has its row, none a verdict.
    assert all(row["outcome"] in ("audited", "unreadable", "duplicate-of") for row in rows), rows


def check_value(name, content, says):
    """The file is audited; the beam is not verifiable or a finding names the value, and nothing is a clean pass."""
    ran, report = audit(content)
    ran.assert_status(BEYOND, INCOMPLETE)
    words = [row["reasons"] + " " + row["remarks"] for row in rows_of(report / "beams.csv")]
    words += [row["message"] for row in rows_of(report / "findings.csv")]
    words += [row["message"] for row in rows_of(report / "files.csv")]
    assert any(re.search(says, one) for one in words), f"nothing says {says!r}: {words}"
    assert name == "approved twice" or all(row["verdict"] != "within" for row in rows_of(report / "beams.csv")), words


def check_approval_is_not_chosen():
    """Neither the first nor the last of two contradicting approvals is taken."""
    _, report = audit(plan(approval=UNAPPROVED + APPROVED))
    (row,) = rows_of(report / "plans.csv")
    assert row["approval"] == "", f"approval: {row['approval']!r}"


def check_truncation():
    """Cut at every one of many offsets: never a row of a beam, never a crash."""
    content = plan()
    folder = scratch("cuts")
    dice = random.Random(5)
    ends = [len(meta() + start()), len(meta() + start() + fraction_groups())]
    ends += [len(content) - len(SETUP + APPROVED), len(content) - len(APPROVED)]
    offsets = sorted({*ends, *range(132, len(content), 37), *dice.sample(range(1, len(content)), 60), len(content) - 1})
    for offset in offsets:
        (folder / f"cut-{offset:05}.dcm").write_bytes(content[:offset])
    out = folder / "report"
    ran = run_program("audit", folder, "--models", MODELS, "--out", out, kill_after_seconds=60)
    ran.assert_status(INCOMPLETE, BEYOND)
    # A cut between two elements of the outermost level leaves a shorter file that is whole in itself; it may be read.
    whole_elements = {*ends, len(meta() + element(0x00080016, b"UI", RT_PLAN))}
    files = {row["file"].rsplit("/", 1)[1]: row for row in rows_of(out / "files.csv")}
    assert len(files) == len(offsets), f"{len(files)} rows for {len(offsets)} files"
    for offset in offsets:
        row = files[f"cut-{offset:05}.dcm"]
        if offset not in whole_elements and row["outcome"] == "audited":
            raise AssertionError(f"cut at {offset} of {len(content)} was audited")
        if row["outcome"] == "unreadable":
            assert row["message"], row
    passed = {row["file"].rsplit("/", 1)[1] for row in rows_of(out / "beams.csv") if row["verdict"] == "within"}
    # Only a cut before the approval cannot be told from a plan that was never approved.
    allowed = {f"cut-{len(content) - len(APPROVED):05}.dcm"}
    assert passed <= allowed, f"within although cut: {passed - allowed}"
    assert ran.peak_mb < LIMIT_MB, f"{ran.peak_mb:.0f} MB"


def main():
    checks = Checks()
    attacks = whole()
    for name, content, says in attacks:
        checks.run(f"attack: {name}", check_whole, name, content, says)
    for name, content in rubbish():
        checks.run(f"attack: {name}", check_rubbish, name, content)
    for name, content, says in values():
        checks.run(f"attack: {name}", check_value, name, content, says)
    checks.run("attack: two approvals", check_approval_is_not_chosen)
    checks.run("attack: cut at many offsets", check_truncation)
    checks.run("attack: all in one folder", check_beside, attacks)
    print(f"   the most that one file took: {most['MB']:.0f} MB, {most['s']:.2f} s")
    checks.finish()


if __name__ == "__main__":
    main()
