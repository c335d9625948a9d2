//! A beam model whose tables are the published kernel's own squares: no head
//! scatter, no horn, perfectly black leaves. The kernel's short-range part stands for
//! the penumbra.

use std::fmt::Write as _;

use counterfoil::beam_model::kernel::PencilKernel;
use counterfoil::beam_model::{MachineModel, load_machine};
use counterfoil::quantity::normal_share;

/// TPR20,10 put into the kernel: a 6 MV beam.
pub(super) const QUALITY: f64 = 0.6774;

/// Sides of the squares, cm: those that clinics measure.
pub(super) const SIDES_CM: [f64; 13] = [
    3.0, 4.0, 5.0, 6.0, 8.0, 10.0, 12.0, 15.0, 20.0, 25.0, 30.0, 35.0, 40.0,
];

/// How a test spoils the model.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Spoilt {
    /// Not at all.
    No,
    /// The penumbra is next to nothing.
    NoBlur,
    /// What is written for a square of a side is the dose of a circle of that diameter.
    Circles,
}

pub(super) fn kernel() -> PencilKernel {
    PencilKernel::new(QUALITY).unwrap()
}

/// The model.
///
/// The penumbra is two Gaussians fitted to the edge of the kernel's own short-range part at 10 cm, as a clinic
/// fits them to a measured edge; no aperture of any comparison takes part.
pub(super) fn kernel_machine(spoilt: Spoilt) -> MachineModel {
    let kernel = kernel();
    let half_width = |side_cm: f64| side_cm / 2.0;
    let dose = |side_cm: f64, depth_cm: f64| match spoilt {
        Spoilt::Circles => kernel.terms(depth_cm).circle_dose(half_width(side_cm)),
        Spoilt::No | Spoilt::NoBlur => kernel.square_dose(side_cm, depth_cm),
    };
    let edge = match spoilt {
        Spoilt::NoBlur => [0.001, 0.0, 0.001],
        Spoilt::No | Spoilt::Circles => fitted_edge(kernel.terms(10.0).primary_per_cm),
    };
    let folder = tempfile::tempdir().unwrap();
    std::fs::create_dir(folder.path().join("6")).unwrap();
    let write = |name: &str, text: &str| std::fs::write(folder.path().join(name), text).unwrap();
    let depths_cm = (2..=30).map(f64::from);
    let mut tpr = format!(
        "depth_cm{}\n",
        joined(SIDES_CM.map(|side| side.to_string()))
    );
    for depth_cm in depths_cm {
        let row = SIDES_CM.map(|side| format!("{:.7}", dose(side, depth_cm) / dose(side, 10.0)));
        let _ = writeln!(tpr, "{depth_cm}{}", joined(row));
    }
    write("6/tpr.csv", &tpr);
    let mut output = "side_cm,sc,sp\n".to_owned();
    for side_cm in SIDES_CM {
        let sp = dose(side_cm, 10.0) / dose(10.0, 10.0);
        let _ = writeln!(output, "{side_cm},1,{sp:.7}");
    }
    write("6/output.csv", &output);
    write("6/off-axis.csv", "radius_cm,ratio\n0,1\n30,1\n");
    let boundaries: Vec<String> = (-40..=40)
        .map(|edge| format!("{:.1}", f64::from(edge) * 0.5))
        .collect();
    write(
        "machine.toml",
        &MACHINE
            .replace("BOUNDARIES", &boundaries.join(", "))
            .replace("TAIL_SIGMA", &format!("{:.4}", edge[2]))
            .replace("TAIL_SHARE", &format!("{:.4}", edge[1]))
            .replace("MAIN_SIGMA", &format!("{:.4}", edge[0])),
    );
    load_machine(folder.path()).unwrap()
}

/// Sigma, share of the tail and its sigma of the two Gaussians nearest to the edge of exp(-a r)/r, whose profile at
/// a distance x is 1/2 + (1/pi) integral of K0 from 0 to a x (K0 the modified Bessel function, as the integral of
/// exp(-u cosh t)): least squares from 0 to 1 cm.
fn fitted_edge(a_per_cm: f64) -> [f64; 3] {
    // The integral of K0 from 0 to u is the integral over t of (1 - exp(-u cosh t)) / cosh t.
    let edge = |x_cm: f64| {
        let step = 0.01;
        let sum: f64 = (0..2000)
            .map(|index| (f64::from(index) + 0.5) * step)
            .map(|t: f64| (1.0 - (-a_per_cm * x_cm * t.cosh()).exp()) / t.cosh())
            .sum();
        0.5 + sum * step / std::f64::consts::PI
    };
    let places_cm: Vec<f64> = (1..=50).map(|index| f64::from(index) * 0.02).collect();
    let exact: Vec<f64> = places_cm.iter().map(|&x_cm| edge(x_cm)).collect();
    let mut best = (f64::INFINITY, [0.2, 0.0, 0.2]);
    for main in 4..=20 {
        for share in 0..=25 {
            for tail in 10..=50 {
                let (main_cm, share, tail_cm) = (
                    f64::from(main) * 0.01,
                    f64::from(share) * 0.02,
                    f64::from(tail) * 0.01,
                );
                if tail_cm < main_cm {
                    continue;
                }
                let squares: f64 = places_cm
                    .iter()
                    .zip(&exact)
                    .map(|(x_cm, exact)| {
                        let below = (1.0 - share) * normal_share(x_cm / main_cm)
                            + share * normal_share(x_cm / tail_cm);
                        (below - exact).powi(2)
                    })
                    .sum();
                if squares < best.0 {
                    best = (squares, [main_cm, share, tail_cm]);
                }
            }
        }
    }
    best.1
}

fn joined(cells: [String; SIDES_CM.len()]) -> String {
    cells.iter().map(|cell| format!(",{cell}")).collect()
}

const MACHINE: &str = r#"
schema = 1
serves = ["KERNEL"]
sad_cm = 100.0
[provenance]
origin = "published"
by = "Nyholm et al. 2006, Radiother Oncol 78:347"
on = 2006-03-01
[approval]
by = "nobody: test data"
on = 2026-01-01
until = 2099-12-31
[[jaws]]
moves_along = "y"
place = "upper"
source_distance_cm = 28.0
[[jaws]]
moves_along = "x"
place = "lower"
source_distance_cm = 37.0
[[leaf_banks]]
moves_along = "x"
source_distance_cm = 50.0
boundaries_cm = [BOUNDARIES]
transmission = 0.0
leaf_end_offset_cm = 0.0
[[beams]]
label = "6"
radiation = "PHOTON"
energy_mv = 6.0
exchange_k = 1.0
penumbra_sigma_cm = MAIN_SIGMA
penumbra_tail_share = TAIL_SHARE
penumbra_tail_sigma_cm = TAIL_SIGMA
extra_focal_distance_cm = 12.0
[beams.reference]
dose_per_mu_cgy = 0.8
depth_cm = 10.0
source_distance_cm = 100.0
[beams.depth_table]
file = "6/tpr.csv"
kind = "tpr"
values_in = "share"
normalised_at = "d0"
interpolation = "monotone-cubic"
d_max_cm = 2.0
[beams.output_factors]
file = "6/output.csv"
[beams.off_axis]
file = "6/off-axis.csv"
kind = "in-air"
[beams.uncertainty]
output_percent = 0.5
depth_table_percent = 0.5
head_scatter_percent = 0.3
phantom_scatter_percent = 0.3
off_axis_percent = 1.0
transmission_percent = 0.3
"#;
