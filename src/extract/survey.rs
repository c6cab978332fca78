//! The runs of single features and the shadows on them, as stitch policies see them: for explanations of why
//! there is no candidate.

use super::error::{MAX_CELLS, too_many_cells};
use super::neighbours::Neighbourhood;
use super::owners::Owners;
use super::parts::{Part, Parts};
use super::runs::{Run, runs};
use super::shadows::{Shadow, on_run};
use super::spacing::{Faces, Outlines, Relation};
use super::{ExtractError, connect, error};
use crate::geometry::Rect;
use crate::geometry::slabs::cells_of_rects;
use crate::layout::{Layout, Rules};

/// The features of a layer, numbered as by [`super::extract`].
pub struct Survey {
    parts: Parts,
    owners: Owners,
    relation: Relation,
    faces: Option<Faces>,
}

/// A feature along the axes: its slab cells, sorted by their lower left corners, and its runs, each with the
/// shadows on it, sorted by where they start.
pub struct Surveyed {
    /// The cells.
    pub cells: Vec<Rect>,
    /// The runs.
    pub runs: Vec<(Run, Vec<Shadow>)>,
}

/// A survey, ready to look at features.
pub struct Surveyor<'a>(Neighbourhood<'a>);

impl Survey {
    /// Looks at a layer.
    ///
    /// # Errors
    /// As [`super::extract`].
    pub fn new(layout: &Layout, rules: &Rules) -> Result<Survey, ExtractError> {
        error::check_rules(rules)?;
        let parts = Parts::new(&layout.shapes)?;
        let owners = connect::connect(&parts, layout.shapes.len(), &|_| ()).1;
        let relation = Relation::new(rules);
        let faces = match relation.needs_outlines() {
            true => Some(Faces::of_features(Outlines::new(
                &parts, &owners, &relation,
            )?)),
            false => None,
        };
        Ok(Survey {
            parts,
            owners,
            relation,
            faces,
        })
    }

    /// Gets ready to look at features.
    pub fn surveyor(&self) -> Surveyor<'_> {
        let faces = self.faces.as_ref();
        Surveyor(Neighbourhood::new(
            &self.parts,
            &self.owners,
            &self.relation,
            faces,
        ))
    }
}

impl Surveyor<'_> {
    /// Looks at a feature; nothing where it has slanted edges.
    ///
    /// # Errors
    /// A feature of too many cells.
    pub fn look(&self, feature: u32) -> Result<Option<Surveyed>, ExtractError> {
        let around = &self.0;
        let mut rects = Vec::new();
        for &part in around.owners.parts_of(feature) {
            match around.parts.get(part) {
                Part::Rect(rect) => rects.push(rect),
                Part::Slanted(_) => return Ok(None),
            }
        }
        let too_many = || {
            let area = rects.iter().copied().reduce(|all, one| all.union(&one));
            too_many_cells(area.unwrap_or_default())
        };
        let cells = cells_of_rects(&rects, MAX_CELLS).ok_or_else(too_many)?;
        let runs = runs(&cells, MAX_CELLS).ok_or_else(too_many)?;
        let shadowed = |run| (run, on_run(around, feature, &run));
        Ok(Some(Surveyed {
            runs: runs.into_iter().map(shadowed).collect(),
            cells,
        }))
    }
}
