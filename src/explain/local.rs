//! A neighbourhood extracted anew: some features of a layer alone, moved or cut otherwise.
//!
//! Stitch candidates, conflict pairs and self-spacings of a feature depend on it and on what is closer than the
//! spacing to it, nothing else. So a feature all of whose neighbours are there comes out as in the whole layer;
//! [`Local::masks`] checks it for those that keep their masks.

use encodings::{Instance, InstanceBuilder, Mask};

use super::gap::{self, Region};
use super::repair::Movement;
use super::{Layer, Subject};
use crate::extract::policy::StitchPolicy;
use crate::extract::runs::Run;
use crate::extract::shadows::Shadow;
use crate::extract::{Extraction, extract, extract_with};
use crate::geometry::{Point, Rect};
use crate::layout::{Layout, Shape, Shapes, StitchRules};
use crate::solve::places::Places;

/// A neighbourhood as a layer of its own.
pub struct Local {
    /// Its layout, of which no more is kept than extraction needs.
    pub layout: Layout,
    /// What was extracted.
    pub extraction: Extraction,
    /// Its problem: that of the extraction, unless a cut has a smaller overlap.
    pub instance: Instance,
    /// For each of its features the feature of the layer.
    pub global: Vec<u32>,
}

impl Local {
    /// Some features, ascending, of which these are moved. `None` where features merge, or the
    /// extraction refuses.
    pub fn moved(layer: &Layer<'_>, features: &[u32], moves: &[Movement]) -> Option<Local> {
        let (layout, owner) = excerpt(layer, features, moves)?;
        let extraction = extract(&layout, layer.rules, &|_| ()).ok()?;
        Local::of(layout, extraction, &owner, features.len())
    }

    /// Some features, ascending, cut as they are now and at one more line, whose overlap may be smaller than
    /// the rule. `None` too where that cut separates nothing.
    pub fn cut(layer: &Layer<'_>, features: &[u32], line: Rect, overlap: i32) -> Option<Local> {
        let (layout, owner) = excerpt(layer, features, &[])?;
        let fragments = &layer.extraction.fragments;
        let mut lines: Vec<Rect> = Vec::new();
        for &feature in features {
            let own = fragments.of_feature(feature);
            let cuts = own.flat_map(|fragment| fragments.cuts_of(fragment));
            lines.extend(cuts.map(|cut| cut.line));
        }
        lines.push(line);
        lines.sort_unstable();
        lines.dedup();
        let policy = Given { lines };
        let extraction = extract_with(&layout, layer.rules, &policy, &|_| ()).ok()?;
        let mut local = Local::of(layout, extraction, &owner, features.len())?;
        let cuts = local.extraction.fragments.cuts();
        let sides = cuts.iter().find(|cut| cut.line == line)?.sides;
        if overlap < layer.rules.stitch.overlap {
            local.instance = local.with_overlap(layer, line, sides, overlap)?;
        }
        Some(local)
    }

    fn of(layout: Layout, extraction: Extraction, owner: &[u32], count: usize) -> Option<Local> {
        let features = &extraction.features;
        if features.len() != count {
            return None;
        }
        let first = |feature: u32| features.shapes_of(feature).first();
        let global = (0..count as u32)
            .map(|feature| owner.get(*first(feature)? as usize).copied())
            .collect::<Option<_>>()?;
        Some(Local {
            instance: extraction.instance.clone(),
            layout,
            extraction,
            global,
        })
    }

    /// The mask of each fragment; those of features that have units with `free` ones, and are not among
    /// them, keep that of the whole, and are checked to be cut as they are there.
    pub fn masks(
        &self,
        subject: &Subject<'_>,
        places: &Places<'_>,
        free: &[u32],
    ) -> Option<Vec<Mask>> {
        let layer = subject.layer?;
        let mut masks = vec![0; self.instance.fragment_count()];
        let (here, there) = (&self.extraction.fragments, &layer.extraction.fragments);
        for &feature in free {
            for &(other, _) in places.neighbours(feature) {
                if free.binary_search(&other).is_ok() {
                    continue;
                }
                let own = here.of_feature(other);
                let whole = there.of_feature(self.global[other as usize]);
                if own.len() != whole.len() {
                    return None;
                }
                for (mine, its) in own.zip(whole) {
                    if here.cells_of(mine) != there.cells_of(its) {
                        return None;
                    }
                    masks[mine as usize] = subject.colouring[its as usize];
                }
            }
        }
        Some(masks)
    }

    /// The problem when the cut between `sides` has a smaller overlap than the others.
    fn with_overlap(
        &self,
        layer: &Layer<'_>,
        line: Rect,
        sides: [u32; 2],
        overlap: i32,
    ) -> Option<Instance> {
        let here = Layer {
            layout: &self.layout,
            rules: layer.rules,
            extraction: &self.extraction,
        };
        let fragments = &self.extraction.fragments;
        let region = |fragment: u32| -> Vec<Region> {
            if !sides.contains(&fragment) {
                return gap::of_fragment(&here, fragment);
            }
            let overlaps = fragments.cuts_of(fragment).map(|cut| {
                let half = if cut.line == line {
                    overlap / 2
                } else {
                    fragments.half_overlap()
                };
                cut.overlap(half)
            });
            let cells = fragments.cells_of(fragment).iter().copied();
            cells.chain(overlaps).map(Region::Rect).collect()
        };
        let is_close = |edge: &[u32; 2]| {
            let touches = sides.iter().any(|side| edge.contains(side));
            let apart = |[a, b]: &[u32; 2]| {
                gap::between(&region(*a), &region(*b), layer.rules.spacing).is_none()
            };
            !touches || !apart(edge)
        };
        filtered(&self.instance, is_close)
    }
}

/// The instance with those fragment edges and self-spacings only that are kept.
fn filtered(instance: &Instance, kept: impl Fn(&[u32; 2]) -> bool) -> Option<Instance> {
    let mut builder = InstanceBuilder::new(instance.masks());
    for feature in 0..instance.feature_count() as u32 {
        builder.feature(instance.fragments_of(feature).len() as u32);
    }
    for fragment in 0..instance.fragment_count() as u32 {
        builder.allow(fragment, instance.allowed(fragment));
    }
    for pair in instance.pairs() {
        let edges: Vec<[u32; 2]> = pair.iter().copied().filter(&kept).collect();
        if !edges.is_empty() {
            builder.pair(edges);
        }
    }
    for stitch in instance.stitches() {
        builder.stitch(stitch.a, stitch.b, stitch.weight);
    }
    for &[a, b] in instance.self_spacings() {
        if kept(&[a, b]) {
            builder.self_spacing(a, b);
        }
    }
    builder.build().ok()
}

/// The shapes of some features, moved, and the feature of each.
pub fn excerpt(
    layer: &Layer<'_>,
    features: &[u32],
    moves: &[Movement],
) -> Option<(Layout, Vec<u32>)> {
    let mut shapes = Shapes::default();
    let mut owner = Vec::new();
    for &feature in features {
        let own = moves.iter().find(|m| m.feature == feature);
        let by = own.map_or([0, 0], |m| m.by);
        for &shape in layer.extraction.features.shapes_of(feature) {
            push(&mut shapes, layer.layout.shapes.get(shape), by)?;
            owner.push(feature);
        }
    }
    let layout = Layout {
        top: String::new(),
        layer: layer.layout.layer,
        unit_pm: layer.layout.unit_pm,
        shapes,
    };
    Some((layout, owner))
}

fn push(shapes: &mut Shapes, shape: Shape<'_>, [dx, dy]: [i32; 2]) -> Option<()> {
    let shift = |p: &Point| -> Option<Point> {
        Some(Point::new(p.x.checked_add(dx)?, p.y.checked_add(dy)?))
    };
    match shape {
        Shape::Rect(rect) => shapes.push_rect(Rect {
            min: shift(&rect.min)?,
            max: shift(&rect.max)?,
        }),
        Shape::Polygon(points) => {
            let points: Vec<Point> = points.iter().map(shift).collect::<Option<_>>()?;
            shapes.push_polygon(&points);
        }
    }
    Some(())
}

/// The policy of cut lines that are given, sorted.
struct Given {
    lines: Vec<Rect>,
}

impl StitchPolicy for Given {
    fn candidates(&self, run: &Run, _: &[Shadow], _: &StitchRules) -> Vec<i32> {
        let area = run.direction.turn(run.along());
        let inside = |line: &&Rect| area.covers(line);
        let along = |line: &Rect| run.direction.turn(*line).min.x;
        let on_run = |&place: &i32| {
            let line = run.line(place);
            run.from < place && place < run.to && self.lines.binary_search(&line).is_ok()
        };
        let mut places: Vec<i32> = (self.lines.iter().filter(inside))
            .map(along)
            .filter(on_run)
            .collect();
        places.sort_unstable();
        places.dedup();
        places
    }
}
