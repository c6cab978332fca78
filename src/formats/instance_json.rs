//! The project's own format for abstract instances: JSON, documented in `instance-json.md`.
//!
//! It is read as a stream, in any order of its keys, and written as a stream in one order, so that
//! equal instances are equal files.

use super::error::{FormatError, Position};
use super::json::{self, Problem};
use encodings::masks::MAX_MASKS;
use encodings::{Instance, InstanceBuilder, MaskSet, Stitch, Tie};
use serde::Deserialize;
use serde::de::{DeserializeSeed, Error as _, MapAccess, SeqAccess, Visitor};
use std::fmt;
use std::io::{self, Read, Write};

/// The value of the key `format`.
pub const FORMAT: &str = "maskproof-instance";

/// The most fragments that are read.
pub const MAX_FRAGMENTS: u64 = 1 << 28;

const KEYS: [&str; 12] = [
    "format",
    "version",
    "masks",
    "features",
    "areas",
    "allowed",
    "pairs",
    "stitches",
    "self_spacings",
    "same",
    "different",
    "at_most",
];

/// Reads an instance. `name` is the file's name, for errors; `masks`, when given, takes the place of
/// the file's K.
///
/// # Errors
/// Line and column of what is no JSON of this form, else the list entry that breaks an invariant of
/// the instance. Memory stays in proportion to the file: a feature of n fragments needs n - 1
/// stitches, which is checked before fragments are made, and at most [`MAX_FRAGMENTS`] are.
pub fn read(reader: impl Read, name: &str, masks: Option<u8>) -> Result<Instance, FormatError> {
    let raw: Raw = json::from_reader(reader, name)?;
    let at_file = || Position::file(name);
    let masks = raw
        .masks(masks)
        .map_err(|problem| FormatError::new(at_file(), problem))?;
    let builder = raw
        .into_builder(masks)
        .map_err(|problem| FormatError::new(at_file(), problem))?;
    builder
        .build()
        .map_err(|error| FormatError::new(at_file(), error))
}

/// The file as it stands, its counts not yet believed.
#[derive(Default)]
struct Raw {
    masks: u8,
    features: Vec<u32>,
    areas: Option<Vec<u64>>,
    allowed: Option<Vec<(u32, Vec<u8>)>>,
    pairs: Pairs,
    stitches: Vec<(u32, u32, u32)>,
    self_spacings: Vec<[u32; 2]>,
    same: Vec<[u32; 2]>,
    different: Vec<[u32; 2]>,
    at_most: Vec<AtMost>,
}

/// How many stitch edges may be stitches, and these: two fragments and how often each counts.
type AtMost = (u32, Vec<(u32, u32, u32)>);

impl Raw {
    fn masks(&self, asked: Option<u8>) -> Result<u8, Problem> {
        match (asked, &self.allowed) {
            (Some(asked), Some(_)) if asked != self.masks => Err(Problem::MasksFixed {
                given: self.masks,
                asked,
            }),
            _ => Ok(asked.unwrap_or(self.masks)),
        }
    }

    fn into_builder(self, masks: u8) -> Result<InstanceBuilder, Problem> {
        let fragments = self.check_features()?;
        let mut builder = InstanceBuilder::new(masks);
        for &count in &self.features {
            builder.feature(count);
        }
        self.add_areas(&mut builder, fragments)?;
        self.add_allowed(&mut builder, masks, fragments)?;
        for edges in self.pairs.iter() {
            builder.pair(edges.iter().copied());
        }
        for &(a, b, weight) in &self.stitches {
            builder.stitch(a, b, weight);
        }
        for &[a, b] in &self.self_spacings {
            builder.self_spacing(a, b);
        }
        self.add_ties(&mut builder);
        Ok(builder)
    }

    fn add_ties(self, builder: &mut InstanceBuilder) {
        let same = self.same.into_iter().map(Tie::Same);
        let different = self.different.into_iter().map(Tie::Different);
        let counted = self.at_most.into_iter().map(|(most, edges)| Tie::AtMost {
            most,
            stitches: (edges.into_iter())
                .map(|(a, b, weight)| Stitch { a, b, weight })
                .collect(),
        });
        for tie in same.chain(different).chain(counted) {
            builder.tie(tie);
        }
    }

    /// The number of fragments, once the stitches listed can justify it.
    fn check_features(&self) -> Result<u64, Problem> {
        let (mut fragments, mut joints) = (0u64, 0u64);
        for (index, &count) in self.features.iter().enumerate() {
            if count == 0 {
                let message = "no fragments: every feature needs at least one";
                return Err(Problem::entry("features", index, message));
            }
            fragments += u64::from(count);
            joints += u64::from(count - 1);
            if fragments > MAX_FRAGMENTS {
                let message =
                    format!("more than {MAX_FRAGMENTS} fragments so far: at most these are read");
                return Err(Problem::entry("features", index, message));
            }
            if joints > self.stitches.len() as u64 {
                let message = format!(
                    "{joints} or more stitches are needed to join the fragments of the features so \
                     far, but only {} are listed",
                    self.stitches.len()
                );
                return Err(Problem::entry("features", index, message));
            }
        }
        Ok(fragments)
    }

    fn add_areas(&self, builder: &mut InstanceBuilder, fragments: u64) -> Result<(), Problem> {
        let Some(areas) = &self.areas else {
            return Ok(());
        };
        if areas.len() as u64 != fragments {
            let message = format!(
                "{} areas for {fragments} fragments: list one each",
                areas.len()
            );
            return Err(Problem::entry(
                "areas",
                areas.len().saturating_sub(1),
                message,
            ));
        }
        for (fragment, &area) in areas.iter().enumerate() {
            builder.area(fragment as u32, area);
        }
        Ok(())
    }

    fn add_allowed(
        &self,
        builder: &mut InstanceBuilder,
        masks: u8,
        fragments: u64,
    ) -> Result<(), Problem> {
        let allowed = self.allowed.as_deref().unwrap_or_default();
        let mut seen = rustc_hash::FxHashSet::default();
        for (index, (fragment, list)) in allowed.iter().enumerate() {
            let wrong = |message: String| Err(Problem::entry("allowed", index, message));
            if u64::from(*fragment) >= fragments {
                return wrong(format!(
                    "no fragment {fragment}: there are {fragments}, from 0"
                ));
            }
            if !seen.insert(*fragment) {
                return wrong(format!("fragment {fragment} is listed twice"));
            }
            if list.is_empty() {
                return wrong(format!(
                    "fragment {fragment} may take no mask: list at least one"
                ));
            }
            if let Some(mask) = list.iter().find(|&&mask| mask == 0 || mask > masks) {
                return wrong(format!("no mask {mask}: masks are 1 to {masks}"));
            }
            let bits = list.iter().fold(0, |bits, mask| bits | 1u8 << (mask - 1));
            builder.allow(*fragment, MaskSet::from_bits(bits));
        }
        Ok(())
    }
}

impl<'de> Deserialize<'de> for Raw {
    fn deserialize<D: serde::Deserializer<'de>>(deserializer: D) -> Result<Raw, D::Error> {
        deserializer.deserialize_map(RawVisitor)
    }
}

struct RawVisitor;

impl<'de> Visitor<'de> for RawVisitor {
    type Value = Raw;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "an object with the keys of {FORMAT}")
    }

    fn visit_map<M: MapAccess<'de>>(self, mut map: M) -> Result<Raw, M::Error> {
        let (mut format, mut version, mut masks) = (None::<String>, None, None);
        let (mut features, mut areas, mut allowed) = (None, None, None);
        let (mut pairs, mut stitches, mut self_spacings) = (None, None, None);
        let (mut same, mut different, mut at_most) = (None, None, None);
        while let Some(key) = map.next_key::<String>()? {
            let map = &mut map;
            match key.as_str() {
                "format" => once_checked(map, &mut format, &key, |format| {
                    json::check_format(Some(format), Some(1), FORMAT)
                })?,
                "version" => once_checked(map, &mut version, &key, |&version| {
                    json::check_format(Some(FORMAT), Some(version), FORMAT)
                })?,
                "masks" => once_checked(map, &mut masks, &key, |&masks| check_masks(masks))?,
                "features" => json::once(map, &mut features, &key)?,
                "areas" => json::once(map, &mut areas, &key)?,
                "allowed" => json::once(map, &mut allowed, &key)?,
                "pairs" => json::once(map, &mut pairs, &key)?,
                "stitches" => json::once(map, &mut stitches, &key)?,
                "self_spacings" => json::once(map, &mut self_spacings, &key)?,
                "same" => json::once(map, &mut same, &key)?,
                "different" => json::once(map, &mut different, &key)?,
                "at_most" => json::once(map, &mut at_most, &key)?,
                _ => return Err(json::unknown_key(&key, &KEYS)),
            }
        }
        json::check_format(format.as_deref(), version, FORMAT)?;
        Ok(Raw {
            masks: json::required(masks, "masks")? as u8,
            features: json::required(features, "features")?,
            areas,
            allowed,
            pairs: json::required(pairs, "pairs")?,
            stitches: stitches.unwrap_or_default(),
            self_spacings: self_spacings.unwrap_or_default(),
            same: same.unwrap_or_default(),
            different: different.unwrap_or_default(),
            at_most: at_most.unwrap_or_default(),
        })
    }
}

/// As [`json::once`], with the value checked where it stands, so that its line is in the error.
fn once_checked<'de, M: MapAccess<'de>, T: Deserialize<'de>>(
    map: &mut M,
    slot: &mut Option<T>,
    key: &str,
    check: impl Fn(&T) -> Result<(), M::Error>,
) -> Result<(), M::Error> {
    json::once(map, slot, key)?;
    slot.as_ref().map_or(Ok(()), check)
}

fn check_masks<E: serde::de::Error>(masks: u64) -> Result<(), E> {
    if masks == 0 || masks > u64::from(MAX_MASKS) {
        return Err(E::custom(format!(
            "{masks} masks: 1 to {MAX_MASKS} are possible"
        )));
    }
    Ok(())
}

/// The conflict pairs, in two flat lists: a list of its own for each of a million pairs would cost
/// more than its content.
#[derive(Default)]
struct Pairs {
    edges: Vec<[u32; 2]>,
    end: Vec<usize>,
}

impl Pairs {
    fn iter(&self) -> impl Iterator<Item = &[[u32; 2]]> {
        let starts = std::iter::once(0).chain(self.end.iter().copied());
        starts
            .zip(&self.end)
            .map(|(start, &end)| &self.edges[start..end])
    }
}

impl<'de> Deserialize<'de> for Pairs {
    fn deserialize<D: serde::Deserializer<'de>>(deserializer: D) -> Result<Pairs, D::Error> {
        struct AllPairs;
        impl<'de> Visitor<'de> for AllPairs {
            type Value = Pairs;
            fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
                f.write_str("a list of conflict pairs, each a list of fragment edges [a, b]")
            }
            fn visit_seq<S: SeqAccess<'de>>(self, mut list: S) -> Result<Pairs, S::Error> {
                let mut pairs = Pairs::default();
                while list.next_element_seed(OnePair(&mut pairs))?.is_some() {}
                Ok(pairs)
            }
        }
        deserializer.deserialize_seq(AllPairs)
    }
}

struct OnePair<'a>(&'a mut Pairs);

impl<'de> DeserializeSeed<'de> for OnePair<'_> {
    type Value = ();
    fn deserialize<D: serde::Deserializer<'de>>(self, deserializer: D) -> Result<(), D::Error> {
        deserializer.deserialize_seq(self)
    }
}

impl<'de> Visitor<'de> for OnePair<'_> {
    type Value = ();
    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a list of fragment edges [a, b]")
    }
    fn visit_seq<S: SeqAccess<'de>>(self, mut list: S) -> Result<(), S::Error> {
        let start = self.0.edges.len();
        while let Some(edge) = list.next_element::<[u32; 2]>()? {
            self.0.edges.push(edge);
        }
        if self.0.edges.len() == start {
            return Err(S::Error::custom(
                "a conflict pair needs at least one fragment edge",
            ));
        }
        self.0.end.push(self.0.edges.len());
        Ok(())
    }
}

/// Writes an instance, one list entry a line: the same instance gives the same bytes. Lists that
/// say nothing (areas all 1, no exception of masks, no stitch, no self-spacing) are left out.
///
/// # Errors
/// Those of the writer. It should be buffered.
pub fn write(instance: &Instance, out: &mut impl Write) -> io::Result<()> {
    let fragments = 0..instance.fragment_count() as u32;
    writeln!(
        out,
        "{{\"format\":\"{FORMAT}\",\"version\":1,\"masks\":{},",
        instance.masks()
    )?;
    let features = (0..instance.feature_count() as u32).map(|f| instance.fragments_of(f).len());
    write!(out, "\"features\":[")?;
    numbers(out, features)?;
    write!(out, "]")?;
    if fragments.clone().any(|f| instance.area(f) != 1) {
        write!(out, ",\n\"areas\":[")?;
        numbers(out, fragments.clone().map(|f| instance.area(f)))?;
        write!(out, "]")?;
    }
    let all = MaskSet::all(instance.masks());
    let exceptions = fragments.filter(|&f| instance.allowed(f) != all);
    list(out, "allowed", false, exceptions, |out, f| {
        write!(out, "[{f},[")?;
        numbers(out, instance.allowed(f).iter().map(|mask| mask + 1))?;
        write!(out, "]]")
    })?;
    list(out, "pairs", true, instance.pairs(), |out, edges| {
        write!(out, "[")?;
        for (i, [a, b]) in edges.iter().enumerate() {
            write!(out, "{}[{a},{b}]", if i == 0 { "" } else { "," })?;
        }
        write!(out, "]")
    })?;
    list(
        out,
        "stitches",
        false,
        instance.stitches(),
        |out, stitch| write!(out, "[{},{},{}]", stitch.a, stitch.b, stitch.weight),
    )?;
    list(
        out,
        "self_spacings",
        false,
        instance.self_spacings(),
        |out, [a, b]| write!(out, "[{a},{b}]"),
    )?;
    write_ties(instance, out)?;
    writeln!(out, "}}")
}

fn write_ties(instance: &Instance, out: &mut impl Write) -> io::Result<()> {
    let ties = instance.ties().iter();
    let same = ties.clone().filter_map(|tie| match tie {
        Tie::Same(ends) => Some(ends),
        _ => None,
    });
    let different = ties.clone().filter_map(|tie| match tie {
        Tie::Different(ends) => Some(ends),
        _ => None,
    });
    let counted = ties.filter_map(|tie| match tie {
        Tie::AtMost { most, stitches } => Some((most, stitches)),
        _ => None,
    });
    list(out, "same", false, same, |out, [a, b]| {
        write!(out, "[{a},{b}]")
    })?;
    list(out, "different", false, different, |out, [a, b]| {
        write!(out, "[{a},{b}]")
    })?;
    list(out, "at_most", false, counted, |out, (most, stitches)| {
        write!(out, "[{most},[")?;
        for (i, Stitch { a, b, weight }) in stitches.iter().enumerate() {
            write!(out, "{}[{a},{b},{weight}]", if i == 0 { "" } else { "," })?;
        }
        write!(out, "]]")
    })
}

/// Numbers with commas between them, twenty a line.
fn numbers<T: fmt::Display>(
    out: &mut impl Write,
    numbers: impl Iterator<Item = T>,
) -> io::Result<()> {
    for (i, number) in numbers.enumerate() {
        let between = match i {
            0 => "",
            _ if i % 20 == 0 => ",\n",
            _ => ",",
        };
        write!(out, "{between}{number}")?;
    }
    Ok(())
}

/// A key with a list, an entry a line; left out when it is empty and not `required`.
fn list<W: Write, T>(
    out: &mut W,
    key: &str,
    required: bool,
    entries: impl IntoIterator<Item = T>,
    entry: impl Fn(&mut W, T) -> io::Result<()>,
) -> io::Result<()> {
    let mut entries = entries.into_iter().peekable();
    if entries.peek().is_none() && !required {
        return Ok(());
    }
    write!(out, ",\n\"{key}\":[")?;
    for (i, value) in entries.enumerate() {
        write!(out, "{}", if i == 0 { "\n" } else { ",\n" })?;
        entry(out, value)?;
    }
    write!(out, "]")
}

#[cfg(test)]
#[path = "instance_json_tests.rs"]
mod tests;
