"""The page of an audit of the sample plans, in a real browser: it opens from
the disk without asking the network for anything, shows every plan, and prints
to paper with all of them."""

import os
import re
import shutil
import subprocess

from common import BEYOND, SAMPLES, WORK, Checks, rows_of, run_program, sample_plans, scratch

MAX_PLANS = 200  # as many as the page shows in full


def browser():
    for name in ("chromium", "chromium-browser"):
        found = shutil.which(name)
        if found:
            return found
    raise AssertionError("chromium is not installed")


def browse(*arguments):
    """Runs the browser without a window, with a proxy that is nowhere: a request to the network would fail and be told."""
    profile = scratch("browser")
    command = [
        browser(),
        "--headless=new",
        "--no-sandbox",  # the checks may run as root
        "--disable-gpu",
        "--disable-dev-shm-usage",
        "--no-first-run",
        "--disable-background-networking",
        "--disable-component-update",
        "--disable-sync",
        f"--user-data-dir={profile}",
        "--proxy-server=127.0.0.1:9",
        "--enable-logging=stderr",
        "--virtual-time-budget=10000",
        *arguments,
    ]
    ran = subprocess.run(
        command, capture_output=True, text=True, timeout=180, check=False, env={**os.environ, "HOME": str(WORK)}
    )
    assert ran.returncode == 0, f"the browser ended with {ran.returncode}: {ran.stderr[-400:]}"
    return ran


def audit_samples():
    assert sample_plans(), f"no .dcm file in {SAMPLES}"
    out = scratch("page") / "report"
    ran = run_program("audit", SAMPLES, "--models", "beam-models", "--out", out)
    # 1: the faulty plans are there to be found.
    ran.assert_status(BEYOND)
    return out


def check_no_network(out):
    html = (out / "report.html").read_text(encoding="utf-8")
    # Names of XML vocabularies look like addresses and are never fetched.
    without_names = re.sub(r'xmlns(:\w+)?="http://www\.w3\.org/[^"]*"', "", html)
    found = re.findall(r"(?:https?:)?//[\w.-]+\.\w+[^\s\"'<]*", without_names)
    assert not found, f"addresses: {found[:3]}"
    for name in ("src", "href", "action", "data", "srcset", "poster"):
        links = re.findall(rf'\s{name}="([^"]*)"', html)
        outside = [link for link in links if not link.startswith(("#", "data:"))]
        assert not outside, f"{name}: {outside[:3]}"
    for loaded in ("@import", "url(", "<link", "<iframe", "<object", "<embed", "fetch(", "XMLHttpRequest", "WebSocket"):
        rest = re.sub(r"url\((#|data:)", "", html)
        assert loaded not in rest, f"{loaded} in the page"
    assert re.search(r'http-equiv="content-security-policy"', html, re.IGNORECASE), "no content-security policy"


def check_screen(out):
    picture = out.parent / "page.png"
    ran = browse(f"--screenshot={picture}", "--window-size=1400,3000", f"file://{out}/report.html")
    assert picture.read_bytes()[:8] == b"\x89PNG\r\n\x1a\n", "no PNG"
    size = picture.stat().st_size
    # An empty page of this size gives some 15 kB.
    assert size > 60_000, f"{size} bytes: an all but empty page"
    complaints = [line for line in ran.stderr.splitlines() if "CONSOLE" in line]
    assert not complaints, f"the page makes the browser complain: {complaints[:2]}"


def check_elements(out):
    """The document as the browser understands it: every plan has its place, and every picture is drawn."""
    document = browse("--dump-dom", f"file://{out}/report.html").stdout
    text = re.sub(r"<[^>]*>", " ", document)
    for row in rows_of(out / "plans.csv"):
        assert row["plan_label"] in text, f"plan {row['plan_label']} is not on the page"
    assert document.count("<svg") >= 3, "no pictures"
    assert "NaN" not in document and "undefined" not in text, "a number that is none"
    assert "not for clinical use" in text, "the stamp of invented models is missing"
    assert "qualified physicist" in text, "the caution is missing"
    assert "<title>" in document and 'lang="en' in document, "no title or language"


def check_paper(out):
    paper = out.parent / "page.pdf"
    browse(f"--print-to-pdf={paper}", "--no-pdf-header-footer", f"file://{out}/report.html")
    assert paper.read_bytes()[:5] == b"%PDF-", "no PDF"
    info = subprocess.run(["pdfinfo", paper], capture_output=True, text=True, check=True).stdout
    pages = int(re.search(r"^Pages:\s+(\d+)", info, re.MULTILINE)[1])
    assert pages >= 3, f"{pages} pages"
    text = subprocess.run(["pdftotext", "-layout", paper, "-"], capture_output=True, text=True, check=True).stdout
    plans = rows_of(out / "plans.csv")
    assert 0 < len(plans) <= MAX_PLANS, f"{len(plans)} plans"
    squeezed = re.sub(r"\s+", "", text)
    for row in plans:
        assert re.sub(r"\s+", "", row["plan_label"]) in squeezed, f"plan {row['plan_label']} is not on paper"
    for row in rows_of(out / "beams.csv"):
        assert re.sub(r"\s+", "", row["beam_name"]) in squeezed, f"beam {row['beam_name']} is not on paper"
    blank = sum(1 for page in text.split("\f")[:-1] if not page.strip())
    assert blank <= 1, f"{blank} of {pages} pages are blank"


def check_private(out):
    mode = (out / "report.html").stat().st_mode & 0o777
    assert mode == 0o600, f"report.html has mode {mode:o}, but holds patients' names"


def main():
    checks = Checks()
    made = []
    checks.run("page: audit of the sample plans", lambda: made.append(audit_samples()))
    for out in made:
        checks.run("page: nothing from the network", check_no_network, out)
        checks.run("page: on screen", check_screen, out)
        checks.run("page: its elements", check_elements, out)
        checks.run("page: on paper", check_paper, out)
        checks.run("page: for its owner only", check_private, out)
    checks.finish()


if __name__ == "__main__":
    main()
