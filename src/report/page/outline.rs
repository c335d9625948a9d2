//! The outline of an aperture: leaf openings inside the jaws, joined to closed
//! polygons, so that a line style runs along the whole edge. Positions come from
//! the plan as they are; nothing here says what an aperture delivers.

use std::collections::BTreeMap;

use crate::dose::LeafOpening;

/// A rectangle: from, to along x and y, cm.
type Rectangle = [[f64; 2]; 2];

/// Corners nearer than this are one, in parts of a cm.
const CORNERS_PER_CM: f64 = 10_000.0;

/// More openings than any real machine has are not drawn.
const MOST_OPENINGS: usize = 20_000;

/// A corner in whole parts of a cm, so that equal ones meet.
type Corner = [i64; 2];

/// The polygons, cm; with no leaf bank the jaws themselves. An axis without jaws is open between `limits_cm`.
/// Of several banks what all leave open.
pub(super) fn outlines(
    jaws_cm: [Option<[f64; 2]>; 2],
    leaf_banks: &[Vec<LeafOpening>],
    limits_cm: [f64; 2],
) -> Vec<Vec<[f64; 2]>> {
    let jaws = jaws_cm.map(|sides| sides.unwrap_or(limits_cm));
    let mut open = vec![jaws];
    for bank in leaf_banks {
        let leaves: Vec<Rectangle> = bank
            .iter()
            .map(|leaf| [[leaf.x1_cm, leaf.x2_cm], [leaf.y1_cm, leaf.y2_cm]])
            .collect();
        open = open
            .iter()
            .flat_map(|one| leaves.iter().filter_map(|other| common(one, other)))
            .take(MOST_OPENINGS)
            .collect();
    }
    open.retain(|[x, y]| x[1] > x[0] && y[1] > y[0]);
    joined(&edges(&open))
}

fn common(one: &Rectangle, other: &Rectangle) -> Option<Rectangle> {
    let side = |axis: usize| {
        [
            one[axis][0].max(other[axis][0]),
            one[axis][1].min(other[axis][1]),
        ]
    };
    let both = [side(0), side(1)];
    both.iter().all(|side| side[1] > side[0]).then_some(both)
}

/// Edges of the union, the open side to their left, between all levels at which something begins or ends.
fn edges(open: &[Rectangle]) -> Vec<[Corner; 2]> {
    let whole = |cm: f64| (cm.clamp(-1e6, 1e6) * CORNERS_PER_CM).round() as i64;
    let open: Vec<[[i64; 2]; 2]> = open
        .iter()
        .map(|sides| sides.map(|s| s.map(whole)))
        .collect();
    let mut levels: Vec<i64> = open.iter().flat_map(|[_, y]| *y).collect();
    levels.sort_unstable();
    levels.dedup();
    let spans_between = |low: i64, high: i64| {
        let mut spans: Vec<[i64; 2]> = open
            .iter()
            .filter(|[_, y]| y[0] <= low && high <= y[1])
            .map(|[x, _]| *x)
            .collect();
        spans.sort_unstable();
        let mut merged: Vec<[i64; 2]> = Vec::new();
        for span in spans {
            match merged.last_mut() {
                Some(last) if span[0] <= last[1] => last[1] = last[1].max(span[1]),
                _ => merged.push(span),
            }
        }
        merged
    };
    let mut found = Vec::new();
    let mut below: Vec<[i64; 2]> = Vec::new();
    for (index, &low) in levels.iter().enumerate() {
        let above = levels
            .get(index + 1)
            .map_or_else(Vec::new, |&high| spans_between(low, high));
        // Along a level: to the right where only the row above is open, to the left where only the one below is.
        let mut places: Vec<i64> = below.iter().chain(&above).flatten().copied().collect();
        places.sort_unstable();
        places.dedup();
        let holds = |spans: &[[i64; 2]], a: i64, b: i64| {
            spans.iter().any(|span| span[0] <= a && b <= span[1])
        };
        for pair in places.windows(2) {
            let &[a, b] = pair else { continue };
            match (holds(&below, a, b), holds(&above, a, b)) {
                (false, true) => found.push([[a, low], [b, low]]),
                (true, false) => found.push([[b, low], [a, low]]),
                _ => {}
            }
        }
        if let Some(&high) = levels.get(index + 1) {
            for span in &above {
                found.push([[span[1], low], [span[1], high]]);
                found.push([[span[0], high], [span[0], low]]);
            }
        }
        below = above;
    }
    found
}

/// Closed polygons from their edges; corners on a straight line are left out.
fn joined(edges: &[[Corner; 2]]) -> Vec<Vec<[f64; 2]>> {
    let mut from: BTreeMap<Corner, Vec<Corner>> = BTreeMap::new();
    for [start, end] in edges {
        from.entry(*start).or_default().push(*end);
    }
    let mut polygons = Vec::new();
    while let Some((&start, _)) = from.iter().find(|(_, ends)| !ends.is_empty()) {
        let mut corners = vec![start];
        let mut at = start;
        // Every corner has as many edges out as in, so a walk ends where it began.
        while let Some(next) = from.get_mut(&at).and_then(Vec::pop) {
            if next == start {
                break;
            }
            corners.push(next);
            at = next;
        }
        from.retain(|_, ends| !ends.is_empty());
        polygons.push(without_straight(&corners));
    }
    polygons
}

fn without_straight(corners: &[Corner]) -> Vec<[f64; 2]> {
    let before = corners.iter().cycle().skip(corners.len().saturating_sub(1));
    let after = corners.iter().cycle().skip(1);
    corners
        .iter()
        .zip(before)
        .zip(after)
        .filter(|((corner, before), after)| {
            let along = |axis: usize| before[axis] == corner[axis] && corner[axis] == after[axis];
            !along(0) && !along(1)
        })
        .map(|((corner, _), _)| corner.map(|part| part as f64 / CORNERS_PER_CM))
        .collect()
}

#[cfg(test)]
mod tests {
    use super::outlines;
    use crate::dose::LeafOpening;

    fn leaf(x1_cm: f64, x2_cm: f64, y1_cm: f64, y2_cm: f64) -> LeafOpening {
        LeafOpening {
            x1_cm,
            x2_cm,
            y1_cm,
            y2_cm,
        }
    }

    /// Area inside by the shoelace formula; anticlockwise counts positive.
    fn area_cm2(polygons: &[Vec<[f64; 2]>]) -> f64 {
        let one = |points: &Vec<[f64; 2]>| -> f64 {
            let next = points.iter().cycle().skip(1);
            let pairs = points.iter().zip(next);
            pairs.map(|(a, b)| (a[0] * b[1] - b[0] * a[1]) / 2.0).sum()
        };
        polygons.iter().map(one).sum()
    }

    #[test]
    fn verify_two_leaf_pairs_give_one_polygon() {
        // By hand: 4 x 1 and 2 x 1 cm, one above the other: six cm2, eight corners.
        let bank = vec![leaf(-2.0, 2.0, 0.0, 1.0), leaf(-1.0, 1.0, 1.0, 2.0)];
        let found = outlines(
            [Some([-5.0, 5.0]), Some([-5.0, 5.0])],
            &[bank],
            [-20.0, 20.0],
        );
        assert_eq!(found.len(), 1);
        assert_eq!(found[0].len(), 8, "{found:?}");
        assert!((area_cm2(&found) - 6.0).abs() < 1e-9, "{found:?}");
    }

    #[test]
    fn verify_jaws_cut_and_equal_leaves_make_a_rectangle() {
        // By hand: jaws x -1 .. 3, y 0.5 .. 1.5 of leaves -2 .. 2: 3 x 1 cm.
        let bank = vec![leaf(-2.0, 2.0, 0.0, 1.0), leaf(-2.0, 2.0, 1.0, 2.0)];
        let found = outlines(
            [Some([-1.0, 3.0]), Some([0.5, 1.5])],
            &[bank],
            [-20.0, 20.0],
        );
        let corners = [[-1.0, 0.5], [2.0, 0.5], [2.0, 1.5], [-1.0, 1.5]];
        assert_eq!(found, [corners.to_vec()]);
    }

    #[test]
    fn verify_two_banks_are_open_where_both_are() {
        // By hand: 4 x 4 along x and 2 x 6 along y overlap in 2 x 4.
        let along_x = vec![leaf(-2.0, 2.0, -2.0, 0.0), leaf(-2.0, 2.0, 0.0, 2.0)];
        let along_y = vec![leaf(-1.0, 0.0, -3.0, 3.0), leaf(0.0, 1.0, -3.0, 3.0)];
        let found = outlines([None, None], &[along_x, along_y], [-20.0, 20.0]);
        assert_eq!(found.len(), 1);
        assert!((area_cm2(&found) - 8.0).abs() < 1e-9, "{found:?}");
    }

    #[test]
    fn verify_apart_openings_give_a_polygon_each_and_closed_ones_none() {
        let bank = vec![leaf(-2.0, -1.0, 0.0, 1.0), leaf(1.0, 2.0, 1.0, 2.0)];
        assert_eq!(outlines([None, None], &[bank], [-20.0, 20.0]).len(), 2);
        assert!(outlines([None, None], &[Vec::new()], [-20.0, 20.0]).is_empty());
        let jaws = outlines([Some([-1.0, 2.0]), None], &[], [-20.0, 20.0]);
        assert!((area_cm2(&jaws) - 120.0).abs() < 1e-9, "{jaws:?}");
        let wild = [Some([f64::NAN, 1e12]), None];
        assert!(outlines(wild, &[], [-20.0, 20.0]).len() <= 1);
    }
}
