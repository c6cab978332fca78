//! A neighbourhood as a problem of its own; and one extracted anew, with features moved.
//!
//! Stitch candidates, conflict pairs and self-spacings of a feature depend on it and on what is closer than the
//! spacing to it, nothing else. So a feature all of whose neighbours are there comes out as in the whole layer;
//! [`Local::masks`] checks it for those that keep their masks.

use encodings::{Instance, Mask};

use super::repair::Movement;
use super::{Layer, Subject};
use crate::extract::extract;
use crate::geometry::{Point, Rect};
use crate::layout::{Layout, Shape, Shapes};
use crate::solve::places::Places;

/// A neighbourhood as a problem of its own.
pub struct Local {
    /// The problem.
    pub instance: Instance,
    /// For each of its features the feature of the layer.
    pub global: Vec<u32>,
    /// For each of its fragments the one of the whole that is the same, if there is one.
    pub whole: Vec<Option<u32>>,
}

impl Local {
    /// Some features, ascending, of which these are moved. `None` where features merge, or the
    /// extraction refuses.
    pub fn moved(layer: &Layer<'_>, features: &[u32], moves: &[Movement]) -> Option<Local> {
        let (layout, owner) = excerpt(layer, features, moves)?;
        let extraction = extract(&layout, layer.rules, &|_| ()).ok()?;
        if extraction.features.len() != features.len() {
            return None;
        }
        let first = |feature: u32| extraction.features.shapes_of(feature).first();
        let global: Vec<u32> = (0..features.len() as u32)
            .map(|feature| owner.get(*first(feature)? as usize).copied())
            .collect::<Option<_>>()?;
        let (here, there) = (&extraction.fragments, &layer.extraction.fragments);
        let mut whole = Vec::with_capacity(here.len());
        for (feature, &global) in (0u32..).zip(&global) {
            let (own, its) = (here.of_feature(feature), there.of_feature(global));
            let is_cut_alike = own.len() == its.len();
            whole.extend(own.clone().map(|fragment| {
                let same = its.start + (fragment - own.start);
                let is_same = is_cut_alike && here.cells_of(fragment) == there.cells_of(same);
                is_same.then_some(same)
            }));
        }
        Some(Local {
            instance: extraction.instance,
            global,
            whole,
        })
    }

    /// The mask of each fragment; those of features that have units with `free` ones, and are not among
    /// them, keep that of the whole. `None` where one of them is cut otherwise.
    pub fn masks(
        &self,
        subject: &Subject<'_>,
        places: &Places<'_>,
        free: &[u32],
    ) -> Option<Vec<Mask>> {
        let mut masks = vec![0; self.instance.fragment_count()];
        for &feature in free {
            for &(other, _) in places.neighbours(feature) {
                if free.binary_search(&other).is_ok() {
                    continue;
                }
                for fragment in self.instance.fragments_of(other) {
                    let same = self.whole[fragment as usize]?;
                    masks[fragment as usize] = subject.colouring[same as usize];
                }
            }
        }
        Some(masks)
    }
}

/// The shapes of some features, moved, and the feature of each.
fn excerpt(layer: &Layer<'_>, features: &[u32], moves: &[Movement]) -> Option<(Layout, Vec<u32>)> {
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
        fixed: Vec::new(),
        keep_outs: Vec::new(),
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
