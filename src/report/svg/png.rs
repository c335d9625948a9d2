//! A small indexed PNG (ISO/IEC 15948) as a data URI: palette entry 0 is
//! transparent, the others are greys from dark to white. What the entries stand
//! for is decided by the caller.

use std::io::Write;

use flate2::write::ZlibEncoder;
use flate2::{Compression, Crc};

use crate::report::base64::base64;

/// Pixels along a side of a cell, so that a viewer that smooths what it enlarges keeps the cells apart.
const PIXELS: usize = 4;

/// Grey of palette entry 1; entry 255 is white.
const DARKEST: f64 = 64.0;

/// Grey of a palette entry from 1 to 255.
fn grey(entry: u8) -> u8 {
    let share = (f64::from(entry) - 1.0) / 254.0;
    (DARKEST + share.max(0.0) * (255.0 - DARKEST)).round() as u8
}

/// The picture of cells, row by row from the top, each a palette entry; `None` when there are none.
pub(in crate::report) fn grey_picture(columns: usize, cells_from_top: &[u8]) -> Option<String> {
    if columns == 0 || cells_from_top.is_empty() {
        return None;
    }
    let rows = cells_from_top.len() / columns;
    let width = u32::try_from(columns * PIXELS).ok()?;
    let height = u32::try_from(rows * PIXELS).ok()?;
    let mut lines = Vec::with_capacity(rows * PIXELS * (columns * PIXELS + 1));
    for row in cells_from_top.chunks_exact(columns) {
        // Filter 0 (none) for the first line of a row; filter 2 (up) with no difference for the rest.
        lines.push(0);
        lines.extend(row.iter().flat_map(|cell| [*cell; PIXELS]));
        for _ in 1..PIXELS {
            lines.push(2);
            lines.extend(std::iter::repeat_n(0, columns * PIXELS));
        }
    }
    // Writing to memory cannot fail.
    let mut encoder = ZlibEncoder::new(Vec::new(), Compression::best());
    encoder.write_all(&lines).ok()?;
    let data = encoder.finish().ok()?;

    let mut header = Vec::with_capacity(13);
    header.extend(width.to_be_bytes());
    header.extend(height.to_be_bytes());
    // Eight bits a pixel, palette, the one compression, the one set of filters, not interlaced.
    header.extend([8, 3, 0, 0, 0]);
    let palette: Vec<u8> = (0..=255).flat_map(|entry| [grey(entry); 3]).collect();

    let mut bytes = b"\x89PNG\r\n\x1a\n".to_vec();
    for (kind, content) in [
        (b"IHDR", header.as_slice()),
        (b"PLTE", &palette),
        (b"tRNS", &[0]),
        (b"IDAT", &data),
        (b"IEND", &[]),
    ] {
        bytes.extend(u32::try_from(content.len()).ok()?.to_be_bytes());
        let mut check = Crc::new();
        check.update(kind);
        check.update(content);
        bytes.extend(kind);
        bytes.extend(content);
        bytes.extend(check.sum().to_be_bytes());
    }
    Some(format!("data:image/png;base64,{}", base64(&bytes)))
}

#[cfg(test)]
mod tests {
    use super::{grey, grey_picture};

    #[test]
    fn verify_greys_and_empty_pictures() {
        // The ends of the scale as its constants state them; halfway, 64 + 127/254 * 191 = 159.5.
        assert_eq!([grey(1), grey(128), grey(255)], [64, 160, 255]);
        assert_eq!(grey_picture(0, &[]), None);
        assert_eq!(grey_picture(3, &[]), None);
        assert!(grey_picture(1, &[7]).is_some());
    }
}
