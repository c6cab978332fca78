//! GDSII's eight-byte real, read exactly: a sign, seven bits of an exponent of 16 with excess 64, and
//! 56 bits of a fraction. Units, angles and magnifications become integers without a float between.

use std::fmt;

/// The value mantissa times 2 to the power exponent, or its negative.
#[derive(Clone, Copy, Debug)]
pub(super) struct Real8 {
    negative: bool,
    mantissa: u64,
    exponent: i32,
}

impl Real8 {
    pub(super) fn new(raw: [u8; 8]) -> Real8 {
        let bits = u64::from_be_bytes(raw);
        Real8 {
            negative: bits >> 63 == 1,
            mantissa: bits & ((1 << 56) - 1),
            exponent: 4 * ((bits >> 56 & 0x7f) as i32 - 64) - 56,
        }
    }

    /// The integer nearest to the value, if it is within 10 to the power -`digits` (at most 12) of it
    /// and below 2^62.
    pub(super) fn near_integer(self, digits: u32) -> Option<i64> {
        let scaled = u128::from(self.mantissa);
        let (integer, rest, one) = divide(scaled, self.exponent)?;
        let near = rest * 10u128.pow(digits) <= one;
        let integer = i64::try_from(integer)
            .ok()
            .filter(|&i| near && i < 1 << 62)?;
        Some(if self.negative { -integer } else { integer })
    }

    /// The value in units of 10^-12, if it is within a relative 10^-9 of a whole number of them, 1 to
    /// 10^12.
    pub(super) fn trillionths(self) -> Option<u64> {
        let scaled = u128::from(self.mantissa) * 1_000_000_000_000;
        let (integer, rest, one) = divide(scaled, self.exponent)?;
        // rest / one <= 10^-9 (integer + rest / one), all in 128 bits: integer is at most 10^12 and
        // one below 2^100 only where integer is 0.
        if self.negative || !(1..=1_000_000_000_000).contains(&integer) {
            return None;
        }
        let near = rest * 1_000_000_000 <= integer.saturating_mul(one);
        near.then(|| u64::try_from(integer).ok()).flatten()
    }
}

/// The integer nearest to `scaled` times 2^`exponent`, with the distance to it as a fraction `rest` /
/// `one`; `one` is at most 2^80, beyond which the distance is cut to it. `None` for huge values.
fn divide(scaled: u128, exponent: i32) -> Option<(u128, u128, u128)> {
    if exponent >= 0 {
        let fits = scaled == 0 || exponent.unsigned_abs() < scaled.leading_zeros();
        return fits.then(|| (scaled << exponent, 0, 1));
    }
    let mut shift = exponent.unsigned_abs();
    let mut scaled = scaled;
    if shift > 80 {
        // Low bits beyond 2^-80 of a unit change no decision of tolerance 10^-12.
        scaled = scaled.checked_shr(shift - 80).unwrap_or(0);
        shift = 80;
    }
    let one = 1u128 << shift;
    let integer = (scaled + (one >> 1)) >> shift;
    Some((integer, scaled.abs_diff(integer << shift), one))
}

impl fmt::Display for Real8 {
    /// For messages only.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let value = self.mantissa as f64 * 2f64.powi(self.exponent);
        write!(f, "{}", if self.negative { -value } else { value })
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used, clippy::expect_used)]
mod tests {
    use super::*;

    /// By the encoder of the crate `gdsii`.
    fn real(value: f64) -> Real8 {
        Real8::new(
            gdsii::float::GdsEightByteReal::try_from(value)
                .unwrap()
                .raw(),
        )
    }

    #[test]
    fn units_are_exact() {
        for (metres, pm) in [
            (1e-9, Some(1000)),
            (1e-10, Some(100)),
            (5e-10, Some(500)),
            (2.5e-10, Some(250)),
            (1e-12, Some(1)),
            (1e-6, Some(1_000_000)),
            (1.0, Some(1_000_000_000_000)),
            (1.0000000005e-9, Some(1000)),
            (1.00000001e-9, None),
            (1.5e-12, None),
            (1e-13, None),
            (2.0, None),
            (0.0, None),
            (-1e-9, None),
            (1e60, None),
        ] {
            assert_eq!(real(metres).trillionths(), pm, "{metres}");
        }
        // The bytes that every writer gives for 1 nm.
        let nanometre = [0x39, 0x44, 0xb8, 0x2f, 0xa0, 0x9b, 0x5a, 0x54];
        assert_eq!(Real8::new(nanometre).trillionths(), Some(1000));
    }

    #[test]
    fn integers_are_recognised() {
        for (value, integer) in [
            (0.0, Some(0)),
            (90.0, Some(90)),
            (-270.0, Some(-270)),
            (270.0000000000001, Some(270)),
            (89.9999999999, Some(90)),
            (89.9999, None),
            (45.5, None),
            (1e-20, Some(0)),
            (1e18, Some(1_000_000_000_000_000_000)),
            (1e70, None),
            (0.5, None),
        ] {
            assert_eq!(real(value).near_integer(9), integer, "{value}");
        }
    }

    #[test]
    fn any_bytes_are_some_number() {
        use rand::{Rng, SeedableRng};
        let mut random = rand_pcg::Pcg64::seed_from_u64(2);
        for _ in 0..20_000 {
            let real = Real8::new(random.random());
            let _ = (real.near_integer(10), real.trillionths(), real.to_string());
        }
    }
}
