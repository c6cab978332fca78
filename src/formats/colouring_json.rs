//! Colourings of abstract instances: JSON, one mask a fragment.
//!
//! ```json
//! {"format":"maskproof-colouring","version":1,"masks":3,"colours":[1,2,3,1]}
//! ```
//!
//! Entry i is the mask of fragment i, 1 to K as people read masks; in memory masks are 0 to K-1.

use super::error::{FormatError, Position};
use super::json::{self, Problem};
use encodings::Mask;
use encodings::masks::MAX_MASKS;
use serde::Deserialize;
use serde::de::{MapAccess, Visitor};
use std::fmt;
use std::io::{self, Read, Write};

/// The value of the key `format`.
pub const FORMAT: &str = "maskproof-colouring";

const KEYS: [&str; 4] = ["format", "version", "masks", "colours"];

/// A colouring as a file holds it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Colouring {
    /// K, 1 to [`MAX_MASKS`].
    pub masks: u8,
    /// The mask of each fragment, 0 to K-1.
    pub colours: Vec<Mask>,
}

/// Reads a colouring. `name` is the file's name, for errors.
///
/// # Errors
/// Line and column of what is no JSON of this form, or the entry that is no mask. Whether it fits an
/// instance is asked of the instance (`Instance::check_legal`).
pub fn read(reader: impl Read, name: &str) -> Result<Colouring, FormatError> {
    let mut colouring: Colouring = json::from_reader(reader, name)?;
    let wrong = |problem| FormatError::new(Position::file(name), problem);
    let masks = colouring.masks;
    if masks == 0 || masks > MAX_MASKS {
        let message = format!("{masks} masks: 1 to {MAX_MASKS} are possible");
        return Err(wrong(Problem::Syntax(message)));
    }
    for (index, colour) in colouring.colours.iter_mut().enumerate() {
        if *colour == 0 || *colour > masks {
            let message = format!("no mask {colour}: masks are 1 to {masks}");
            return Err(wrong(Problem::entry("colours", index, message)));
        }
        *colour -= 1;
    }
    Ok(colouring)
}

/// Writes a colouring: the same one gives the same bytes.
///
/// # Errors
/// Those of the writer. It should be buffered.
pub fn write(masks: u8, colours: &[Mask], out: &mut impl Write) -> io::Result<()> {
    write!(
        out,
        "{{\"format\":\"{FORMAT}\",\"version\":1,\"masks\":{masks},\n\"colours\":["
    )?;
    for (i, colour) in colours.iter().enumerate() {
        let between = match i {
            0 => "",
            _ if i % 40 == 0 => ",\n",
            _ => ",",
        };
        write!(out, "{between}{}", u16::from(*colour) + 1)?;
    }
    writeln!(out, "]}}")
}

impl<'de> Deserialize<'de> for Colouring {
    fn deserialize<D: serde::Deserializer<'de>>(deserializer: D) -> Result<Colouring, D::Error> {
        struct Object;
        impl<'de> Visitor<'de> for Object {
            type Value = Colouring;
            fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
                write!(f, "an object with the keys of {FORMAT}")
            }
            fn visit_map<M: MapAccess<'de>>(self, mut map: M) -> Result<Colouring, M::Error> {
                let (mut format, mut version) = (None::<String>, None);
                let (mut masks, mut colours) = (None, None);
                while let Some(key) = map.next_key::<String>()? {
                    match key.as_str() {
                        "format" => json::once(&mut map, &mut format, &key)?,
                        "version" => json::once(&mut map, &mut version, &key)?,
                        "masks" => json::once(&mut map, &mut masks, &key)?,
                        "colours" => json::once(&mut map, &mut colours, &key)?,
                        _ => return Err(json::unknown_key(&key, &KEYS)),
                    }
                }
                json::check_format(format.as_deref(), version, FORMAT)?;
                Ok(Colouring {
                    masks: json::required(masks, "masks")?,
                    colours: json::required(colours, "colours")?,
                })
            }
        }
        deserializer.deserialize_map(Object)
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used, clippy::expect_used)]
mod tests {
    use super::*;

    #[test]
    fn what_is_written_is_read_again() {
        let colours: Vec<Mask> = (0..100).map(|i| i % 3).collect();
        let mut out = Vec::new();
        write(3, &colours, &mut out).unwrap();
        assert!(out.starts_with(b"{\"format\":\"maskproof-colouring\",\"version\":1,\"masks\":3,"));
        assert_eq!(
            read(&out[..], "c.json").unwrap(),
            Colouring { masks: 3, colours }
        );
    }

    #[test]
    fn wrong_files_are_refused() {
        let error = |text: &str| read(text.as_bytes(), "c.json").unwrap_err().to_string();
        let right = r#"{"format":"maskproof-colouring","version":1,"masks":2,"colours":[1,2]}"#;
        assert!(read(right.as_bytes(), "c.json").is_ok());
        assert!(error(&right.replace("[1,2]", "[1,3]")).contains("colours[1]: no mask 3"));
        assert!(error(&right.replace("[1,2]", "[0,2]")).contains("colours[0]: no mask 0"));
        assert!(error(&right.replace("colours", "colors")).contains("did you mean `colours`?"));
        assert!(error(&right.replace(":2,", ":9,")).contains("1 to 8 are possible"));
        assert!(error(&right.replace("version\":1", "version\":3")).contains("version is 3"));
        assert!(error("[]").contains("expected an object"));
    }
}
