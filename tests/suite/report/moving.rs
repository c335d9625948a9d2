//! What the page shows of shaped and moving fields: the fluence picture with its
//! cells in their places, first and last aperture over it, the shares, the
//! intervals, and the columns of `beams.csv`.

use std::io::Read;
use std::path::Path;

use counterfoil::audit::{BeamEntry, Verdict};
use counterfoil::beam_model::{MachineModel, load_machine};
use counterfoil::dose::{
    BeamCalculation, BeamRequest, ControlPointDose, FactorName, FluenceImage, ModelAnswer,
    ShapedResult, Shares, StepLimits, Technique, calculate_beam,
};
use counterfoil::plan::{Plan, read_plan};
use counterfoil::quantity::PointSquare;
use counterfoil::settings::Site;

use super::sample::{self, Folder};
use crate::builder::{BeamSpec, DeviceSpec, Encoding, PlanSpec, PointSpec, encode};

/// The rowan model's leaves: forty of 0.5 cm between ten of 1 cm on either side.
fn leaves() -> DeviceSpec {
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

/// Leaf positions, the lower bank first, from the opening at a pair's middle.
fn positions(opening: impl Fn(f64) -> Option<[f64; 2]>) -> Vec<f64> {
    let boundaries_cm = leaves().boundaries_cm;
    let pairs: Vec<[f64; 2]> = boundaries_cm
        .windows(2)
        .map(|pair| opening(f64::midpoint(pair[0], pair[1])).unwrap_or([-9.0, -9.0]))
        .collect();
    let bank = |side: usize| pairs.iter().map(move |pair| pair[side]);
    bank(0).chain(bank(1)).collect()
}

/// A letter F for 75 % of the meterset, then a bar for 25 %, in jaws of 14 cm x 14 cm: no part of it is like its
/// mirror image.
fn letter_plan() -> PlanSpec {
    let letter = positions(|y_cm| match y_cm {
        y if y.abs() > 6.0 => None,
        y if y > 4.0 => Some([-5.0, 5.0]),
        y if y > -1.0 && y < 2.5 => Some([-5.0, 3.0]),
        _ => Some([-5.0, 2.0]),
    });
    let bar = positions(|y_cm| (y_cm > -3.0 && y_cm < 6.0).then_some([-5.0, 2.0]));
    let mut beam = BeamSpec::new(1, "Letter")
        .with_machine("ROWAN-2")
        .with_field(14.0, 14.0)
        .with_leaves(leaves(), letter);
    beam.beam_type = "DYNAMIC".to_owned();
    beam.control_points.truncate(1);
    beam.control_points.push(PointSpec::at_weight(0.75));
    let mut moved = PointSpec::at_weight(0.75);
    moved.positions_cm = vec![("MLCX".to_owned(), bar)];
    beam.control_points.push(moved);
    beam.control_points.push(PointSpec::at_weight(1.0));
    PlanSpec {
        beams: vec![beam],
        ..PlanSpec::default()
    }
}

fn rowan() -> MachineModel {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    load_machine(&root.join("beam-models/rowan")).unwrap()
}

fn calculated(spec: &PlanSpec) -> BeamCalculation {
    let plan: Plan = read_plan(&encode(&spec.object(), Encoding::ExplicitLittle)).unwrap();
    let machine = rowan();
    calculate_beam(&BeamRequest {
        plan: &plan,
        beam_index: 0,
        group: Some((0, 0)),
        model: ModelAnswer::Found(&machine),
        site: &Site::default(),
        depth_row: None,
        steps: StepLimits::default(),
    })
}

fn entry(calculation: BeamCalculation) -> BeamEntry {
    let mut entry = sample::beam(1, "moving", 0.4, Verdict::Within);
    entry.calculation = calculation;
    entry
}

fn written(beam: BeamEntry) -> Folder {
    let folder = Folder::new();
    let plan = sample::plan("m.dcm", "INV-0009", "Moving", vec![beam]);
    sample::write(&folder.path(), 10, &[plan]);
    folder
}

fn page(calculation: BeamCalculation) -> String {
    sample::text(&written(entry(calculation)).path(), "report.html")
}

/// Places and shares of the letter, cm at the isocentre plane: 0.75 where only the letter is open, 1 where the bar is
/// too, 0 where a leaf or jaw stands. By the positions above; each at least 0.4 cm from any edge.
const PROBES: [([f64; 2], f64); 9] = [
    ([4.0, 5.0], 0.75),
    ([-4.0, 5.0], 1.0),
    ([-4.0, 0.0], 1.0),
    ([2.5, 0.5], 0.75),
    ([2.6, -2.0], 0.0),
    ([4.0, 0.5], 0.0),
    ([1.0, -5.0], 0.75),
    ([4.0, -5.0], 0.0),
    ([-4.0, -5.0], 0.75),
];

/// Share at a place of the image; outside it nothing is open.
fn share_at(image: &FluenceImage, [x_cm, y_cm]: [f64; 2]) -> f64 {
    let cell = |at_cm: f64, from_cm: f64| ((at_cm - from_cm) / image.cell_cm).floor();
    let (column, row) = (cell(x_cm, image.x_from_cm), cell(y_cm, image.y_from_cm));
    if column < 0.0 || row < 0.0 || column as usize >= image.columns || row as usize >= image.rows {
        return 0.0;
    }
    let place = row as usize * image.columns + column as usize;
    f64::from(image.values[place]) / 255.0
}

#[test]
fn verify_image_of_an_asymmetric_aperture_has_its_open_cells_where_they_belong() {
    let result = calculated(&letter_plan());
    assert_eq!(result.technique, Technique::Segmented);
    let shaped = result.shaped.unwrap();
    for (place, share) in PROBES {
        let found = share_at(&shaped.fluence, place);
        assert!((found - share).abs() < 0.003, "{place:?} {found} {share}");
    }
    // The collimator turned does not turn the view: it is the collimator's own.
    let turned = calculated(&letter_plan().map_beam(|beam| beam.with_collimator(90.0)));
    assert_eq!(turned.shaped.unwrap().fluence, shaped.fluence);
    // By hand: the letter has 12 cm of open leaf pairs, 2 cm at 10, 3.5 cm at 8 and 6.5 cm at 7; the bar 9 cm at 7.
    // The model's leaf-end offset of 0.08 cm widens each gap at both ends.
    let (area_cm2, width_cm) = (
        0.75 * (20.0 + 28.0 + 45.5) + 0.25 * 63.0,
        0.75 * 12.0 + 0.25 * 9.0,
    );
    let gap_cm = shaped.mean_leaf_gap_cm.unwrap();
    assert!(
        (gap_cm - (area_cm2 / width_cm + 0.16)).abs() < 1e-9,
        "{gap_cm}"
    );
}

/// A picture of the page as pixels, and where it lies in picture units: x, y, width, height.
struct Picture {
    columns: usize,
    pixels: Vec<u8>,
    place: [f64; 4],
}

fn attribute<'a>(element: &'a str, name: &str) -> &'a str {
    let start = element.find(&format!(" {name}=\"")).unwrap() + name.len() + 3;
    element[start..].split('"').next().unwrap()
}

/// The first picture, undone by the rules of PNG (ISO/IEC 15948): chunks, zlib, filters 0 and 2, a palette.
fn first_picture(page: &str) -> Picture {
    let start = page.find("<image class=\"bev-fluence\"").unwrap();
    let element = page[start..].split('>').next().unwrap();
    let code = attribute(element, "href")
        .strip_prefix("data:image/png;base64,")
        .unwrap();
    let bytes = decoded(code);
    assert_eq!(&bytes[..8], b"\x89PNG\r\n\x1a\n");
    let (mut rest, mut data, mut size) = (&bytes[8..], Vec::new(), [0usize; 2]);
    while !rest.is_empty() {
        let length = u32::from_be_bytes(rest[..4].try_into().unwrap()) as usize;
        let (kind, content) = (&rest[4..8], &rest[8..8 + length]);
        let mut check = flate2::Crc::new();
        check.update(&rest[4..8 + length]);
        let stated = u32::from_be_bytes(rest[8 + length..12 + length].try_into().unwrap());
        assert_eq!(check.sum(), stated);
        match kind {
            b"IHDR" => {
                size = [0, 4]
                    .map(|at| u32::from_be_bytes(content[at..at + 4].try_into().unwrap()) as usize);
                assert_eq!(content[8..], [8, 3, 0, 0, 0]);
            }
            b"IDAT" => data.extend_from_slice(content),
            b"tRNS" => assert_eq!(content, [0]),
            _ => {}
        }
        rest = &rest[12 + length..];
    }
    let mut lines = Vec::new();
    flate2::read::ZlibDecoder::new(data.as_slice())
        .read_to_end(&mut lines)
        .unwrap();
    let mut pixels: Vec<u8> = Vec::new();
    for line in lines.chunks(size[0] + 1) {
        let before = pixels.len().checked_sub(size[0]);
        for (index, byte) in line[1..].iter().enumerate() {
            let above = match line[0] {
                0 => 0,
                2 => before.map_or(0, |before| pixels[before + index]),
                other => panic!("filter {other}"),
            };
            pixels.push(byte.wrapping_add(above));
        }
    }
    assert_eq!(pixels.len(), size[0] * size[1]);
    Picture {
        columns: size[0],
        pixels,
        place: ["x", "y", "width", "height"].map(|name| attribute(element, name).parse().unwrap()),
    }
}

/// Base64, RFC 4648 section 4.
fn decoded(code: &str) -> Vec<u8> {
    const ALPHABET: &str = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";
    let sixes: Vec<u32> = code
        .trim_end_matches('=')
        .chars()
        .map(|letter| ALPHABET.find(letter).unwrap() as u32)
        .collect();
    let mut bytes = Vec::new();
    for group in sixes.chunks(4) {
        let bits = group
            .iter()
            .enumerate()
            .fold(0, |bits, (place, six)| bits | (six << (18 - 6 * place)));
        bytes.extend(&bits.to_be_bytes()[1..group.len()]);
    }
    bytes
}

/// Where a place of the collimator system lies in a picture of half-width 11 cm: 240 units wide, its upper left
/// corner at (34, 24), y upward.
fn in_picture([x_cm, y_cm]: [f64; 2]) -> [f64; 2] {
    [
        34.0 + 240.0 * (x_cm + 11.0) / 22.0,
        24.0 + 240.0 * (11.0 - y_cm) / 22.0,
    ]
}

#[test]
fn verify_fluence_picture_lies_the_right_way_up() {
    let page = page(calculated(&letter_plan()));
    let picture = first_picture(&page);
    let rows = picture.pixels.len() / picture.columns;
    let [x, y, width, height] = picture.place;
    for (place, share) in PROBES {
        let [at_x, at_y] = in_picture(place);
        let column = ((at_x - x) / width * picture.columns as f64).floor();
        let row = ((at_y - y) / height * rows as f64).floor();
        let inside = column >= 0.0
            && row >= 0.0
            && (column as usize) < picture.columns
            && (row as usize) < rows;
        let entry = if inside {
            picture.pixels[row as usize * picture.columns + column as usize]
        } else {
            0
        };
        // The greatest share is 1, so that entries are shares of 255: 0.75 * 255 = 191.25.
        let wanted = (255.0 * share).round();
        assert!(
            (f64::from(entry) - wanted).abs() <= 1.0,
            "{place:?} {entry}"
        );
    }
}

#[test]
fn verify_first_and_last_aperture_are_outlined() {
    let page = page(calculated(&letter_plan()));
    let outline = |class: &str| {
        let element = format!("<polygon class=\"{class}\" points=\"");
        let start = page.find(&element).unwrap() + element.len();
        page[start..].split('"').next().unwrap().to_owned()
    };
    let point = |place: [f64; 2]| {
        let [x, y] = in_picture(place);
        let short = |value: f64| {
            let text = format!("{value:.2}");
            text.trim_end_matches('0').trim_end_matches('.').to_owned()
        };
        format!("{},{}", short(x), short(y))
    };
    let first = outline("bev-first");
    // The letter: ten corners, by hand; the bar: four.
    for corner in [
        [-5.0, -6.0],
        [2.0, -6.0],
        [2.0, -1.0],
        [3.0, -1.0],
        [3.0, 2.5],
        [2.0, 2.5],
        [2.0, 4.0],
        [5.0, 4.0],
        [5.0, 6.0],
        [-5.0, 6.0],
    ] {
        assert!(first.contains(&point(corner)), "{corner:?} {first}");
    }
    assert_eq!(first.split(' ').count(), 10);
    let last = outline("bev-last");
    for corner in [[-5.0, -3.0], [2.0, -3.0], [2.0, 6.0], [-5.0, 6.0]] {
        assert!(last.contains(&point(corner)), "{corner:?} {last}");
    }
    assert_eq!(last.split(' ').count(), 4);
    for text in [
        ">first aperture<",
        ">last aperture<",
        "open 0 to 100 % of the meterset",
    ] {
        assert!(page.contains(text), "{text}");
    }
}

#[test]
fn verify_a_field_that_stands_still_has_no_second_aperture() {
    let spec = letter_plan().map_beam(|mut beam| {
        beam.control_points.truncate(1);
        beam.control_points.push(PointSpec::at_weight(1.0));
        beam
    });
    let result = calculated(&spec);
    assert_eq!(result.technique, Technique::Mlc);
    assert_eq!(result.view.last, None);
    let page = page(result);
    assert!(!page.contains("<image") && !page.contains("last aperture"));
    assert!(page.contains("leaf openings of the first control point"));
    assert!(!page.contains("class=\"whole intervals\""));
    assert!(page.contains("Where the dose comes from"));
}

/// Sixty intervals of typed numbers, each of 0.0125 cGy/MU: 0.75 in all.
fn typed_arc() -> BeamCalculation {
    let interval = |index: usize| ControlPointDose {
        from_control_point: index,
        meterset_percent: 100.0 / 60.0,
        gantry_deg: Some(182.5 + 5.0 * index as f64),
        effective_depth_cm: 9.0,
        spd_cm: 99.0,
        point_fluence: 0.875,
        head_scatter: 0.9876,
        in_phantom: 0.9432,
        dose_per_mu_cgy: 0.0125,
    };
    let mut calculation = sample::beam(1, "arc", 0.4, Verdict::Within).calculation;
    calculation.technique = Technique::Arc;
    calculation.view.point_cm = None;
    calculation.shaped = Some(ShapedResult {
        intervals_from: counterfoil::dose::IntervalSource::ControlPoints,
        shares: Shares {
            open_primary_percent: 81.25,
            open_scatter_percent: 18.16,
            transmission_percent: 0.59,
        },
        mean_leaf_gap_cm: Some(3.456),
        fluence_change_percent: 12.34,
        moments: 240,
        steps: StepLimits::default(),
        intervals: (0..60).map(interval).collect(),
        fluence: FluenceImage {
            x_from_cm: -0.5,
            y_from_cm: -0.25,
            cell_cm: 0.25,
            columns: 3,
            rows: 2,
            values: [40, 0, 0, 0, 20, 10].into(),
        },
    });
    calculation
}

#[test]
fn verify_what_a_moving_field_says() {
    let page = page(typed_arc());
    for text in [
        "Where the dose comes from",
        "<th scope=\"row\">open primary</th><td class=\"n\">81.2</td>",
        "<th scope=\"row\">transmission</th><td class=\"n\">0.59</td>",
        "3.46 cm at the isocentre plane",
        "changes by at most 12.3 % within the edge margin",
        "240 moments: in one step no leaf or jaw moves more than 0.25 cm (for head scatter no leaf more than 1 cm) and the gantry not more than 2.05 degrees",
        "Intervals between control points, 12 of 60 evenly picked; audit.json has all",
        // The last: from 182.5 + 5 * 59 = 477.5 degrees, which is 117.5.
        "<th scope=\"row\">60\u{2013}61</th><td class=\"n\">1.67</td><td class=\"n\">117.5</td>",
        "all 60: the product of the trace",
        "<td class=\"n\">0.7500</td>",
        // 40 of 255 is 15.7 %.
        "open 0 to 16 % of the meterset",
        "first and last aperture alike",
        "the dose point is not drawn: it moves across this view as the gantry turns",
    ] {
        assert!(page.contains(text), "{text}");
    }
    let table = page.find("class=\"whole intervals\"").unwrap();
    let rows = page[table..].split("</table>").next().unwrap();
    assert_eq!(rows.matches("<tr>").count(), 1 + 12 + 1);
    // Scaled to the greatest, the upper row first: nothing, 20/40 and 10/40 of 255; then 255 and nothing.
    let picture = first_picture(&page);
    let cell = |column: usize, row: usize| picture.pixels[4 * row * picture.columns + 4 * column];
    assert_eq!([cell(0, 0), cell(1, 0), cell(2, 0)], [0, 128, 64]);
    assert_eq!([cell(0, 1), cell(1, 1), cell(2, 1)], [255, 0, 0]);
}

/// A sweep that the plan does not state must not pass for its control points.
#[test]
fn verify_a_sweep_of_the_model_is_named_as_such() {
    let mut calculation = typed_arc();
    calculation.technique = Technique::Wedge;
    let shaped = calculation.shaped.as_mut().unwrap();
    shaped.intervals_from = counterfoil::dose::IntervalSource::ModelSweep;
    let page = page(calculation);
    for text in [
        "Stretches of the jaw&#39;s sweep, taken from the beam model and not stated in the plan, 12 of 60",
        "<th scope=\"col\">Stretch</th>",
        "<th scope=\"row\">60</th>",
    ] {
        assert!(page.contains(text), "{text}");
    }
    assert!(!page.contains("Intervals between control points"));
}

#[test]
fn verify_pictures_stand_in_the_page_and_nothing_else_is_allowed_in() {
    let page = page(typed_arc());
    let policy = page
        .split("Content-Security-Policy\" content=\"")
        .nth(1)
        .unwrap();
    let policy = policy.split("\">").next().unwrap();
    assert!(
        policy.contains("default-src 'none'") && policy.contains("img-src data:;"),
        "{policy}"
    );
    for rest in page.split("href=\"").skip(1) {
        assert!(rest.starts_with('#') || rest.starts_with("data:image/png;base64,"));
    }
}

#[test]
fn verify_columns_of_an_integrated_beam() {
    let folder = written(entry(typed_arc()));
    let text = sample::text(&folder.path(), "beams.csv");
    let mut reader = csv::Reader::from_reader(text.as_bytes());
    let header = reader.headers().unwrap().clone();
    let row = reader.records().next().unwrap().unwrap();
    for (name, value) in [
        ("mean_leaf_gap_cm", "3.456"),
        ("open_primary_percent", "81.25"),
        ("scatter_percent", "18.16"),
        ("transmission_percent", "0.59"),
    ] {
        let place = header.iter().position(|column| column == name).unwrap();
        assert_eq!(&row[place], value, "{name}");
    }
}

#[test]
fn verify_an_image_that_does_not_fit_its_numbers_is_not_drawn() {
    let mut calculation = typed_arc();
    calculation.shaped.as_mut().unwrap().fluence.columns = 7;
    assert!(!page(calculation).contains("<image"));
}

/// What a person can redo: F(A) from the tables at the square with as much scatter, the factors of an interval from its
/// row, and the product from the intervals. On the axis and without couch or tray, so that nothing else counts.
#[test]
fn verify_a_trace_can_be_redone_from_what_it_says() {
    let machine = rowan();
    let beam = &machine.beams[0];
    let result = calculated(&letter_plan());
    let (trace, shaped) = (result.trace.unwrap(), result.shaped.unwrap());
    let input = |symbol: &str| trace.input(symbol).unwrap().value;
    let factor = |name| trace.factor(name).unwrap().value;

    let side = PointSquare::new(input("s"));
    let table = beam.tpr(input("d_eff"), side).unwrap().value * beam.sp(side).unwrap().value;
    let by_table = table * (input("Phi_open") + input("Phi_leak"));
    let in_phantom = factor(FactorName::ApertureInPhantom);
    // Between tabulated squares the table is read linearly, the kernel along its own curve.
    assert!(
        (by_table / in_phantom - 1.0).abs() < 2e-3,
        "{by_table} {in_phantom}"
    );

    let mut sum = 0.0;
    for interval in &shaped.intervals {
        let by_hand = interval.meterset_percent / 100.0
            * beam.output.dose_per_mu_cgy
            * (beam.output.source_distance_cm / interval.spd_cm).powi(2)
            * interval.head_scatter
            * interval.in_phantom;
        assert!((by_hand / interval.dose_per_mu_cgy - 1.0).abs() < 1e-12);
        sum += by_hand;
    }
    assert_eq!(shaped.intervals.len(), 2);
    assert!((sum / trace.dose_per_mu_cgy - 1.0).abs() < 1e-12);
}
