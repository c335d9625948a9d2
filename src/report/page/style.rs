//! The style sheet and the content-security policy that admits it and nothing
//! else: no script, no image, no font, no address.

use sha2::{Digest, Sha256};

/// The style sheet, as it stands in the page.
pub(in crate::report) const STYLE: &str = include_str!("../templates/page.css");

/// The policy: the style sheet by its hash, everything else refused.
pub(in crate::report) fn policy() -> String {
    let hash = base64(&Sha256::digest(STYLE.as_bytes()));
    format!("default-src 'none'; style-src 'sha256-{hash}'; base-uri 'none'; form-action 'none'")
}

/// Base64 with padding, RFC 4648 section 4.
fn base64(bytes: &[u8]) -> String {
    const ALPHABET: &[u8; 64] = b"ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";
    let mut out = String::new();
    for group in bytes.chunks(3) {
        let mut bits = 0u32;
        for position in 0..3 {
            bits = (bits << 8) | u32::from(group.get(position).copied().unwrap_or(0));
        }
        for position in 0..4 {
            let letter = (bits >> (18 - 6 * position)) & 63;
            let letter = ALPHABET.get(letter as usize).copied().unwrap_or(b'=');
            let padding = position > group.len();
            out.push(if padding { '=' } else { char::from(letter) });
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::base64;

    #[test]
    fn verify_base64() {
        // RFC 4648 section 10, test vectors.
        let cases = [
            ("", ""),
            ("f", "Zg=="),
            ("fo", "Zm8="),
            ("foo", "Zm9v"),
            ("foob", "Zm9vYg=="),
            ("fooba", "Zm9vYmE="),
            ("foobar", "Zm9vYmFy"),
        ];
        for (plain, coded) in cases {
            assert_eq!(base64(plain.as_bytes()), coded);
        }
    }
}
