//! The whole program on folders of mixed plans: plans a second and peak memory,
//! which must not grow with the number of plans. The plans are the sample plans
//! over and over, each copy with UIDs of its own.
//!
//! `cargo bench --bench many` makes folders of 1,000 and 5,000 plans under
//! `target/`; `cargo bench --bench many -- 40000` one of 40,000. Peak memory is
//! read from /proc, so it is shown on Linux only.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

/// Every UID of the sample plans begins with this and five digits.
const UID_ROOT: &[u8] = b"2.25.20261109";

fn main() {
    let mut counts: Vec<usize> = std::env::args()
        .skip(1)
        .filter_map(|word| word.parse().ok())
        .collect();
    if counts.is_empty() {
        counts = vec![1_000, 5_000];
    }
    for count in counts {
        let folder = plans(count);
        for jobs in ["1", "2"] {
            let (seconds, peak_mb) = audit(&folder, jobs);
            let rate = count as f64 / seconds;
            let peak = peak_mb.map_or_else(|| "not known".to_owned(), |mb| format!("{mb:.0} MB"));
            println!(
                "{count} plans, --jobs {jobs}: {seconds:.2} s, {rate:.0} plans/s, peak memory {peak}"
            );
        }
    }
}

/// A folder of this many plans with distinct UIDs.
fn plans(count: usize) -> PathBuf {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    let folder = root.join(format!("target/bench-plans/{count}"));
    let _ = fs::remove_dir_all(&folder);
    fs::create_dir_all(&folder).expect("a folder under target/");
    let samples: Vec<Vec<u8>> = walkdir::WalkDir::new(root.join("sample-plans"))
        .sort_by_file_name()
        .into_iter()
        .map(|entry| entry.expect("a sample plan").into_path())
        .filter(|path| path.extension().is_some_and(|end| end == "dcm"))
        .map(|path| fs::read(path).expect("a sample plan"))
        .collect();
    for number in 0..count {
        let mut bytes = samples[number % samples.len()].clone();
        // The copy's number in place of the date: the same length, so the file stays sound.
        let uid = format!("2.25.2{number:07}");
        assert_eq!(uid.len(), UID_ROOT.len());
        let mut at = 0;
        while let Some(found) = bytes[at..]
            .windows(UID_ROOT.len())
            .position(|window| window == UID_ROOT)
        {
            at += found;
            bytes[at..at + uid.len()].copy_from_slice(uid.as_bytes());
        }
        fs::write(folder.join(format!("{number:06}.dcm")), bytes).expect("a plan");
    }
    folder
}

fn audit(folder: &Path, jobs: &str) -> (f64, Option<f64>) {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    let start = Instant::now();
    let mut program = Command::new(env!("CARGO_BIN_EXE_counterfoil"))
        .arg("audit")
        .arg(folder)
        .args(["--jobs", jobs, "--quiet", "--models"])
        .arg(root.join("beam-models"))
        .arg("--out")
        .arg(root.join("target/bench-plans/report"))
        .stderr(Stdio::null())
        .spawn()
        .expect("the program starts");
    let status = format!("/proc/{}/status", program.id());
    let mut peak_mb = None;
    loop {
        if let Some(mb) = peak_of(&status) {
            peak_mb = Some(mb);
        }
        if program.try_wait().expect("the program runs").is_some() {
            return (start.elapsed().as_secs_f64(), peak_mb);
        }
        std::thread::sleep(Duration::from_millis(2));
    }
}

/// VmHWM, the peak of resident memory so far, MB.
fn peak_of(status: &str) -> Option<f64> {
    let text = fs::read_to_string(status).ok()?;
    let line = text.lines().find(|line| line.starts_with("VmHWM:"))?;
    let kilobytes: f64 = line.split_whitespace().nth(1)?.parse().ok()?;
    Some(kilobytes / 1024.0)
}
