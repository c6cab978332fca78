//! Lengths for people: database units as exact decimal micrometres, as layout viewers show them.

use std::fmt;

use serde::{Serialize, Serializer};
use serde_json::value::RawValue;

/// A length or coordinate, shown in micrometres without rounding.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Micrometres {
    picometres: i128,
}

impl Micrometres {
    /// The length of `units` database units of `unit_pm` picometres each.
    pub fn new(units: i32, unit_pm: u64) -> Micrometres {
        Micrometres {
            picometres: i128::from(units) * i128::from(unit_pm),
        }
    }
}

const PICOMETRES: u128 = 1_000_000;

impl fmt::Display for Micrometres {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let size = self.picometres.unsigned_abs();
        let sign = if self.picometres < 0 { "-" } else { "" };
        let (whole, rest) = (size / PICOMETRES, size % PICOMETRES);
        if rest == 0 {
            return write!(f, "{sign}{whole}");
        }
        let digits = format!("{rest:06}");
        write!(f, "{sign}{whole}.{}", digits.trim_end_matches('0'))
    }
}

impl Serialize for Micrometres {
    /// A JSON number with exactly the digits that [`fmt::Display`] gives.
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        RawValue::from_string(self.to_string())
            .map_err(serde::ser::Error::custom)?
            .serialize(serializer)
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;

    #[test]
    fn decimals_are_exact() {
        let shown = |units, unit_pm| Micrometres::new(units, unit_pm).to_string();
        assert_eq!(shown(0, 1000), "0");
        assert_eq!(shown(170, 1000), "0.17");
        assert_eq!(shown(-12_005, 1000), "-12.005");
        assert_eq!(shown(-1, 1000), "-0.001");
        assert_eq!(shown(1 << 30, 500), "536870.912");
        assert_eq!(shown(3, 1), "0.000003");
        assert_eq!(shown(2, 1_000_000), "2");
    }

    #[test]
    fn json_keeps_every_digit() {
        let text = serde_json::to_string(&[Micrometres::new(-340_005, 500)]).unwrap();
        assert_eq!(text, "[-170.0025]");
    }
}
