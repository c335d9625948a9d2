//! Numbers: decimal and integer strings read strictly, binary values in their
//! byte order. Units and credible ranges are the caller's.

use super::tree::{Element, Syntax, Value};
use dicom_core::VR;

/// Values of one attribute; leaf positions and outlines have a few hundred.
const MAX_VALUES: usize = 20_000;

/// Why a value is no number.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Malformed {
    /// What stands there.
    pub(super) found: String,
    /// Why that is no number.
    pub(super) why: &'static str,
}

/// With this many figures both the figures and the power of ten are exact
/// doubles, so that their quotient is correctly rounded.
const EXACT_FIGURES: usize = 15;

/// Powers of ten that a double holds exactly.
const POWERS: [f64; 23] = [
    1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16,
    1e17, 1e18, 1e19, 1e20, 1e21, 1e22,
];

/// Reads all values of an element into `out`, which is emptied first. An empty
/// value gives none.
pub(super) fn read_numbers(element: &Element<'_>, out: &mut Vec<f64>) -> Result<(), Malformed> {
    out.clear();
    let Value::Bytes(bytes) = element.value else {
        return Err(Malformed {
            found: "a sequence".to_owned(),
            why: "is not a number",
        });
    };
    let big = element.syntax == Syntax::ExplicitBig;
    match element.vr {
        VR::FL | VR::OF => binary(bytes, out, |b: [u8; 4]| {
            f64::from(if big {
                f32::from_be_bytes(b)
            } else {
                f32::from_le_bytes(b)
            })
        }),
        VR::FD | VR::OD => binary(bytes, out, |b: [u8; 8]| {
            if big {
                f64::from_be_bytes(b)
            } else {
                f64::from_le_bytes(b)
            }
        }),
        VR::US => binary(bytes, out, |b: [u8; 2]| {
            f64::from(if big {
                u16::from_be_bytes(b)
            } else {
                u16::from_le_bytes(b)
            })
        }),
        VR::SS => binary(bytes, out, |b: [u8; 2]| {
            f64::from(if big {
                i16::from_be_bytes(b)
            } else {
                i16::from_le_bytes(b)
            })
        }),
        VR::UL => binary(bytes, out, |b: [u8; 4]| {
            f64::from(if big {
                u32::from_be_bytes(b)
            } else {
                u32::from_le_bytes(b)
            })
        }),
        VR::SL => binary(bytes, out, |b: [u8; 4]| {
            f64::from(if big {
                i32::from_be_bytes(b)
            } else {
                i32::from_le_bytes(b)
            })
        }),
        _ => decimals(bytes, out),
    }
}

fn binary<const N: usize>(
    bytes: &[u8],
    out: &mut Vec<f64>,
    decode: impl Fn([u8; N]) -> f64,
) -> Result<(), Malformed> {
    let too_many = bytes.len() / N > MAX_VALUES;
    for chunk in bytes.chunks(N).take(MAX_VALUES) {
        match chunk.first_chunk::<N>().map(|chunk| decode(*chunk)) {
            Some(value) if value.is_finite() => out.push(value),
            Some(value) => {
                return Err(Malformed {
                    found: value.to_string(),
                    why: "is not a finite number",
                });
            }
            None => {
                return Err(Malformed {
                    found: format!("{} bytes", bytes.len()),
                    why: "is no whole number of values",
                });
            }
        }
    }
    if too_many { Err(multitude()) } else { Ok(()) }
}

fn multitude() -> Malformed {
    Malformed {
        found: format!("more than {MAX_VALUES} values"),
        why: "is more than any plan has",
    }
}

/// Decimal strings separated by backslashes. All of them empty means absent.
fn decimals(bytes: &[u8], out: &mut Vec<f64>) -> Result<(), Malformed> {
    let mut empty = 0_usize;
    let mut rest = Some(bytes);
    while let Some(text) = rest {
        if let Some((value, after)) = quick_decimal(text) {
            out.push(value);
            rest = after;
        } else {
            let mut parts = text.splitn(2, |&byte| byte == b'\\');
            match decimal(parts.next().unwrap_or_default())? {
                Some(value) => out.push(value),
                None => empty += 1,
            }
            rest = parts.next();
        }
        if out.len() > MAX_VALUES {
            return Err(multitude());
        }
    }
    if empty > 0 && !out.is_empty() {
        return Err(Malformed {
            found: shown(bytes),
            why: "has an empty value among others",
        });
    }
    Ok(())
}

/// The first of several decimal strings and what follows its backslash, when
/// it is as plain as leaf positions are: sign, figures, point, figures.
/// `decimal` decides all others.
fn quick_decimal(text: &[u8]) -> Option<(f64, Option<&[u8]>)> {
    let (negative, digits) = match text {
        [b'-', rest @ ..] => (true, rest),
        rest => (false, rest),
    };
    let mut mantissa = 0_u64;
    let mut end = 0_usize;
    let mut point = None;
    let mut rest = None;
    for &byte in digits {
        let figure = byte.wrapping_sub(b'0');
        if figure < 10 {
            mantissa = mantissa.wrapping_mul(10).wrapping_add(u64::from(figure));
        } else if byte == b'.' && point.is_none() {
            point = Some(end);
        } else if byte == b'\\' {
            rest = digits.get(end + 1..);
            break;
        } else {
            return None;
        }
        end += 1;
    }
    let decimals = point.map_or(0, |point| end - point - 1);
    let figures = end - usize::from(point.is_some());
    if figures == 0 || figures > EXACT_FIGURES {
        return None;
    }
    let value = exact_double(mantissa)? / POWERS.get(decimals)?;
    Some((if negative { -value } else { value }, rest))
}

/// One decimal string: blanks and NUL trimmed, exponents and any number of
/// characters accepted; comma, NaN and infinity rejected. `None` when empty.
pub(super) fn decimal(text: &[u8]) -> Result<Option<f64>, Malformed> {
    let text = trim(text);
    if text.is_empty() {
        return Ok(None);
    }
    let malformed = |why| Malformed {
        found: shown(text),
        why,
    };
    let digits = match text {
        [b'-' | b'+', rest @ ..] => rest,
        rest => rest,
    };
    let mut figures = 0_usize;
    let mut after_point = false;
    let mut exponent: Option<&[u8]> = None;
    for (index, &byte) in digits.iter().enumerate() {
        match byte {
            b'0'..=b'9' => figures += 1,
            b'.' if !after_point => after_point = true,
            b'e' | b'E' if figures > 0 => {
                exponent = digits.get(index + 1..);
                break;
            }
            b',' => return Err(malformed("has a comma where DICOM has a point")),
            _ => return Err(malformed("is not a decimal number")),
        }
    }
    if figures == 0 || exponent.is_some_and(|exponent| !is_integer(exponent)) {
        return Err(malformed("is not a decimal number"));
    }
    match std::str::from_utf8(text).map(str::parse::<f64>) {
        Ok(Ok(value)) if value.is_finite() => Ok(Some(value)),
        _ => Err(malformed("is not a finite number")),
    }
}

/// A mantissa below 2^53 as the double it exactly is.
fn exact_double(mantissa: u64) -> Option<f64> {
    let high = u32::try_from(mantissa >> 32).ok()?;
    let low = u32::try_from(mantissa & 0xFFFF_FFFF).ok()?;
    Some(f64::from(high) * 4_294_967_296.0 + f64::from(low))
}

fn is_integer(text: &[u8]) -> bool {
    let digits = match text {
        [b'-' | b'+', rest @ ..] => rest,
        rest => rest,
    };
    !digits.is_empty() && digits.iter().all(u8::is_ascii_digit)
}

/// A number that must be whole, as `i32`. `2.0` is 2.
pub(super) fn whole(value: f64) -> Option<i32> {
    let in_range = value >= f64::from(i32::MIN) && value <= f64::from(i32::MAX);
    #[expect(
        clippy::cast_possible_truncation,
        reason = "whole and within the range of i32"
    )]
    (in_range && value.fract() == 0.0).then_some(value as i32)
}

/// Without leading and trailing blanks and NUL.
fn trim(mut text: &[u8]) -> &[u8] {
    while let [b' ' | 0, rest @ ..] = text {
        text = rest;
    }
    while let [rest @ .., b' ' | 0] = text {
        text = rest;
    }
    text
}

/// The beginning of a value for messages, escaped.
pub(super) fn shown(text: &[u8]) -> String {
    const LONGEST: usize = 40;
    let head = text.get(..LONGEST).unwrap_or(text);
    let dots = if text.len() > LONGEST { "..." } else { "" };
    format!("{}{dots}", trim(head).escape_ascii())
}

#[cfg(test)]
mod tests {
    use super::{decimal, decimals, whole};

    #[test]
    fn verify_decimal_strings_that_are_accepted() {
        for (text, value) in [
            (&b" 12.50 "[..], 12.5),
            (b"-0.25\0", -0.25),
            (b"+1.5E+2", 150.0),
            (b"1e-3", 0.001),
            (b".5", 0.5),
            (b"5.", 5.0),
            (b"20.000000000001", 20.000_000_000_001),
            (b"116.0036697000000", 116.003_669_7),
            (b"1000.0000000000000000", 1000.0),
        ] {
            assert_eq!(decimal(text), Ok(Some(value)), "{}", text.escape_ascii());
        }
        assert_eq!(decimal(b"  \0"), Ok(None));
    }

    #[test]
    fn verify_decimal_strings_that_are_rejected() {
        for text in [
            &b"1,5"[..],
            b"NaN",
            b"nan",
            b"inf",
            b"-Infinity",
            b"1e999",
            b"1.2.3",
            b"--1",
            b"1e",
            b"e5",
            b".",
            b"-",
            b"0x10",
            b"1 2",
            b"5mm",
            b"1e+",
            b"1\n",
        ] {
            assert!(decimal(text).is_err(), "{}", text.escape_ascii());
        }
    }

    /// The quick way gives the very doubles that the standard library gives.
    #[test]
    fn property_quick_decimal_equals_the_library() {
        let mut state = 1_u64;
        for _ in 0..20_000 {
            state = state
                .wrapping_mul(6_364_136_223_846_793_005)
                .wrapping_add(1_442_695_040_888_963_407);
            let figures = (state >> 20) % 1_000_000_000_000_000;
            let text = format!("{}.{:03}", figures / 1000, figures % 1000);
            let several = format!("-{text}\\{text}\\ +{text}");
            let value: f64 = text.parse().expect("a number");
            let mut read = Vec::new();
            assert_eq!(decimals(several.as_bytes(), &mut read), Ok(()));
            assert_eq!(read, [-value, value, value], "{several}");
        }
    }

    #[test]
    fn verify_whole_numbers() {
        assert_eq!(whole(2.0), Some(2));
        assert_eq!(whole(-3.0), Some(-3));
        assert_eq!(whole(2.5), None);
        assert_eq!(whole(3e9), None);
    }
}
