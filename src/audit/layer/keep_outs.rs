//! What stitches keep away from: shapes of other layers, each layer at a distance of its own.

use super::distance::{Bodies, Within};
use super::parts;
use crate::audit::Rejection;
use crate::geometry::{Point, Rect};
use crate::layout::{KeepOut, Layout, Rules};

/// The shapes that each rule speaks of, with the distance from them.
#[derive(Debug, Default)]
pub(super) struct KeepOuts(Vec<(KeepOut, Within, Bodies)>);

impl KeepOuts {
    pub(super) fn new(layout: &Layout, rules: &Rules) -> Result<KeepOuts, Rejection> {
        let metric = rules.spacings.metric;
        let mut all = Vec::new();
        for &keep_out in &rules.stitch.keep_outs {
            let spacing = keep_out.distance;
            // Every distance is at least 0.
            let drawn = layout.keep_outs.iter().filter(|_| spacing > 0);
            for (_, shapes) in drawn.filter(|(layer, _)| *layer == keep_out.layer) {
                let bodies = parts::of_shapes(shapes, |_| false)?.bodies;
                all.push((keep_out, Within { spacing, metric }, bodies));
            }
        }
        Ok(KeepOuts(all))
    }

    /// For each overlap a shape that it is too close to, in words.
    pub(super) fn objections(&self, overlaps: &[Rect]) -> Result<Vec<Option<String>>, Rejection> {
        let mut found = vec![None; overlaps.len()];
        for (KeepOut { layer, distance }, within, bodies) in &self.0 {
            for [overlap, body] in bodies.met(overlaps, *within)? {
                let Point { x, y } = bodies.boxes[body as usize].min;
                found[overlap as usize].get_or_insert_with(|| {
                    format!("its overlap is less than {distance} from the shape at ({x}, {y}) of layer {layer}")
                });
            }
        }
        Ok(found)
    }
}
