//! The layers of a library with their counts of shapes or texts, for the message that one is absent.
//!
//! Counted are drawn elements (BOUNDARY, BOX, PATH), or texts, as placed below the top cell, each placement
//! counting anew. A second walk through the file, made only for this message.

use super::element::Element;
use super::hierarchy::{Hierarchy, list};
use super::library::Library;
use super::problem::Problem;
use super::records::{Fault, kind};
use super::walk::{Visitor, walk};
use crate::layout::LayerId;
use std::collections::BTreeMap;
use std::ops::Range;

/// What is counted.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Counted {
    Shapes,
    Texts,
}

/// The fault of a layer on which nothing is drawn, or no text, below the top cell.
pub(super) fn absent(
    bytes: &[u8],
    library: &Library<'_>,
    hierarchy: &Hierarchy,
    layer: LayerId,
    counted: Counted,
) -> Fault {
    let mut census = Census {
        library,
        counted,
        times: times_placed(library, hierarchy),
        current: 0,
        counts: BTreeMap::new(),
    };
    if let Err(fault) = walk(bytes, &mut census, &|_, _| {}) {
        return fault;
    }
    let counts = census.counts;
    let present = match counts.is_empty() {
        true => "none".to_owned(),
        false => list(
            counts
                .iter()
                .map(|(layer, count)| format!("{layer} ({count})")),
        ),
    };
    let top = &library.cells[hierarchy.top as usize];
    let problem = match counted {
        Counted::Shapes => Problem::LayerAbsent { layer, present },
        Counted::Texts => Problem::LabelsAbsent { layer, present },
    };
    problem.at(top.defined.unwrap_or(0)).in_cell(top.name)
}

/// How many times each cell is placed below the top.
fn times_placed(library: &Library<'_>, hierarchy: &Hierarchy) -> Vec<u64> {
    let mut times = vec![0u64; library.cells.len()];
    times[hierarchy.top as usize] = 1;
    for &cell in hierarchy.order.iter().rev() {
        for reference in &library.cells[cell as usize].references {
            let more = times[cell as usize].saturating_mul(reference.count.into());
            let placed = &mut times[reference.cell as usize];
            *placed = placed.saturating_add(more);
        }
    }
    times
}

struct Census<'l, 'a> {
    library: &'l Library<'a>,
    counted: Counted,
    times: Vec<u64>,
    current: usize,
    counts: BTreeMap<LayerId, u64>,
}

impl<'a> Visitor<'a> for Census<'_, '_> {
    fn begin_cell(&mut self, name: &'a [u8], _offset: usize) -> Result<(), Fault> {
        self.current = self.library.find(name).unwrap_or(0) as usize;
        Ok(())
    }

    fn element(&mut self, element: &Element<'a>) -> Result<(), Fault> {
        let times = self.times[self.current];
        let counts = match self.counted {
            Counted::Shapes => {
                matches!(element.start.kind, kind::BOUNDARY | kind::BOX | kind::PATH)
            }
            Counted::Texts => element.start.kind == kind::TEXT,
        };
        if counts && times > 0 {
            let count = self.counts.entry(element.layer()?).or_default();
            *count = count.saturating_add(times);
        }
        Ok(())
    }

    fn end_cell(&mut self, _end: Range<usize>) -> Result<(), Fault> {
        Ok(())
    }
}
