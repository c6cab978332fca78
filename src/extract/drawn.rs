//! What is drawn on masks, as a colouring of the fragments.
//!
//! A drawing is read as what it must be for some colouring: each fragment on one mask, both sides of a stitch with the
//! overlap of the rules, nothing else. Regions along the axes are compared by their slab cells, which do not
//! depend on how a region is drawn; one region without another is where the winding numbers of the cells of their
//! union and of the other one, run backwards, do not cancel. A feature with slanted edges is compared shape by
//! shape: outlines are equal when they are after spikes and straight vertices are taken out, wherever they begin and
//! whichever way they run.
//!
//! A fragment takes the mask that covers it. Where the overlaps of its neighbours cover a short fragment too, several masks
//! do: then the masks of its feature are tried out until the drawing is the one that they give.

pub mod error;
mod outline;

use super::Extraction;
use super::error::{ExtractError, MAX_CELLS, too_many_cells};
use super::owners::Owners;
use super::parts::{Part, Parts};
use crate::geometry::Rect;
use crate::geometry::rtree::Visitor;
use crate::geometry::slabs::{Rim, cells, cells_of_rects, rims_of_rect};
use crate::layout::fragments::Cut;
use crate::layout::{Layout, Policy, Shapes};
use encodings::Mask;
use error::{Area, DrawnError};
use outline::Outlines;

/// The most colourings of one feature that are tried out.
const MOST_TRIES: usize = 4096;

/// The mask of each fragment, as `sheets` draw them: what is on each mask, in the order of masks. `policy` is the one
/// that the candidates of `extraction` come from; shapes that enclose no area print nothing and are passed over.
///
/// # Errors
/// A place that is drawn on no mask or on two, where the layer has nothing, or where the mask changes and no stitch may
/// be; and what [`super::extract`] refuses in shapes.
pub fn colouring(
    layout: &Layout,
    extraction: &Extraction,
    policy: Policy,
    sheets: &[Shapes],
) -> Result<Vec<Mask>, DrawnError> {
    let reader = Reader::new(layout, extraction, policy)?;
    let mut drawn = Drawn::default();
    for (mask, sheet) in (0..).zip(sheets) {
        reader.read_sheet(mask, sheet, &mut drawn)?;
    }
    drawn.rects.sort_unstable();
    drawn.outlines.sort_unstable();
    let mut colours = Vec::with_capacity(extraction.fragments.len());
    let mut rest = &drawn.rects[..];
    for feature in 0..extraction.features.len() as u32 {
        let (own, later) = rest.split_at(rest.partition_point(|&(of, _, _)| of == feature));
        rest = later;
        if reader.outlines.has(feature) {
            colours.push(reader.slanted_feature(feature, &drawn.outlines)?);
        } else {
            let mut on = vec![Vec::new(); sheets.len()];
            own.iter()
                .for_each(|&(_, mask, rect)| on[usize::from(mask)].push(rect));
            colours.extend(reader.feature(feature, on)?);
        }
    }
    Ok(colours)
}

/// What is drawn, by feature and mask.
#[derive(Default)]
struct Drawn {
    rects: Vec<(u32, Mask, Rect)>,
    /// Features, masks, and numbers of outlines.
    outlines: Vec<(u32, Mask, u32)>,
}

struct Reader<'a> {
    extraction: &'a Extraction,
    policy: Policy,
    unit_pm: u64,
    parts: Parts,
    owners: Owners,
    /// Those of features with slanted edges.
    outlines: Outlines,
}

impl<'a> Reader<'a> {
    fn new(
        layout: &'a Layout,
        extraction: &'a Extraction,
        policy: Policy,
    ) -> Result<Reader<'a>, ExtractError> {
        let features = &extraction.features;
        let parts = Parts::new(&layout.shapes)?;
        let mut feature_of = vec![0; layout.shapes.len()];
        for feature in 0..features.len() as u32 {
            for &shape in features.shapes_of(feature) {
                feature_of[shape as usize] = feature;
            }
        }
        let own = (0..parts.len() as u32).map(|part| feature_of[parts.shape_of(part) as usize]);
        let owners = Owners::new(own.collect(), features.len());
        let slanted = (0..parts.len() as u32).filter(|&part| parts.is_slanted(part));
        let slanted = slanted.map(|part| owners.of(part)).collect();
        Ok(Reader {
            extraction,
            policy,
            unit_pm: layout.unit_pm,
            outlines: Outlines::of(slanted, features, &layout.shapes),
            parts,
            owners,
        })
    }

    fn area(&self, rect: Rect) -> Area {
        let unit_pm = self.unit_pm;
        Area { rect, unit_pm }
    }

    /// Finds the features that a mask draws.
    fn read_sheet(&self, mask: Mask, sheet: &Shapes, drawn: &mut Drawn) -> Result<(), DrawnError> {
        let parts = Parts::new(sheet)?;
        let mut whole = vec![false; sheet.len()];
        for (shape, is_whole) in (0u32..).zip(&mut whole) {
            if let Some((feature, outline)) = self.outlines.find(sheet.get(shape)) {
                drawn.outlines.push((feature, mask, outline));
                *is_whole = true;
            }
        }
        for part in 0..parts.len() as u32 {
            if whole[parts.shape_of(part) as usize] {
                continue;
            }
            let at = self.area(parts.box_of(part));
            match parts.get(part) {
                Part::Slanted(_) => return Err(DrawnError::Outline { mask, at }),
                Part::Rect(rect) => match self.feature_under(&rect) {
                    Some(feature) if self.outlines.has(feature) => {
                        return Err(DrawnError::Slanted { feature, at });
                    }
                    Some(feature) => drawn.rects.push((feature, mask, rect)),
                    None => return Err(DrawnError::Nothing { mask, at }),
                },
            }
        }
        Ok(())
    }

    /// The first feature of which a rectangle shares an area with a part, or else with its box.
    fn feature_under(&self, rect: &Rect) -> Option<u32> {
        let mut search = Under {
            reader: self,
            rect,
            found: None,
        };
        self.parts.tree().query(rect, &mut search);
        search.found.map(|(_, feature)| feature)
    }

    /// The mask of a feature with slanted edges: all of its outlines are drawn there, and none elsewhere.
    fn slanted_feature(
        &self,
        feature: u32,
        outlines: &[(u32, Mask, u32)],
    ) -> Result<Mask, DrawnError> {
        let first = outlines.partition_point(|&(of, _, _)| of < feature);
        let own = &outlines[first..];
        let own = &own[..own.partition_point(|&(of, _, _)| of == feature)];
        let at = self.area(self.extraction.features.box_of(feature));
        let Some(&(_, mask, _)) = own.first() else {
            return Err(DrawnError::Missing { feature, at });
        };
        let mut found: Vec<u32> = own.iter().map(|&(_, _, outline)| outline).collect();
        found.dedup();
        let is_one = own.iter().all(|&(_, other, _)| other == mask);
        if is_one && found.len() == self.outlines.count(feature) {
            return Ok(mask);
        }
        Err(DrawnError::Slanted { feature, at })
    }

    /// The masks of the fragments of a feature along the axes, of which `on` has the rectangles on each mask.
    fn feature(&self, feature: u32, on: Vec<Vec<Rect>>) -> Result<Vec<Mask>, DrawnError> {
        let rects = self.owners.parts_of(feature).iter();
        let rects: Vec<Rect> = rects.map(|&part| self.parts.box_of(part)).collect();
        let whole = region(&rects)?;
        let on = on.iter().map(|rects| region(rects));
        let on: Vec<Vec<Rect>> = on.collect::<Result<_, _>>()?;
        let range = self.extraction.fragments.of_feature(feature);
        let used: Vec<Mask> = (0..)
            .zip(&on)
            .filter(|(_, d)| !d.is_empty())
            .map(|(m, _)| m)
            .collect();
        if let [mask] = used[..]
            && on[usize::from(mask)] == whole
        {
            return Ok(vec![mask; range.len()]);
        }
        let drawing = Drawing {
            reader: self,
            feature,
            on,
        };
        drawing.check_extent(&whole)?;
        if range.len() == 1 {
            return drawing.masks_of(&[whole], &[]);
        }
        let fragments = &self.extraction.fragments;
        let cells: Vec<Vec<Rect>> = (range.clone())
            .map(|fragment| fragments.cells_of(fragment).to_vec())
            .collect();
        let mut cuts: Vec<Cut> = Vec::new();
        for fragment in range.clone() {
            let own = fragments.cuts_of(fragment);
            cuts.extend(own.filter(|cut| cut.sides[0].min(cut.sides[1]) == fragment));
        }
        for cut in &mut cuts {
            cut.sides = cut.sides.map(|side| side - range.start);
        }
        drawing.masks_of(&cells, &cuts)
    }
}

struct Under<'a> {
    reader: &'a Reader<'a>,
    rect: &'a Rect,
    /// Whether it only touches, and the feature.
    found: Option<(bool, u32)>,
}

impl Visitor for Under<'_> {
    fn enter(&mut self, _: usize) -> bool {
        true
    }

    fn visit(&mut self, part: u32) {
        let other = self.reader.parts.box_of(part);
        let (a, b) = (self.rect, &other);
        let shares_area =
            a.min.x < b.max.x && b.min.x < a.max.x && a.min.y < b.max.y && b.min.y < a.max.y;
        let only_touches = !shares_area || self.reader.parts.is_slanted(part);
        let found = (only_touches, self.reader.owners.of(part));
        self.found = Some(self.found.map_or(found, |before| before.min(found)));
    }
}

/// What is drawn of one feature: slab cells on each mask.
struct Drawing<'a> {
    reader: &'a Reader<'a>,
    feature: u32,
    on: Vec<Vec<Rect>>,
}

impl Drawing<'_> {
    /// All of the feature is drawn, and no more.
    fn check_extent(&self, whole: &[Rect]) -> Result<(), DrawnError> {
        for (mask, own) in (0..).zip(&self.on) {
            if let Some(&rect) = without(own, whole)?.first() {
                let at = self.reader.area(rect);
                return Err(DrawnError::Nothing { mask, at });
            }
        }
        let all = region(&self.on.concat())?;
        match without(whole, &all)?.first() {
            None => Ok(()),
            Some(&rect) => {
                let (feature, at) = (self.feature, self.reader.area(rect));
                Err(DrawnError::Missing { feature, at })
            }
        }
    }

    /// The masks of fragments of the given cells with the given cuts between them.
    fn masks_of(&self, cells: &[Vec<Rect>], cuts: &[Cut]) -> Result<Vec<Mask>, DrawnError> {
        let mut choices: Vec<Vec<Mask>> = Vec::with_capacity(cells.len());
        for own in cells {
            choices.push(self.covering(own)?);
        }
        let mut tries = choices.iter().map(Vec::len);
        let tries = tries.try_fold(1usize, usize::checked_mul);
        let tries = tries.unwrap_or(MOST_TRIES).min(MOST_TRIES);
        for number in 0..tries {
            let masks = nth(&choices, number);
            if self.difference(cells, cuts, &masks)?.is_none() {
                return Ok(masks);
            }
        }
        let masks = nth(&choices, 0);
        match self.difference(cells, cuts, &masks)? {
            Some(error) => Err(error),
            None => Ok(masks),
        }
    }

    /// The masks on which all of some cells is drawn.
    fn covering(&self, own: &[Rect]) -> Result<Vec<Mask>, DrawnError> {
        let own = region(own)?;
        let mut found = Vec::new();
        let mut partly: Option<(Mask, Rect)> = None;
        for (mask, drawn) in (0..).zip(&self.on) {
            let rest = without(&own, drawn)?;
            match rest.first() {
                None => found.push(mask),
                Some(&rect) if rest != own && partly.is_none() => partly = Some((mask, rect)),
                Some(_) => {}
            }
        }
        match (found.is_empty(), partly) {
            (true, Some((mask, rect))) => Err(self.no_stitch(mask, rect)),
            _ => Ok(found),
        }
    }

    fn no_stitch(&self, mask: Mask, rect: Rect) -> DrawnError {
        let covers = |drawn: &Vec<Rect>| without(&[rect], drawn).is_ok_and(|rest| rest != [rect]);
        let other = self.on.iter().position(covers);
        DrawnError::NoStitch {
            feature: self.feature,
            masks: [mask, other.unwrap_or_default() as Mask],
            policy: self.reader.policy,
            at: self.reader.area(rect),
        }
    }

    /// How the drawing differs from what masks give.
    fn difference(
        &self,
        cells: &[Vec<Rect>],
        cuts: &[Cut],
        masks: &[Mask],
    ) -> Result<Option<DrawnError>, DrawnError> {
        let half = self.reader.extraction.fragments.half_overlap();
        let on_mask = |fragment: usize, mask: Mask| masks.get(fragment) == Some(&mask);
        let feature = self.feature;
        for (mask, drawn) in (0..).zip(&self.on) {
            let own = (0..)
                .zip(cells)
                .filter(|&(fragment, _)| on_mask(fragment, mask));
            let mut right: Vec<Rect> = own.flat_map(|(_, cells)| cells).copied().collect();
            let stitches = cuts.iter().filter(|cut| {
                let [a, b] = cut.sides.map(|side| on_mask(side as usize, mask));
                a != b
            });
            right.extend(stitches.map(|cut| cut.overlap(half)));
            let right = region(&right)?;
            if let Some(&rect) = without(&right, drawn)?.first() {
                let at = self.reader.area(rect);
                return Ok(Some(DrawnError::Overlap { feature, mask, at }));
            }
            if let Some(&rect) = without(drawn, &right)?.first() {
                let covers = |d: &Vec<Rect>| without(&[rect], d).is_ok_and(|rest| rest != [rect]);
                let other = (0..).zip(&self.on).filter(|&(other, _)| other != mask);
                let other = other
                    .filter(|(_, drawn)| covers(drawn))
                    .map(|(other, _)| other)
                    .next();
                return Ok(Some(DrawnError::Twice {
                    feature,
                    masks: [other.unwrap_or(mask), mask],
                    at: self.reader.area(rect),
                }));
            }
        }
        Ok(None)
    }
}

/// The choice of that number, the last fragment turning first.
fn nth(choices: &[Vec<Mask>], mut number: usize) -> Vec<Mask> {
    let mut masks: Vec<Mask> = Vec::with_capacity(choices.len());
    for own in choices.iter().rev() {
        let count = own.len().max(1);
        masks.push(own.get(number % count).copied().unwrap_or_default());
        number /= count;
    }
    masks.reverse();
    masks
}

/// The slab cells of a union.
fn region(rects: &[Rect]) -> Result<Vec<Rect>, ExtractError> {
    cells_of_rects(rects, MAX_CELLS).ok_or_else(|| too_many(rects))
}

/// The slab cells of a region without another one, both given by disjoint rectangles.
fn without(region: &[Rect], other: &[Rect]) -> Result<Vec<Rect>, ExtractError> {
    if region.is_empty() || region == other {
        return Ok(Vec::new());
    }
    let both = [region, other].concat();
    let union = cells_of_rects(&both, MAX_CELLS).ok_or_else(|| too_many(&both))?;
    let mut rims: Vec<Rim> = union.iter().flat_map(rims_of_rect).collect();
    rims.extend(other.iter().flat_map(rims_of_rect).map(|rim| Rim {
        turn: -rim.turn,
        ..rim
    }));
    cells(rims, MAX_CELLS).ok_or_else(|| too_many(&both))
}

fn too_many(rects: &[Rect]) -> ExtractError {
    let area = rects.iter().copied().reduce(|all, one| all.union(&one));
    too_many_cells(area.unwrap_or_default())
}
