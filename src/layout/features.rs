//! The features of a layer: which shapes hang together.
//!
//! Features are numbered along Hilbert's curve, by the centres of their boxes: features with near numbers
//! are near each other on the layer. Fragments, conflict pairs and the order of totalizer inputs follow
//! this numbering, and solving time depends on it. Ties are broken by the boxes, then by the smallest
//! shape. The numbering does not depend on how many threads were at work.

use crate::geometry::Rect;

/// The features of a layer, each a set of shapes: 4 bytes a shape and 20 a feature.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Features {
    start: Vec<u32>,
    shapes: Vec<u32>,
    boxes: Vec<Rect>,
}

impl Default for Features {
    fn default() -> Features {
        Features {
            start: vec![0],
            shapes: Vec::new(),
            boxes: Vec::new(),
        }
    }
}

impl Features {
    /// Adds a feature by its shapes and the box around them; returns its number.
    pub fn push(&mut self, shapes: impl IntoIterator<Item = u32>, area: Rect) -> u32 {
        self.shapes.extend(shapes);
        self.start.push(self.shapes.len() as u32);
        self.boxes.push(area);
        self.boxes.len() as u32 - 1
    }

    /// No features yet, with room for some.
    pub fn with_capacity(features: usize, shapes: usize) -> Features {
        let mut start = Vec::with_capacity(features + 1);
        start.push(0);
        Features {
            start,
            shapes: Vec::with_capacity(shapes),
            boxes: Vec::with_capacity(features),
        }
    }

    /// How many features there are.
    pub fn len(&self) -> usize {
        self.boxes.len()
    }

    /// Whether there is no feature.
    pub fn is_empty(&self) -> bool {
        self.boxes.is_empty()
    }

    /// The shapes of a feature, ascending.
    pub fn shapes_of(&self, feature: u32) -> &[u32] {
        let ends = [
            self.start[feature as usize],
            self.start[feature as usize + 1],
        ];
        &self.shapes[ends[0] as usize..ends[1] as usize]
    }

    /// The box around a feature.
    pub fn box_of(&self, feature: u32) -> Rect {
        self.boxes[feature as usize]
    }
}
