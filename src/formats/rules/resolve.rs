//! Rules on the grid of a layout.

use super::{Given, MAX_WEIGHT, Problem, RawRules, missing};
use crate::formats::FormatError;
use crate::formats::gdsii::Label;
use crate::formats::length::{Coordinate, Length};
use crate::formats::stitch_list::StitchList;
use crate::geometry::{COORDINATE_LIMIT, Point};
use crate::layout::{KeepOut, Listed, Policy, Rules, StitchRules};

/// What rules are resolved with.
#[derive(Clone, Copy, Debug, Default)]
pub struct Sources<'a> {
    /// One database unit of the layout, in picometres.
    pub unit_pm: u64,
    /// The labels of the layout on the layers of labels.
    pub labels: &'a [Label],
    /// The list of stitches, where one is named and the policy reads it.
    pub list: Option<&'a StitchList>,
}

impl Sources<'_> {
    /// A grid alone, its unit in picometres.
    pub fn grid(unit_pm: u64) -> Sources<'static> {
        Sources {
            unit_pm,
            ..Sources::default()
        }
    }
}

impl RawRules {
    /// The rules on the grid of a layout. Stitch rules that are not given: no stitches; overlap, fragment
    /// length and corner keep-out 0; weight 1.
    ///
    /// # Errors
    /// What is missing, off the grid or out of range, and where it was given.
    pub fn resolve(&self, sources: &Sources<'_>) -> Result<Rules, FormatError> {
        let unit_pm = sources.unit_pm;
        let spacing = self.spacing.as_ref().ok_or_else(|| {
            missing(
                "same-mask spacing",
                "add --spacing, or `spacing = \"... nm\"` to the rules",
            )
        })?;
        let layers = self.layers()?;
        Ok(Rules {
            layer: layers.layer,
            masks: self.required_masks()?,
            spacing: positive(spacing, "spacing", unit_pm)?,
            spacings: self.spacings.resolve(spacing, unit_pm)?,
            stitch: self.stitch(sources)?,
            hand: self
                .hand
                .resolve(layers.fixed, self.required_masks()?, sources)?,
        })
    }

    fn stitch(&self, sources: &Sources<'_>) -> Result<StitchRules, FormatError> {
        let grid = |given: &Option<Given<Length>>, rule| match given {
            Some(given) => on_grid(given, rule, sources.unit_pm),
            None => Ok(0),
        };
        let overlap = grid(&self.overlap, "stitch overlap")?;
        if let Some(given) = self.overlap.as_ref().filter(|_| overlap % 2 != 0) {
            return Err(given.wrong(Problem::OddOverlap(given.value)));
        }
        let keep_outs = self.keep_outs.iter().map(|given| {
            let distance = &given.value.distance;
            Ok(KeepOut {
                layer: given.value.layer,
                distance: on_grid(distance, "keep-out distance", sources.unit_pm)?,
            })
        });
        Ok(StitchRules {
            policy: self.policy(),
            overlap,
            fragment_length: grid(&self.fragment_length, "fragment length")?,
            corner: grid(&self.corner, "corner keep-out")?,
            weight: self.weight()?,
            keep_outs: keep_outs.collect::<Result<_, FormatError>>()?,
            most_per_feature: self.most_per_feature()?,
            listed: self.listed(sources)?,
        })
    }

    fn policy(&self) -> Policy {
        self.policy
            .as_ref()
            .map_or(Policy::None, |policy| policy.value)
    }

    /// Whether the list of stitches is to be read.
    pub fn reads_list(&self) -> bool {
        self.policy() == Policy::Listed
    }

    fn listed(&self, sources: &Sources<'_>) -> Result<Vec<Listed>, FormatError> {
        match (&self.list, self.reads_list(), sources.list) {
            // A list in a file of rules waits for its policy; one on the command line is meant now.
            (Some(list), false, _) if list.position.command_line => {
                Err(list.wrong(Problem::IdleList))
            }
            (_, false, _) => Ok(Vec::new()),
            (_, true, Some(list)) => list.resolve(sources.unit_pm),
            (_, true, None) => {
                let position = self.policy.as_ref().map(|policy| policy.position.clone());
                Err(FormatError::new(
                    position.unwrap_or_default(),
                    Problem::NoList,
                ))
            }
        }
    }

    fn most_per_feature(&self) -> Result<Option<u32>, FormatError> {
        let Some(given) = &self.most_per_feature else {
            return Ok(None);
        };
        match u32::try_from(given.value) {
            Ok(most @ 1..) => Ok(Some(most)),
            _ => Err(given.wrong(Problem::MostPerFeature(given.value))),
        }
    }

    fn weight(&self) -> Result<u32, FormatError> {
        match &self.weight {
            None => Ok(1),
            Some(given) => match u32::try_from(given.value) {
                Ok(weight @ 1..=MAX_WEIGHT) => Ok(weight),
                _ => Err(given.wrong(Problem::Weight(given.value))),
            },
        }
    }
}

/// A length in database units.
pub(super) fn on_grid(
    given: &Given<Length>,
    rule: &'static str,
    unit_pm: u64,
) -> Result<i32, FormatError> {
    let (length, unit) = (given.value, Length { pm: unit_pm });
    if unit_pm == 0 || length.pm % unit_pm != 0 {
        return Err(given.wrong(Problem::OffGrid { rule, length, unit }));
    }
    match i32::try_from(length.pm / unit_pm) {
        Ok(units) if units <= COORDINATE_LIMIT => Ok(units),
        _ => {
            let limit = limit(unit_pm);
            Err(given.wrong(Problem::TooLong {
                rule,
                length,
                limit,
            }))
        }
    }
}

/// The same for a length that must not be 0.
pub(super) fn positive(
    given: &Given<Length>,
    rule: &'static str,
    unit_pm: u64,
) -> Result<i32, FormatError> {
    match on_grid(given, rule, unit_pm)? {
        0 => Err(given.wrong(Problem::Zero(rule))),
        units => Ok(units),
    }
}

fn limit(unit_pm: u64) -> Length {
    Length {
        pm: unit_pm.saturating_mul(COORDINATE_LIMIT as u64),
    }
}

/// A coordinate in database units.
pub(in crate::formats) fn coordinate_on_grid(at: Coordinate, unit_pm: u64) -> Result<i32, Problem> {
    let unit = i64::try_from(unit_pm).unwrap_or(i64::MAX);
    if unit == 0 || at.pm % unit != 0 {
        let unit = Length { pm: unit_pm };
        return Err(Problem::CoordinateOffGrid { at, unit });
    }
    match i32::try_from(at.pm / unit) {
        Ok(units) if units.unsigned_abs() <= COORDINATE_LIMIT as u32 => Ok(units),
        _ => Err(Problem::CoordinateTooLarge {
            at,
            limit: limit(unit_pm),
        }),
    }
}

/// A point in database units.
pub(super) fn point_on_grid(
    given: &Given<[Coordinate; 2]>,
    unit_pm: u64,
) -> Result<Point, FormatError> {
    let units = |at| coordinate_on_grid(at, unit_pm).map_err(|problem| given.wrong(problem));
    let [x, y] = given.value;
    Ok(Point {
        x: units(x)?,
        y: units(y)?,
    })
}
