//! Decimals as written, as fractions.

use dashu_int::{IBig, UBig};
use dashu_ratio::RBig;

/// Longest text of a number, bytes.
const MAX_TEXT: usize = 400;
/// Largest size of a number's exponent. Doubles end at 308.
const MAX_EXPONENT: i64 = 400;

/// The number that `text` writes, such as `-0.25`, `1e-3` or `+7`; `None` if it is not a decimal or
/// is longer than any that a double prints. Cost: quadratic in the number of digits.
pub fn parse(text: &str) -> Option<RBig> {
    if text.len() > MAX_TEXT {
        return None;
    }
    let (mantissa, exponent) = match text.split_once(['e', 'E']) {
        Some((mantissa, exponent)) => (mantissa, exponent.parse::<i64>().ok()?),
        None => (text, 0),
    };
    let (negative, digits) = match mantissa.as_bytes().first()? {
        b'-' => (true, &mantissa[1..]),
        b'+' => (false, &mantissa[1..]),
        _ => (false, mantissa),
    };
    let (whole, part) = digits.split_once('.').unwrap_or((digits, ""));
    let all = [whole, part].concat();
    if all.is_empty() || !all.bytes().all(|byte| byte.is_ascii_digit()) {
        return None;
    }
    if exponent.unsigned_abs() > MAX_EXPONENT.unsigned_abs() {
        return None;
    }
    let digits = IBig::from(UBig::from_str_radix(&all, 10).ok()?);
    let number = if negative { -digits } else { digits };
    let places = exponent - i64::try_from(part.len()).ok()?;
    let power = UBig::from(10u8).pow(usize::try_from(places.unsigned_abs()).ok()?);
    Some(if places < 0 {
        RBig::from_parts(number, power)
    } else {
        RBig::from(number * IBig::from(power))
    })
}

/// `number` in lowest terms as `p/q`.
pub fn lowest(number: &RBig) -> String {
    format!("{}/{}", number.numerator(), number.denominator())
}
