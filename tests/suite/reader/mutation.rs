//! Random damage, the same on every run: the reader never panics, never takes
//! long and never makes more of a file than is in it.

use std::time::Instant;

use counterfoil::plan::{Plan, identify, read_plan};

use super::plans::everything;
use crate::builder::{Encoding, PlanSpec};

/// A small linear congruential generator (Knuth's MMIX constants).
struct Random(u64);

impl Random {
    fn below(&mut self, limit: usize) -> usize {
        self.0 = self
            .0
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        usize::try_from(self.0 >> 33).unwrap_or(0) % limit.max(1)
    }

    fn byte(&mut self) -> u8 {
        u8::try_from(self.below(256)).unwrap_or(0)
    }
}

fn damage(bytes: &mut Vec<u8>, random: &mut Random) {
    for _ in 0..=random.below(3) {
        let at = random.below(bytes.len());
        match random.below(6) {
            0 => bytes[at] = random.byte(),
            1 => bytes[at] ^= 1 << random.below(8),
            2 => bytes.truncate(at.max(1)),
            3 => {
                let end = (at + 1 + random.below(16)).min(bytes.len());
                bytes.drain(at..end);
            }
            4 => bytes.insert(at, random.byte()),
            _ => {
                let end = (at + 4).min(bytes.len());
                bytes[at..end].fill(0xFF);
            }
        }
        if bytes.is_empty() {
            return;
        }
    }
}

/// Values that a plan holds, as a measure of what was made of the file.
fn values(plan: &Plan) -> usize {
    let points = plan.beams.iter().flat_map(|beam| &beam.control_points);
    let leaves = points
        .flat_map(|point| &point.leaves)
        .filter_map(|bank| bank.positions_cm.value())
        .map(|positions| positions.len())
        .sum::<usize>();
    leaves + plan.beams.len() + plan.notes.len()
}

#[test]
fn property_damage_never_panics() {
    let mut random = Random(20_240_105);
    let mut readable = 0;
    let mut slowest = std::time::Duration::ZERO;
    for spec in [PlanSpec::default(), everything()] {
        for encoding in Encoding::ALL {
            let whole = spec.encoded(encoding);
            for _ in 0..1_000 {
                let mut bytes = whole.clone();
                damage(&mut bytes, &mut random);
                let start = Instant::now();
                let _ = identify(&bytes);
                if let Ok(plan) = read_plan(&bytes) {
                    readable += 1;
                    assert!(values(&plan) <= 4 * bytes.len() + 1_000);
                }
                slowest = slowest.max(start.elapsed());
            }
        }
    }
    println!("{readable} of 12000 damaged files still read; slowest {slowest:?}");
    assert!(slowest.as_secs_f64() < 2.0);
}

/// Bytes that are nothing at all, with and without a marker.
#[test]
fn property_noise_never_panics() {
    let mut random = Random(1);
    for round in 0..2_000 {
        let length = random.below(2_000);
        let mut bytes: Vec<u8> = (0..length).map(|_| random.byte()).collect();
        if round % 2 == 0 && length > 150 {
            bytes[128..132].copy_from_slice(b"DICM");
        }
        let _ = identify(&bytes);
        assert!(read_plan(&bytes).is_err());
    }
}
