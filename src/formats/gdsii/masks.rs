//! Masks that are drawn already: one layer each, of which some may be empty.

use super::census::{Counted, absent};
use super::hierarchy::Hierarchy;
use super::library::{Library, Wanted};
use super::records::Fault;
use super::{Request, check_size, flatten, walk};
use crate::formats::FormatError;
use crate::layout::{LayerId, Shapes};

/// What is drawn on masks.
#[derive(Clone, Debug)]
pub struct Masks {
    /// One database unit, in picometres.
    pub unit_pm: u64,
    /// The shapes on each mask, flattened into the coordinates of the top cell.
    pub sheets: Vec<Shapes>,
}

/// Reads the masks from an unpacked stream: what the cell `top` and those below it draw on `layers`, which are
/// different. `progress` gets bytes read and bytes in all.
///
/// # Errors
/// As for [`super::read`]; but only when nothing is drawn on any of the layers is that an error.
pub fn read(
    bytes: &[u8],
    name: &str,
    layers: &[LayerId],
    top: &str,
    progress: &dyn Fn(u64, u64),
) -> Result<Masks, FormatError> {
    let Some(&first) = layers.first() else {
        let (unit_pm, sheets) = (0, Vec::new());
        return Ok(Masks { unit_pm, sheets });
    };
    let request = Request {
        top: Some(top),
        progress,
        ..Request::new(name, first)
    };
    read_layers(bytes, layers, &request).map_err(|fault: Fault| fault.in_file(name))
}

fn read_layers(bytes: &[u8], layers: &[LayerId], request: &Request<'_>) -> Result<Masks, Fault> {
    let mut library = Library::new(Wanted {
        drawn: layers.to_vec(),
        labels: Vec::new(),
    });
    let header = walk::walk(bytes, &mut library, request.progress)?;
    let hierarchy = Hierarchy::new(&library, bytes, request.top)?;
    check_size(&library, &hierarchy, request)?;
    let sheets = flatten::flatten(&mut library, &hierarchy)?.sheets;
    if sheets.iter().all(Shapes::is_empty) {
        return Err(absent(
            bytes,
            &library,
            &hierarchy,
            request.layer,
            Counted::Shapes,
        ));
    }
    let unit_pm = header.unit_pm;
    Ok(Masks { unit_pm, sheets })
}
