//! The values of options: each parser says what is wrong and what would be right. Ranges that a rules
//! file can break too are checked where both meet.

use std::time::Duration;

use crate::formats::length::Length;
use crate::formats::rules::{Output, parse_layer};
use crate::layout::LayerId;
use crate::pipeline::Format;

/// A number of masks or the price of a stitch.
pub fn count(text: &str) -> Result<u64, String> {
    text.parse()
        .map_err(|_| "a whole number is needed".to_owned())
}

/// A number counted from 1.
pub fn ordinal(text: &str) -> Result<usize, String> {
    text.parse()
        .ok()
        .filter(|&number| number >= 1)
        .ok_or_else(|| "a whole number from 1 on is needed".to_owned())
}

/// `101,102` or `67/101,67/102`: where the masks are drawn.
pub fn output(text: &str) -> Result<Output, String> {
    let parts = || text.split(',').map(str::trim);
    if let Ok(datatypes) = parts().map(str::parse).collect() {
        return Ok(Output::Datatypes(datatypes));
    }
    parts()
        .map(parse_layer)
        .collect::<Result<_, _>>()
        .map(Output::Layers)
        .map_err(|_| {
            "datatypes like 101,102 or layers like 67/101,67/102 are needed, numbers 0 to 65535"
                .to_owned()
        })
}

/// `66/44=30`: a layer and a distance from it.
pub fn keep_out(text: &str) -> Result<(LayerId, Length), String> {
    let (layer, distance) = text
        .split_once('=')
        .ok_or("a layer and a distance are needed, like 66/44=30")?;
    let layer = parse_layer(layer).map_err(|problem| problem.to_string())?;
    let distance = Length::parse_or_nm(distance).map_err(|problem| problem.to_string())?;
    Ok((layer, distance))
}

/// `67/21=1`: a layer and a mask.
pub fn fixed(text: &str) -> Result<(LayerId, u64), String> {
    let (layer, mask) = text
        .split_once('=')
        .ok_or("a layer and a mask are needed, like 67/21=1")?;
    let layer = parse_layer(layer).map_err(|problem| problem.to_string())?;
    Ok((layer, count(mask)?))
}

/// A format of other checkers.
pub fn format(text: &str) -> Result<Format, String> {
    let found = Format::ALL
        .into_iter()
        .find(|format| format.as_str() == text);
    found.ok_or_else(|| {
        let names = Format::ALL.map(Format::as_str);
        format!("one of {} is needed", names.join(", "))
    })
}

/// Seconds, fractions allowed, 0 too.
pub fn seconds(text: &str) -> Result<Duration, String> {
    text.parse()
        .ok()
        .and_then(|seconds| Duration::try_from_secs_f64(seconds).ok())
        .ok_or_else(|| "seconds are needed, 0 or more, like 90 or 0.5".to_owned())
}

/// More threads than any machine has; a limit so that a slip of the keyboard starts no million.
const MAX_THREADS: usize = 4096;

/// A number of threads.
pub fn threads(text: &str) -> Result<usize, String> {
    text.parse()
        .ok()
        .filter(|threads| (1..=MAX_THREADS).contains(threads))
        .ok_or_else(|| format!("the number of threads must be 1 to {MAX_THREADS}"))
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;

    #[test]
    fn outputs_are_datatypes_or_layers_not_both() {
        assert_eq!(output("7, 8").unwrap(), Output::Datatypes(vec![7, 8]));
        let own = LayerId {
            layer: 5,
            datatype: 6,
        };
        assert_eq!(output("5/6").unwrap(), Output::Layers(vec![own]));
        for text in ["", "7,", "7,5/6", "70000", "-1"] {
            assert!(output(text).is_err(), "{text}");
        }
    }

    #[test]
    fn layers_come_with_a_distance_or_a_mask() {
        let via = LayerId {
            layer: 66,
            datatype: 44,
        };
        assert_eq!(keep_out("66/44=30").unwrap(), (via, Length { pm: 30_000 }));
        assert_eq!(keep_out("66/44=0.5 um").unwrap().1.pm, 500_000);
        assert_eq!(fixed("66/44=2").unwrap(), (via, 2));
        for text in ["", "66/44", "66=3", "66/44=", "66/44=x", "66/44=-1"] {
            assert!(keep_out(text).is_err() && fixed(text).is_err(), "{text}");
        }
    }

    #[test]
    fn limits_are_seconds() {
        assert_eq!(seconds("0").unwrap(), Duration::ZERO);
        assert_eq!(seconds("1.5").unwrap(), Duration::from_millis(1500));
        for text in ["", "-1", "nan", "inf", "1e300", "5s"] {
            assert!(seconds(text).is_err(), "{text}");
        }
    }
}
