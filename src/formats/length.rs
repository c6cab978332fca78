//! Lengths with their unit, exact in picometres.

use super::nearest::shown;
use super::rules::Problem;
use std::fmt;
use std::str::FromStr;

/// A length, 0 or more, exact in picometres.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord)]
pub struct Length {
    /// Picometres.
    pub pm: u64,
}

/// The units and their powers of ten in picometres; both code points of the Greek letter are in use.
const UNITS: [(&str, u32); 6] = [
    ("pm", 0),
    ("nm", 3),
    ("um", 6),
    ("\u{b5}m", 6),
    ("\u{3bc}m", 6),
    ("mm", 9),
];

impl Length {
    /// As from text, but a number without a unit is taken as nanometres: for command line options
    /// whose help says so.
    ///
    /// # Errors
    /// What is no length, or no whole number of picometres.
    pub fn parse_or_nm(text: &str) -> Result<Length, Problem> {
        let bare = text
            .bytes()
            .all(|byte| byte.is_ascii_digit() || byte == b'.');
        if bare && !text.is_empty() {
            return format!("{text} nm")
                .parse()
                .map_err(|_| Problem::NoLength(shown(text)));
        }
        text.parse()
    }
}

impl FromStr for Length {
    type Err = Problem;

    /// Reads `250 nm`, `0.25um`: a decimal number, blanks or none, one of pm, nm, um (or µm), mm.
    fn from_str(text: &str) -> Result<Length, Problem> {
        let no_length = || Problem::NoLength(shown(text));
        let trimmed = text.trim();
        let split = trimmed
            .find(|c: char| !c.is_ascii_digit() && c != '.')
            .ok_or_else(|| Problem::NoUnit(shown(text)))?;
        let (number, unit) = (&trimmed[..split], trimmed[split..].trim_start());
        let &(_, power) = UNITS
            .iter()
            .find(|(name, _)| *name == unit)
            .ok_or_else(no_length)?;
        let (whole, fraction) = number.split_once('.').unwrap_or((number, ""));
        if whole.is_empty() || fraction.contains('.') || number.ends_with('.') {
            return Err(no_length());
        }
        let fraction = fraction.trim_end_matches('0');
        if fraction.len() > power as usize {
            return Err(Problem::BelowPicometre(shown(text)));
        }
        let zeros = "0".repeat(power as usize - fraction.len());
        let pm = format!("{whole}{fraction}{zeros}").parse();
        pm.map(|pm| Length { pm }).map_err(|_| no_length())
    }
}

/// A coordinate, exact in picometres.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord)]
pub struct Coordinate {
    /// Picometres.
    pub pm: i64,
}

impl FromStr for Coordinate {
    type Err = Problem;

    /// Reads a length with a minus sign before it, or without one.
    fn from_str(text: &str) -> Result<Coordinate, Problem> {
        let trimmed = text.trim();
        let (size, sign) = match trimmed.strip_prefix('-') {
            Some(size) => (size, -1),
            None => (trimmed, 1),
        };
        // A blank behind the sign would be taken for one before the number.
        let begins = size.starts_with(|c: char| c.is_ascii_digit());
        let length = match size.parse::<Length>() {
            Ok(length) if begins => length,
            Err(problem @ Problem::BelowPicometre(_)) => return Err(problem),
            _ => return Err(Problem::NoCoordinate(shown(text))),
        };
        let pm = i64::try_from(length.pm);
        let pm = pm.map_err(|_| Problem::NoCoordinate(shown(text)))?;
        Ok(Coordinate { pm: sign * pm })
    }
}

impl fmt::Display for Coordinate {
    /// In nanometres, without needless digits.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let sign = if self.pm < 0 { "-" } else { "" };
        let size = Length {
            pm: self.pm.unsigned_abs(),
        };
        write!(f, "{sign}{size}")
    }
}

impl fmt::Display for Length {
    /// In nanometres, without needless digits.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (whole, rest) = (self.pm / 1000, self.pm % 1000);
        if rest == 0 {
            return write!(f, "{whole} nm");
        }
        let digits = format!("{rest:03}");
        write!(f, "{whole}.{} nm", digits.trim_end_matches('0'))
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used, clippy::expect_used)]
mod tests {
    use super::*;

    #[test]
    fn lengths_are_exact() {
        for (text, pm) in [
            ("250 nm", 250_000),
            ("0.25um", 250_000),
            ("0.25 \u{b5}m", 250_000),
            ("0.25 \u{3bc}m", 250_000),
            (" 1.50 mm ", 1_500_000_000),
            ("7pm", 7),
            ("0.001 nm", 1),
            ("0.1000 nm", 100),
            ("0 nm", 0),
        ] {
            assert_eq!(text.parse::<Length>().unwrap().pm, pm, "{text}");
        }
        assert_eq!(Length::parse_or_nm("250").unwrap().pm, 250_000);
        assert_eq!(Length::parse_or_nm("0.5").unwrap().pm, 500);
        assert_eq!(Length::parse_or_nm("0.5 um").unwrap().pm, 500_000);
    }

    #[test]
    fn what_is_no_length_is_refused() {
        for text in [
            "",
            "250",
            "nm",
            "-5 nm",
            "+5 nm",
            "1e3 nm",
            "5 in",
            "5 NM",
            ".5 nm",
            "5. nm",
            "1.2.3 nm",
            "0.0001 nm",
            "99999999999999999999 mm",
            "5 n m",
            "1 _nm",
        ] {
            assert!(text.parse::<Length>().is_err(), "{text}");
        }
        for text in ["", ".", "5.", "-5", "99999999999999999999"] {
            assert!(Length::parse_or_nm(text).is_err(), "{text}");
        }
    }

    #[test]
    fn coordinates_have_a_sign() {
        let pm = |text: &str| text.parse::<Coordinate>().map(|at| at.pm);
        assert_eq!(pm("-1.25 um"), Ok(-1_250_000));
        assert_eq!(pm(" 7nm "), Ok(7000));
        assert_eq!(pm("-0 nm"), Ok(0));
        assert_eq!(Coordinate { pm: -1_250_500 }.to_string(), "-1250.5 nm");
        for text in [
            "",
            "-",
            "- 5 nm",
            "--5 nm",
            "+5 nm",
            "5",
            "9999999999 mm",
            "-0.0001 nm",
        ] {
            assert!(pm(text).is_err(), "{text}");
        }
    }

    #[test]
    fn lengths_print_in_nanometres() {
        assert_eq!(Length { pm: 250_000 }.to_string(), "250 nm");
        assert_eq!(Length { pm: 250_050 }.to_string(), "250.05 nm");
        assert_eq!(Length { pm: 5 }.to_string(), "0.005 nm");
    }
}
