//! Text values: decoded in whatever character set the file names, lossily and
//! without ever failing, control characters removed. Text is for showing and
//! for comparing names; nothing is computed from it.

use dicom_core::VR;
use dicom_encoding::text::{SpecificCharacterSet, TextCodec};

use super::escape::decode_escaped;

/// The character set of a data set.
#[derive(Debug)]
pub(super) struct Charset {
    first: Option<SpecificCharacterSet>,
    /// Whether escape sequences may lead to other sets.
    extended: bool,
}

impl Charset {
    /// From the bytes of Specific Character Set (0008,0005). The first value
    /// counts where no escape sequence says otherwise; an unknown one is read
    /// as UTF-8 where that fits, else Latin-1.
    pub(super) fn from_value(value: &[u8]) -> Self {
        let all = String::from_utf8_lossy(value);
        let mut terms = all.split('\\').map(|term| term.trim_matches([' ', '\0']));
        let first = terms.next().unwrap_or_default();
        // An empty first value is the default set, extended by the next ones.
        let term = if first.is_empty() {
            terms.next().unwrap_or_default()
        } else {
            first
        };
        Self {
            first: match term {
                // These say ASCII; bytes beyond it are undeclared, see `decode`.
                "" | "ISO_IR 6" | "ISO 2022 IR 6" => None,
                _ => SpecificCharacterSet::from_code(term),
            },
            extended: all.contains('\\') || term.starts_with("ISO 2022"),
        }
    }

    /// The default character set.
    pub(super) const fn undeclared() -> Self {
        Self {
            first: None,
            extended: false,
        }
    }

    /// Decodes a text value and cleans it; empty when nothing is left.
    pub(super) fn decode(&self, vr: VR, value: &[u8]) -> String {
        let declared = match vr {
            VR::LO | VR::LT | VR::PN | VR::SH | VR::ST | VR::UC | VR::UT => self.first.as_ref(),
            _ => None,
        };
        if value.is_ascii() && !value.contains(&0x1B) {
            return clean(&String::from_utf8_lossy(value));
        }
        if self.extended
            && value.contains(&0x1B)
            && let Some(text) = decode_escaped(declared, value)
        {
            return clean(&text);
        }
        match declared.map(|set| set.decode(value)) {
            Some(Ok(text)) => clean(&text),
            _ => clean(&undeclared_text(value)),
        }
    }
}

/// UTF-8 when the bytes are that, else Latin-1.
fn undeclared_text(value: &[u8]) -> String {
    match std::str::from_utf8(value) {
        Ok(text) => text.to_owned(),
        Err(_) => value.iter().map(|&byte| char::from(byte)).collect(),
    }
}

/// Without control characters (line breaks become blanks), trimmed.
fn clean(text: &str) -> String {
    let text = text.trim_matches(|c: char| c == '\0' || c.is_whitespace());
    if !text.contains(char::is_control) {
        return text.to_owned();
    }
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '\n' | '\t' => out.push(' '),
            c if c.is_control() => {}
            c => out.push(c),
        }
    }
    out.trim().to_owned()
}

#[cfg(test)]
mod tests {
    use super::{Charset, VR};

    #[test]
    fn verify_text_is_decoded_lossily() {
        // ISO 8859-1 0xE9 is U+00E9, e acute; UTF-8 writes it C3 A9 (ISO/IEC 8859-1, RFC 3629).
        let latin = Charset::from_value(b"ISO_IR 100");
        assert_eq!(latin.decode(VR::LO, b"caf\xE9 "), "caf\u{e9}");
        let undeclared = Charset::undeclared();
        assert_eq!(undeclared.decode(VR::LO, b"caf\xC3\xA9"), "caf\u{e9}");
        assert_eq!(undeclared.decode(VR::LO, b"caf\xE9"), "caf\u{e9}");
        let nonsense = Charset::from_value(b"ISO_IR 999");
        assert_eq!(nonsense.decode(VR::PN, b"A^B\0"), "A^B");
        assert_eq!(undeclared.decode(VR::LO, b"a\x07b\r\nc"), "ab c");
    }
}
