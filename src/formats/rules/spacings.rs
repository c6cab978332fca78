//! The spacings that depend on what faces what.

use super::resolve::{on_grid, positive};
use super::{Given, Problem, first_given, place};
use crate::formats::error::{FormatError, Position};
use crate::formats::length::Length;
use crate::formats::nearest::shown;
use crate::layout::{Metric, Spacings, WideSpacing};

/// A row of the spacings of wide features.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RawWide {
    /// The least width.
    pub width: Given<Length>,
    /// The least length over which the two face each other.
    pub run_length: Given<Length>,
    /// The spacing then.
    pub spacing: Given<Length>,
}

/// Spacings as given, each of them or none.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct RawSpacings {
    /// How distances are taken.
    pub metric: Option<Given<Metric>>,
    /// How short a line end is.
    pub end_length: Option<Given<Length>>,
    /// Between two sides.
    pub side_to_side: Option<Given<Length>>,
    /// Between a side and a line end.
    pub side_to_end: Option<Given<Length>>,
    /// Between two line ends.
    pub end_to_end: Option<Given<Length>>,
    /// Between two convex corners.
    pub corner_to_corner: Option<Given<Length>>,
    /// Between wide features.
    pub wide: Vec<Given<RawWide>>,
    /// Between any two features.
    pub any_mask: Option<Given<Length>>,
}

impl RawSpacings {
    pub(super) fn overridden_by(self, other: RawSpacings) -> RawSpacings {
        RawSpacings {
            metric: other.metric.or(self.metric),
            end_length: other.end_length.or(self.end_length),
            side_to_side: other.side_to_side.or(self.side_to_side),
            side_to_end: other.side_to_end.or(self.side_to_end),
            end_to_end: other.end_to_end.or(self.end_to_end),
            corner_to_corner: other.corner_to_corner.or(self.corner_to_corner),
            wide: first_given(other.wide, self.wide),
            any_mask: other.any_mask.or(self.any_mask),
        }
    }

    /// Where the first of them is given.
    pub(super) fn first(&self) -> Option<Position> {
        let lengths = [
            &self.end_length,
            &self.side_to_side,
            &self.side_to_end,
            &self.end_to_end,
            &self.corner_to_corner,
            &self.any_mask,
        ];
        let metric = place(&self.metric);
        let wide = || self.wide.first().map(|row| row.position.clone());
        metric
            .or_else(|| lengths.into_iter().find_map(place))
            .or_else(wide)
    }

    /// On the grid, beside the plain `spacing`.
    pub(super) fn resolve(
        &self,
        spacing: &Given<Length>,
        unit_pm: u64,
    ) -> Result<Spacings, FormatError> {
        let kind = |given: &Option<Given<Length>>, rule| {
            let given = given.as_ref();
            given
                .map(|given| positive(given, rule, unit_pm))
                .transpose()
        };
        let length = |given: &Option<Given<Length>>, rule| match given {
            Some(given) => on_grid(given, rule, unit_pm),
            None => Ok(0),
        };
        let spacings = Spacings {
            metric: self.metric.as_ref().map_or(Metric::default(), |m| m.value),
            end_length: length(&self.end_length, "end length")?,
            side_to_side: kind(&self.side_to_side, "side-to-side spacing")?,
            side_to_end: kind(&self.side_to_end, "side-to-end spacing")?,
            end_to_end: kind(&self.end_to_end, "end-to-end spacing")?,
            corner_to_corner: kind(&self.corner_to_corner, "corner-to-corner spacing")?,
            wide: self.wide(unit_pm)?,
            any_mask: length(&self.any_mask, "any-mask spacing")?,
        };
        self.check_ends(&spacings)?;
        self.check_any_mask(spacing)?;
        Ok(spacings)
    }

    /// What a line end is must be said where something depends on it.
    fn check_ends(&self, spacings: &Spacings) -> Result<(), FormatError> {
        let of_ends = [
            (&self.side_to_end, "side_to_end"),
            (&self.end_to_end, "end_to_end"),
        ];
        for (given, key) in of_ends {
            if let Some(given) = given.as_ref().filter(|_| spacings.end_length == 0) {
                return Err(given.wrong(Problem::NoEndLength(key)));
            }
        }
        Ok(())
    }

    /// Features closer than the any-mask spacing are closer than any same-mask spacing too.
    fn check_any_mask(&self, spacing: &Given<Length>) -> Result<(), FormatError> {
        let Some(any) = &self.any_mask else {
            return Ok(());
        };
        let kinds = [
            (Some(spacing), "spacing"),
            (self.side_to_side.as_ref(), "side_to_side"),
            (self.side_to_end.as_ref(), "side_to_end"),
            (self.end_to_end.as_ref(), "end_to_end"),
            (self.corner_to_corner.as_ref(), "corner_to_corner"),
        ];
        let wide = self.wide.iter();
        let wide = wide.map(|row| (Some(&row.value.spacing), "the spacing of wide features"));
        let all = kinds.into_iter().chain(wide);
        let least = all
            .filter_map(|(given, rule)| given.map(|given| (given.value, rule)))
            .min_by_key(|&(length, _)| length);
        match least {
            Some((least, rule)) if any.value >= least && any.value.pm > 0 => {
                Err(any.wrong(Problem::AnyMask {
                    any: any.value,
                    rule,
                    least,
                }))
            }
            _ => Ok(()),
        }
    }

    /// The rows of wide features, ascending.
    fn wide(&self, unit_pm: u64) -> Result<Vec<WideSpacing>, FormatError> {
        let mut rows = Vec::with_capacity(self.wide.len());
        for row in &self.wide {
            let RawWide {
                width,
                run_length,
                spacing,
            } = &row.value;
            let wide = WideSpacing {
                width: positive(width, "width of wide features", unit_pm)?,
                run_length: positive(run_length, "run length of wide features", unit_pm)?,
                spacing: positive(spacing, "spacing of wide features", unit_pm)?,
            };
            rows.push((wide, row));
        }
        // Stable: of two equal rows, the later one in the file is named.
        rows.sort_by_key(|(wide, _)| (wide.width, wide.run_length));
        for two in rows.windows(2) {
            if let [(a, _), (b, again)] = two
                && (a.width, a.run_length) == (b.width, b.run_length)
            {
                return Err(again.wrong(Problem::WideRepeated {
                    width: again.value.width.value,
                    run_length: again.value.run_length.value,
                }));
            }
        }
        Ok(rows.into_iter().map(|(wide, _)| wide).collect())
    }
}

/// Reads a metric by its name.
///
/// # Errors
/// What is no metric.
pub fn parse_metric(text: &str) -> Result<Metric, Problem> {
    match text {
        "euclidean" => Ok(Metric::Euclidean),
        "square" => Ok(Metric::Square),
        _ => Err(Problem::NoMetric(shown(text))),
    }
}
