//! Shapes that the plans of shaped and moving fields are made of: leaf
//! openings around a target, a body with a smooth skin, and beams that change
//! their opening on the way. Which plans there are is the matter of others.

use crate::builder::{BeamSpec, DeviceSpec, PointSpec};

/// The leaf bank of the ROWAN machines: 10 leaves of 1 cm, 40 of 0.5 cm, 10 of 1 cm.
pub(super) fn rowan_leaves() -> DeviceSpec {
    let outer = (-20..-10).map(f64::from);
    let inner = (-20..20).map(|half| f64::from(half) / 2.0);
    let other = (10..=20).map(f64::from);
    DeviceSpec {
        kind: "MLCX".to_owned(),
        pairs: 60,
        source_distance_cm: Some(50.0),
        boundaries_cm: outer.chain(inner).chain(other).collect(),
    }
}

/// To a tenth of a millimetre, as plans state leaves and SSD.
pub(super) fn to_tenth_mm(value_cm: f64) -> f64 {
    format!("{value_cm:.2}").parse().expect("a number")
}

/// Leaf positions of the ROWAN bank: from where to where each pair is open at the
/// middle of its width, cm; `None` closes it on the axis.
pub(super) fn leaves(open: impl Fn(f64) -> Option<[f64; 2]>) -> Vec<f64> {
    let boundaries_cm = rowan_leaves().boundaries_cm;
    let tips: Vec<[f64; 2]> = boundaries_cm
        .windows(2)
        .map(|pair| {
            let sides = open(f64::midpoint(pair[0], pair[1])).unwrap_or([0.0; 2]);
            sides.map(to_tenth_mm)
        })
        .collect();
    let lower = tips.iter().map(|tip| tip[0]);
    let upper = tips.iter().map(|tip| tip[1]);
    lower.chain(upper).collect()
}

/// Leaves around an ellipse with these half axes, its centre at `centre_cm`.
pub(super) fn around_ellipse(half_cm: [f64; 2], centre_cm: [f64; 2]) -> Vec<f64> {
    leaves(|y_cm| {
        let half_width = half_width_cm(half_cm, y_cm - centre_cm[1])?;
        Some([centre_cm[0] - half_width, centre_cm[0] + half_width])
    })
}

/// Half width of an ellipse at a height above its centre; `None` beyond it.
pub(super) fn half_width_cm(half_cm: [f64; 2], y_cm: f64) -> Option<f64> {
    let rest = 1.0 - (y_cm / half_cm[1]).powi(2);
    (rest > 0.0).then(|| half_cm[0] * rest.sqrt())
}

/// A body whose cross section is an ellipse: half widths to the side and to the front, cm.
#[derive(Clone, Copy)]
pub(super) struct Body {
    pub(super) side_cm: f64,
    pub(super) front_cm: f64,
    /// Where the isocentre lies in it: to the patient's left, and to the front of its middle.
    pub(super) isocentre_cm: [f64; 2],
}

impl Body {
    /// Depth of the isocentre at a gantry angle, head first supine, cm: along p + t u the ellipse is met where
    /// (u.u) t^2 + 2 (p.u) t + (p.p - 1) = 0, products weighted by the half axes.
    pub(super) fn depth_cm(&self, gantry_deg: f64) -> f64 {
        let (sine, cosine) = gantry_deg.to_radians().sin_cos();
        let scaled = |[side, front]: [f64; 2]| [side / self.side_cm, front / self.front_cm];
        let [p, u] = [scaled(self.isocentre_cm), scaled([sine, cosine])];
        let dot = |a: [f64; 2], b: [f64; 2]| a[0] * b[0] + a[1] * b[1];
        let (uu, pu, pp) = (dot(u, u), dot(p, u), dot(p, p));
        (-pu + (pu * pu - uu * (pp - 1.0)).sqrt()) / uu
    }

    /// SSD at a gantry angle with the isocentre 100 cm from the source, to a tenth of a millimetre.
    pub(super) fn ssd_cm(&self, gantry_deg: f64) -> f64 {
        to_tenth_mm(100.0 - self.depth_cm(gantry_deg))
    }
}

/// An opening that stands still while a share of the meterset is given.
pub(super) struct Segment {
    pub(super) share: f64,
    pub(super) leaves_cm: Vec<f64>,
}

/// Turns a beam that has its first opening into one of several: each is set without dose and then
/// irradiated. The shares add up to 1.
pub(super) fn in_segments(beam: BeamSpec, segments: Vec<Segment>) -> BeamSpec {
    let mut first = None;
    let mut points = Vec::new();
    let mut weight = 0.0;
    for segment in segments {
        if first.is_none() {
            first = Some(segment.leaves_cm);
        } else {
            points.push(PointSpec {
                positions_cm: vec![("MLCX".to_owned(), segment.leaves_cm)],
                ..PointSpec::at_weight(weight)
            });
        }
        weight = round_weight(weight + segment.share);
        points.push(PointSpec::at_weight(weight));
    }
    let mut beam = beam.with_leaves(rowan_leaves(), first.expect("a segment"));
    beam.beam_type = "DYNAMIC".to_owned();
    beam.control_points.truncate(1);
    beam.control_points.extend(points);
    beam
}

/// A beam whose leaves move from one opening to the next in equal shares of the meterset.
pub(super) fn sliding(beam: BeamSpec, openings_cm: Vec<Vec<f64>>) -> BeamSpec {
    let last = (openings_cm.len() - 1) as f64;
    let mut openings_cm = openings_cm.into_iter();
    let mut beam = beam.with_leaves(rowan_leaves(), openings_cm.next().expect("an opening"));
    beam.beam_type = "DYNAMIC".to_owned();
    beam.control_points.truncate(1);
    for (index, leaves_cm) in openings_cm.enumerate() {
        beam.control_points.push(PointSpec {
            positions_cm: vec![("MLCX".to_owned(), leaves_cm)],
            ..PointSpec::at_weight(round_weight((index + 1) as f64 / last))
        });
    }
    beam
}

/// One control point of an arc.
pub(super) struct ArcPoint {
    pub(super) gantry_deg: f64,
    /// Meterset from the point before, in any unit.
    pub(super) meterset: f64,
    pub(super) ssd_cm: f64,
    /// `None`: as before.
    pub(super) leaves_cm: Option<Vec<f64>>,
}

/// Turns a beam into an arc through these control points.
pub(super) fn along(beam: BeamSpec, direction: &str, points: Vec<ArcPoint>) -> BeamSpec {
    let total: f64 = points.iter().skip(1).map(|point| point.meterset).sum();
    let count = points.len();
    let mut weight = 0.0;
    let mut beam = beam;
    beam.beam_type = "DYNAMIC".to_owned();
    beam.control_points.truncate(1);
    for (index, point) in points.into_iter().enumerate() {
        let gantry_deg = point.gantry_deg.rem_euclid(360.0);
        if index == 0 {
            beam = beam.with_gantry(gantry_deg).with_ssd(point.ssd_cm);
            beam = beam.map_first(|first| first.gantry_direction = Some(direction.to_owned()));
            if let Some(leaves_cm) = point.leaves_cm {
                beam = beam.with_leaves(rowan_leaves(), leaves_cm);
            }
            continue;
        }
        weight += point.meterset / total;
        let ends = index + 1 == count;
        let mut next = PointSpec::at_weight(if ends { 1.0 } else { round_weight(weight) });
        next.gantry_deg = Some(gantry_deg);
        next.gantry_direction = ends.then(|| "NONE".to_owned());
        next.ssd_cm = Some(point.ssd_cm);
        let leaves_cm = point.leaves_cm.into_iter();
        next.positions_cm = leaves_cm.map(|cm| ("MLCX".to_owned(), cm)).collect();
        beam.control_points.push(next);
    }
    beam
}

/// Weights as plans state them.
fn round_weight(weight: f64) -> f64 {
    format!("{weight:.6}").parse().expect("a number")
}
