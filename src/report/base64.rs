//! Base64 with padding, RFC 4648 section 4: for the hash of the style sheet and
//! for pictures that stand in the page. What is encoded is decided elsewhere.

const ALPHABET: &[u8; 64] = b"ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";

/// The bytes as text.
pub(super) fn base64(bytes: &[u8]) -> String {
    let mut out = String::with_capacity(bytes.len().div_ceil(3) * 4);
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
