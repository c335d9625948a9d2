//! Escape sequences between character sets in one value (DICOM PS3.3
//! C.12.1.1.2, PS3.5 6.1.2.5). Single character sets, and what is not legible,
//! are for `text`.

use dicom_encoding::text::{SpecificCharacterSet, TextCodec};

const ESCAPE: u8 = 0x1B;

/// What follows an escape character, and the set that it designates. Bytes from 0x80 on follow it.
const UPPER: [(&[u8], &str); 12] = [
    (b"-A", "ISO_IR 100"),
    (b"-B", "ISO_IR 101"),
    (b"-C", "ISO_IR 109"),
    (b"-D", "ISO_IR 110"),
    (b"-F", "ISO_IR 126"),
    (b"-G", "ISO_IR 127"),
    (b"-H", "ISO_IR 138"),
    (b"-L", "ISO_IR 144"),
    (b"-T", "ISO_IR 166"),
    (b")I", "ISO_IR 13"),
    (b"$)A", "GB2312"),
    (b"$)C", "ISO_IR 149"),
];

/// Sets of two bytes below 0x80; their decoder wants the escape sequence itself.
const LOWER_DOUBLE: [&[u8]; 3] = [b"$B", b"$@", b"$(D"];
/// Back to single bytes below 0x80.
const LOWER_SINGLE: [&[u8]; 2] = [b"(B", b"(J"];

/// The text of a value with escape sequences, from `initial` on; `None` where
/// some part of it cannot be decoded.
pub(super) fn decode_escaped(
    initial: Option<&SpecificCharacterSet>,
    value: &[u8],
) -> Option<String> {
    let mut text = String::new();
    let mut upper: Option<SpecificCharacterSet> = None;
    for (index, part) in value.split(|&byte| byte == ESCAPE).enumerate() {
        let designates = |sequence: &&[u8]| index > 0 && part.starts_with(sequence);
        if LOWER_DOUBLE.iter().any(designates) {
            let whole = [&[ESCAPE], part].concat();
            let set = SpecificCharacterSet::from_code("ISO_IR 87");
            text.push_str(&decode(set.as_ref(), &whole)?);
            continue;
        }
        let mut rest = part;
        if let Some((sequence, code)) = UPPER.iter().find(|(sequence, _)| designates(sequence)) {
            upper = SpecificCharacterSet::from_code(code);
            rest = part.get(sequence.len()..)?;
        } else if let Some(sequence) = LOWER_SINGLE.iter().find(|sequence| designates(sequence)) {
            rest = part.get(sequence.len()..)?;
        } else if index > 0 {
            return None;
        }
        // Components, values and lines begin anew with the initial set.
        let end = rest
            .iter()
            .position(|byte| matches!(byte, b'^' | b'=' | b'\\' | b'\r' | b'\n'))
            .unwrap_or(rest.len());
        let (before, after) = rest.split_at_checked(end)?;
        text.push_str(&decode(upper.as_ref().or(initial), before)?);
        if !after.is_empty() {
            upper = None;
            text.push_str(&decode(initial, after)?);
        }
    }
    Some(text)
}

fn decode(set: Option<&SpecificCharacterSet>, bytes: &[u8]) -> Option<String> {
    if bytes.is_ascii() && !bytes.contains(&ESCAPE) {
        return std::str::from_utf8(bytes).ok().map(str::to_owned);
    }
    set?.decode(bytes).ok()
}

#[cfg(test)]
mod tests {
    use super::decode_escaped;
    use dicom_encoding::text::SpecificCharacterSet;

    /// The example names of DICOM PS3.5 (annexes H and I, from memory); the letters by KS X 1001 and JIS X 0208.
    #[test]
    fn verify_names_with_escape_sequences() {
        let korean = b"Hong^Gildong=\x1B$)C\xFB\xF3^\x1B$)C\xD1\xCE\xD4\xD7=\x1B$)C\xC8\xAB^\x1B$)C\xB1\xE6\xB5\xBF";
        assert_eq!(
            decode_escaped(None, korean).as_deref(),
            Some("Hong^Gildong=\u{6d2a}^\u{5409}\u{6d1e}=\u{d64d}^\u{ae38}\u{b3d9}")
        );
        let japanese = b"Yamada^Tarou=\x1B$B;3ED\x1B(B^\x1B$BB@O:\x1B(B";
        assert_eq!(
            decode_escaped(None, japanese).as_deref(),
            Some("Yamada^Tarou=\u{5c71}\u{7530}^\u{592a}\u{90ce}")
        );
        // ISO 8859-1 FC is u with diaeresis; ISO 8859-5 BB, EE, DA are Cyrillic El, yu, ka.
        let latin = SpecificCharacterSet::from_code("ISO_IR 100");
        assert_eq!(
            decode_escaped(latin.as_ref(), b"M\xFCller^\x1B-L\xBB\xEE\xDA^\xFC").as_deref(),
            Some("M\u{fc}ller^\u{41b}\u{44e}\u{43a}^\u{fc}")
        );
    }

    #[test]
    fn verify_other_sequences_are_left_to_the_caller() {
        assert_eq!(decode_escaped(None, b"a\x1B[31mred"), None);
        assert_eq!(decode_escaped(None, b"a\x1B"), None);
        assert_eq!(decode_escaped(None, b"\xFCa"), None);
    }
}
