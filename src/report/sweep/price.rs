//! Prices: decimal numbers kept as integers and a power of ten, so that none is rounded on the way in.

use std::fmt;

/// A price above 0, in whatever currency: `units` / 10^`scale`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Price {
    units: u128,
    scale: u32,
}

/// The most digits before the point, and behind it.
const MOST_DIGITS: i64 = 18;

/// How many digits a quotient is given with.
const DIGITS_SHOWN: u32 = 6;

impl Price {
    /// Reads `1500000`, `1.5e6`, `249.90`.
    ///
    /// # Errors
    /// What is no decimal number above 0, or has more than 18 digits before or behind the point.
    pub fn parse(text: &str) -> Result<Price, String> {
        let wrong = || "a price above 0 is needed, like 1.5e6 or 250000".to_owned();
        let text = text.trim();
        let (number, exponent) = text.split_once(['e', 'E']).unwrap_or((text, "0"));
        let exponent: i64 = exponent.parse().map_err(|_| wrong())?;
        let (whole, fraction) = number.split_once('.').unwrap_or((number, ""));
        let is_number = |part: &str| part.bytes().all(|byte| byte.is_ascii_digit());
        let ends_well = !whole.is_empty() && !number.ends_with('.');
        if !ends_well || !is_number(whole) || !is_number(fraction) {
            return Err(wrong());
        }
        let fraction = fraction.trim_end_matches('0');
        let digits = format!("{whole}{fraction}");
        let digits = digits.trim_start_matches('0');
        if digits.is_empty() {
            return Err(wrong());
        }
        // The value is digits * 10^shift.
        let shift = exponent.saturating_sub(fraction.len() as i64);
        let before = shift.saturating_add(digits.len() as i64);
        if shift < -MOST_DIGITS || before > MOST_DIGITS || digits.len() as i64 > 2 * MOST_DIGITS {
            return Err(format!(
                "a price has at most {MOST_DIGITS} digits before the point and as many behind it"
            ));
        }
        let zeros = "0".repeat(shift.max(0) as usize);
        let units = format!("{digits}{zeros}").parse().map_err(|_| wrong())?;
        let scale = (-shift).max(0) as u32;
        Ok(Price { units, scale })
    }

    /// The price of one of `count` things, rounded half up to six digits, whole numbers never; nothing where
    /// there are none.
    pub fn per(&self, count: u64) -> Option<String> {
        if count == 0 {
            return None;
        }
        // Whole part first: every product below stays under 2^127.
        let per_unit = u128::from(count).checked_mul(10u128.pow(self.scale))?;
        let (whole, mut rest) = (self.units / per_unit, self.units % per_unit);
        let mut decimals = Vec::new();
        let significant = |decimals: &[u8]| whole > 0 || decimals.iter().any(|&digit| digit > 0);
        let mut shown = if whole > 0 { whole.ilog10() + 1 } else { 0 };
        while rest > 0 && shown < DIGITS_SHOWN && decimals.len() < 2 * MOST_DIGITS as usize {
            rest = rest.checked_mul(10)?;
            decimals.push((rest / per_unit) as u8);
            rest %= per_unit;
            shown += u32::from(significant(&decimals));
        }
        let up = rest.checked_mul(2)? >= per_unit;
        Some(rounded(whole, decimals, up))
    }
}

/// A number in decimals, one more in its last place where it is rounded `up`.
fn rounded(mut whole: u128, mut decimals: Vec<u8>, up: bool) -> String {
    let mut carry = up;
    for digit in decimals.iter_mut().rev() {
        if !carry {
            break;
        }
        carry = *digit == 9;
        *digit = if carry { 0 } else { *digit + 1 };
    }
    whole += u128::from(carry);
    while decimals.last() == Some(&0) {
        decimals.pop();
    }
    let mut text = whole.to_string();
    if !decimals.is_empty() {
        text.push('.');
        text.extend(decimals.iter().map(|&digit| char::from(b'0' + digit)));
    }
    text
}

impl fmt::Display for Price {
    /// All digits, no exponent.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let unit = 10u128.pow(self.scale);
        let (whole, rest) = (self.units / unit, self.units % unit);
        if rest == 0 {
            return write!(f, "{whole}");
        }
        let digits = format!("{rest:0width$}", width = self.scale as usize);
        write!(f, "{whole}.{}", digits.trim_end_matches('0'))
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;

    #[test]
    fn prices_are_exact() {
        let shown = |text| Price::parse(text).unwrap().to_string();
        assert_eq!(shown("1.5e6"), "1500000");
        assert_eq!(shown("1500000.00"), "1500000");
        assert_eq!(shown(" 249.90 "), "249.9");
        assert_eq!(shown("25E-4"), "0.0025");
        assert_eq!(shown("0.1"), "0.1");
        assert_eq!(shown("123456789012345678"), "123456789012345678");
        assert_eq!(shown("0.000000000000000001"), "0.000000000000000001");
    }

    #[test]
    fn what_is_no_price_is_refused() {
        for text in [
            "",
            "0",
            "0.0",
            "0e9",
            "-1",
            "+1",
            "1,5",
            "1.",
            ".5",
            "1.2.3",
            "e6",
            "1e",
            "1e1.5",
            "nan",
            "inf",
            "1e19",
            "1e-19",
            "1e99999999999999999999",
            "1 000",
            "$5",
            "1234567890123456789",
            "0.1234567890123456789",
        ] {
            assert!(Price::parse(text).is_err(), "{text}");
        }
    }

    #[test]
    fn quotients_have_six_digits_and_round_half_up() {
        let per = |text, count| Price::parse(text).unwrap().per(count).unwrap();
        assert_eq!(per("1.5e6", 48), "31250");
        // 1500000 / 7 = 214285.714...
        assert_eq!(per("1.5e6", 7), "214286");
        // 2 / 3 = 0.6666666..., 1 / 388 = 0.002577319...
        assert_eq!(per("2", 3), "0.666667");
        assert_eq!(per("1", 388), "0.00257732");
        // 1999999 / 2 = 999999.5
        assert_eq!(per("1999999", 2), "1000000");
        assert_eq!(per("12345678", 1), "12345678");
        assert_eq!(per("0.5", 2), "0.25");
        // 9.999996 rounds through its nines.
        assert_eq!(per("9.999996", 1), "10");
        assert_eq!(Price::parse("5").unwrap().per(0), None);
        assert!(Price::parse("1e-18").unwrap().per(u64::MAX).is_some());
        assert!(Price::parse("1e17").unwrap().per(u64::MAX).is_some());
    }
}
