//! Lists of stitch candidates, in JSON or CSV: `stitch-list.md`.
//!
//! Reading remembers where each entry stands; database units are known later, and what is off the grid
//! is then named with its place.

use super::error::{FormatError, Position};
use super::json;
use super::length::Coordinate;
use super::rules::{Given, Problem, coordinate_on_grid};
use crate::geometry::{COORDINATE_LIMIT, Point};
use crate::layout::Listed;
use serde::Deserialize;
use serde::de::{MapAccess, Visitor};
use std::fmt;

/// The value of the key `format`.
pub const FORMAT: &str = "maskproof-stitches";

/// The header of a CSV file.
pub const HEADER: &str = "feature_x,feature_y,x,y";

const KEYS: [&str; 3] = ["format", "version", "stitches"];

/// A coordinate as it is given.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Place {
    /// In database units.
    Units(i32),
    /// With a unit.
    Length(Coordinate),
}

/// A list as it is given: for each stitch x and y of a point of its feature, then of one of its cut.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct StitchList {
    /// The stitches, in the order of the file.
    pub stitches: Vec<Given<[Place; 4]>>,
}

/// Reads a list. `name` is the file's name, for errors.
///
/// # Errors
/// Line and column of the first thing that is wrong.
pub fn read(bytes: &[u8], name: &str) -> Result<StitchList, FormatError> {
    if bytes.trim_ascii_start().starts_with(b"{") {
        return read_json(bytes, name);
    }
    let text = std::str::from_utf8(bytes).map_err(|error| {
        let before = &bytes[..error.valid_up_to()];
        let line = before.iter().filter(|&&byte| byte == b'\n').count() as u64 + 1;
        wrong(
            Position::line(name, line),
            "not UTF-8 text: a list is CSV or JSON".to_owned(),
        )
    })?;
    read_csv(text, name)
}

fn wrong(position: Position, what: String) -> FormatError {
    FormatError::new(position, Problem::List(what))
}

fn read_csv(text: &str, name: &str) -> Result<StitchList, FormatError> {
    let mut lines = (1u64..).zip(text.lines());
    match lines.next() {
        Some((_, header)) if header.trim_end() == HEADER => {}
        _ => {
            let what = format!("the first line must be the header {HEADER}");
            return Err(wrong(Position::column(name, 1, 1), what));
        }
    }
    let mut list = StitchList::default();
    for (line, row) in lines {
        if !row.trim().is_empty() {
            list.stitches.push(csv_row(row, name, line)?);
        }
    }
    Ok(list)
}

fn csv_row(row: &str, name: &str, line: u64) -> Result<Given<[Place; 4]>, FormatError> {
    let mut places = [Place::Units(0); 4];
    let mut column = 1;
    let mut found = 0;
    for field in row.split(',') {
        if let Some(place) = places.get_mut(found) {
            let blanks = field.len() - field.trim_start().len();
            let at = Position::column(name, line, column + blanks as u64);
            *place = parse(field.trim()).map_err(|problem| FormatError::new(at, problem))?;
        }
        column += field.chars().count() as u64 + 1;
        found += 1;
    }
    if found != places.len() {
        let what = format!("{found} fields: a stitch has 4, {HEADER}");
        return Err(wrong(Position::line(name, line), what));
    }
    Ok(Given {
        value: places,
        position: Position::line(name, line),
    })
}

/// Reads `-40` or `-0.04 um`.
fn parse(text: &str) -> Result<Place, Problem> {
    let digits = text.strip_prefix('-').unwrap_or(text);
    if digits.is_empty() || !digits.bytes().all(|byte| byte.is_ascii_digit()) {
        return text.parse().map(Place::Length);
    }
    let units = text.parse().ok().and_then(units);
    units.ok_or_else(|| Problem::List(too_large(text)))
}

fn units(number: i64) -> Option<Place> {
    let units = i32::try_from(number).ok()?;
    let fits = units.unsigned_abs() <= COORDINATE_LIMIT as u32;
    fits.then_some(Place::Units(units))
}

fn too_large(number: impl fmt::Display) -> String {
    format!("{number} is out of range: at most {COORDINATE_LIMIT} database units from 0")
}

impl<'de> Deserialize<'de> for Place {
    fn deserialize<D: serde::Deserializer<'de>>(deserializer: D) -> Result<Place, D::Error> {
        struct Either;
        impl Visitor<'_> for Either {
            type Value = Place;

            fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
                f.write_str(
                    "a coordinate such as \"-1.25 um\", or a whole number of database units",
                )
            }

            fn visit_i64<E: serde::de::Error>(self, number: i64) -> Result<Place, E> {
                units(number).ok_or_else(|| E::custom(too_large(number)))
            }

            fn visit_u64<E: serde::de::Error>(self, number: u64) -> Result<Place, E> {
                let signed = i64::try_from(number).ok().and_then(units);
                signed.ok_or_else(|| E::custom(too_large(number)))
            }

            fn visit_str<E: serde::de::Error>(self, text: &str) -> Result<Place, E> {
                let length = text.parse().map(Place::Length);
                length.map_err(|problem: Problem| E::custom(problem))
            }
        }
        deserializer.deserialize_any(Either)
    }
}

/// The members of a file.
struct Members(Vec<[Place; 4]>);

impl<'de> Deserialize<'de> for Members {
    fn deserialize<D: serde::Deserializer<'de>>(deserializer: D) -> Result<Members, D::Error> {
        struct Object;
        impl<'de> Visitor<'de> for Object {
            type Value = Members;

            fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
                f.write_str("an object: a list of stitches")
            }

            fn visit_map<M: MapAccess<'de>>(self, mut map: M) -> Result<Members, M::Error> {
                let (mut format, mut version, mut stitches) = (None::<String>, None, None);
                while let Some(key) = map.next_key::<String>()? {
                    match key.as_str() {
                        "format" => json::once(&mut map, &mut format, "format")?,
                        "version" => json::once(&mut map, &mut version, "version")?,
                        "stitches" => json::once(&mut map, &mut stitches, "stitches")?,
                        wrong => return Err(json::unknown_key(wrong, &KEYS)),
                    }
                }
                json::check_format::<M::Error>(format.as_deref(), version, FORMAT)?;
                json::required::<_, M::Error>(stitches, "stitches").map(Members)
            }
        }
        deserializer.deserialize_map(Object)
    }
}

fn read_json(bytes: &[u8], name: &str) -> Result<StitchList, FormatError> {
    let Members(stitches) = json::from_reader(bytes, name)?;
    let numbered = stitches.into_iter().enumerate();
    let entries = numbered.map(|(index, value)| Given {
        value,
        position: Position::file(&format!("{name}: stitches[{index}]")),
    });
    Ok(StitchList {
        stitches: entries.collect(),
    })
}

impl StitchList {
    /// The stitches on a grid, ascending.
    ///
    /// # Errors
    /// A coordinate that is off the grid or out of range, and a stitch listed twice.
    pub fn resolve(&self, unit_pm: u64) -> Result<Vec<Listed>, FormatError> {
        let mut found = Vec::with_capacity(self.stitches.len());
        for given in &self.stitches {
            let mut units = [0; 4];
            for (unit, place) in units.iter_mut().zip(given.value) {
                *unit = match place {
                    Place::Units(units) => units,
                    Place::Length(at) => {
                        coordinate_on_grid(at, unit_pm).map_err(|problem| given.wrong(problem))?
                    }
                };
            }
            let [fx, fy, x, y] = units;
            let listed = Listed {
                feature: Point { x: fx, y: fy },
                at: Point { x, y },
            };
            found.push((listed, given));
        }
        // Stable: of two equal ones, the later one in the file is wrong.
        found.sort_by_key(|(listed, _)| *listed);
        for two in found.windows(2) {
            if let [(one, first), (other, again)] = two
                && one == other
            {
                return Err(again.wrong(Problem::ListRepeated(first.position.to_string())));
            }
        }
        Ok(found.into_iter().map(|(listed, _)| listed).collect())
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;

    fn resolved(text: &str) -> Result<Vec<Listed>, String> {
        let list = read(text.as_bytes(), "s").map_err(|error| error.to_string())?;
        // Half a nanometre a unit: 0.1 um are 200 units.
        list.resolve(500).map_err(|error| error.to_string())
    }

    fn refused(text: &str) -> String {
        resolved(text).unwrap_err()
    }

    fn stitch(fx: i32, fy: i32, x: i32, y: i32) -> Listed {
        Listed {
            feature: Point { x: fx, y: fy },
            at: Point { x, y },
        }
    }

    fn example(kind: &str) -> String {
        let page = include_str!("stitch-list.md");
        let start = page.split(&format!("```{kind}\n")).nth(1).unwrap();
        start.split("```").next().unwrap().to_owned()
    }

    #[test]
    fn the_documented_examples_say_the_same() {
        let expected = vec![stitch(100, 50, 700, 50), stitch(200, 100, 800, 100)];
        assert_eq!(resolved(&example("csv")).unwrap(), expected);
        assert_eq!(resolved(&example("json")).unwrap(), expected);
    }

    #[test]
    fn csv_is_read_with_blanks_signs_and_line_ends() {
        let text = format!("{HEADER}\r\n -1 , 2nm,-0.5 nm,  4\r\n\r\n");
        assert_eq!(resolved(&text).unwrap(), [stitch(-1, 4, -1, 4)]);
        assert_eq!(resolved(HEADER).unwrap(), []);
    }

    #[test]
    fn csv_errors_name_line_and_column() {
        let row = |row: &str| refused(&format!("{HEADER}\n1,1,1,1\n{row}\n"));
        assert!(refused("x,y\n").starts_with("s:1:1: the first line must be the header feature_x"));
        assert!(refused("").starts_with("s:1:1: "));
        assert!(row("1,2,3").starts_with("s:3: 3 fields: a stitch has 4"));
        assert!(row("1,2,3,4,5").starts_with("s:3: 5 fields"));
        assert!(row("1, 2,x,4").starts_with("s:3:6: \"x\" is no coordinate"));
        assert!(row("1,2,3, 1.5").starts_with("s:3:8: \"1.5\" is no coordinate"));
        assert!(row("1,2,3,1073741825").contains("out of range"));
        assert!(row("1,2,3,99999999999999999999").contains("out of range"));
        assert!(row("1,2,3,0.2 nm").starts_with("s:3: coordinate 0.2 nm is no whole number"));
        assert!(row("1,2,3,999 mm").starts_with("s:3: coordinate 999000000 nm is out of range"));
        assert!(
            row("2,2,2,2\n1,1,1,1").starts_with("s:4: the same stitch as in s:2: list it once")
        );
        let bytes = [HEADER.as_bytes(), b"\n\xff,"].concat();
        let error = read(&bytes, "s").unwrap_err().to_string();
        assert!(error.starts_with("s:2: not UTF-8"), "{error}");
    }

    #[test]
    fn json_errors_name_their_place() {
        let with = |stitches: &str| {
            let head = r#"{"format":"maskproof-stitches","version":1"#;
            refused(&format!("{head},\n\"stitches\":{stitches}}}"))
        };
        assert!(
            with("[[1,2,3]]").starts_with("s:2:"),
            "{}",
            with("[[1,2,3]]")
        );
        assert!(with("[[1,2,3,4,5]]").starts_with("s:2:"));
        assert!(with("[[1,2,3,true]]").contains("a whole number of database units"));
        assert!(with("[[1,2,3,1.5]]").contains("a whole number of database units"));
        assert!(with("[[1,2,3,\"4\"]]").contains("is no coordinate"));
        assert!(with("[[1,2,3,-1073741825]]").contains("out of range"));
        assert!(with("[[1,2,3,\"0.2 nm\"]]").starts_with("s: stitches[0]: coordinate 0.2 nm"));
        assert!(with("[[1,2,3,4],[1,2,3,4]]").starts_with("s: stitches[1]: the same stitch"));
        assert!(with("[],\"stiches\":1").contains("did you mean `stitches`?"));
        assert!(refused("{}").contains("`format` is missing"));
        let other = r#"{"format":"maskproof-stitches","version":2,"stitches":[]}"#;
        assert!(refused(other).contains("version is 2"));
    }
}
