//! The runs of one feature and the shadows on them, as stitch policies see them: for explanations of why there
//! is no candidate.

use super::error::{MAX_CELLS, too_many_cells};
use super::neighbours::Neighbourhood;
use super::parts::{Part, Parts};
use super::runs::{Run, runs};
use super::shadows::{Shadow, on_run};
use super::{ExtractError, connect, error};
use crate::geometry::slabs::cells_of_rects;
use crate::layout::{Features, Layout, Rules};

/// The features of a layer with what casts shadows on them.
pub struct Survey {
    /// The features, numbered as by [`super::extract`].
    pub features: Features,
    parts: Parts,
    owners: super::Owners,
    spacing: i32,
}

impl Survey {
    /// Looks at a layer.
    ///
    /// # Errors
    /// As [`super::extract`].
    pub fn new(layout: &Layout, rules: &Rules) -> Result<Survey, ExtractError> {
        error::check_rules(rules)?;
        let parts = Parts::new(&layout.shapes)?;
        let (features, owners) = connect::connect(&parts, layout.shapes.len(), &|_| ());
        Ok(Survey {
            features,
            parts,
            owners,
            spacing: rules.spacing,
        })
    }

    /// The runs of a feature with the shadows on them, sorted by where they start; none where it has slanted
    /// edges.
    ///
    /// # Errors
    /// A feature of too many cells.
    pub fn runs_of(&self, feature: u32) -> Result<Vec<(Run, Vec<Shadow>)>, ExtractError> {
        let mut rects = Vec::new();
        for &part in self.owners.parts_of(feature) {
            match self.parts.get(part) {
                Part::Rect(rect) => rects.push(rect),
                Part::Slanted(_) => return Ok(Vec::new()),
            }
        }
        let too_many = || too_many_cells(self.features.box_of(feature));
        let cells = cells_of_rects(&rects, MAX_CELLS).ok_or_else(too_many)?;
        let around = Neighbourhood::new(&self.parts, &self.owners, self.spacing);
        let runs = runs(&cells, MAX_CELLS).ok_or_else(too_many)?;
        let shadowed = |run| (run, on_run(&around, feature, &run));
        Ok(runs.into_iter().map(shadowed).collect())
    }
}
