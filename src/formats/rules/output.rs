//! Where the masks are written.

use super::{FIRST_DATATYPE, Given, Problem, RawRules};
use crate::formats::error::{FormatError, Position};
use crate::layout::{LayerId, Rules};

/// Where the masks are written.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Output {
    /// Datatypes of the layer that is read.
    Datatypes(Vec<u16>),
    /// Layers and datatypes.
    Layers(Vec<LayerId>),
}

impl RawRules {
    /// Where each mask is written, in the order of the masks: as given, or datatypes from
    /// [`FIRST_DATATYPE`] on of the layer that is read.
    ///
    /// # Errors
    /// Not one a mask, one twice, or the layer that is read itself.
    pub fn output_layers(&self, rules: &Rules) -> Result<Vec<LayerId>, FormatError> {
        let masks = rules.masks;
        let (layers, position) = match &self.output {
            None => {
                let datatypes = (0..u16::from(masks)).map(|mask| FIRST_DATATYPE + mask);
                let layers = Output::Datatypes(datatypes.collect()).layers(rules);
                (layers, Position::default())
            }
            Some(given) => (given.value.layers(rules), given.position.clone()),
        };
        let problem = if self.output.is_none() && layers.contains(&rules.layer) {
            Problem::NoDefaultOutput
        } else if layers.len() != usize::from(masks) {
            Problem::OutputCount {
                found: layers.len(),
                masks,
            }
        } else if let Some(layer) = repeated(Some(rules.layer), &layers) {
            Problem::OutputRepeated(layer)
        } else {
            return Ok(layers);
        };
        Err(FormatError::new(position, problem))
    }
}

impl Output {
    fn layers(&self, rules: &Rules) -> Vec<LayerId> {
        let layer = rules.layer.layer;
        match self {
            Output::Layers(layers) => layers.clone(),
            Output::Datatypes(datatypes) => {
                let each = datatypes.iter();
                each.map(|&datatype| LayerId { layer, datatype }).collect()
            }
        }
    }
}

/// Where another file draws each mask. One of them may be the layer that is read: in that file it is a mask.
///
/// # Errors
/// Not one a mask, or one twice.
pub fn drawn_layers(output: &Given<Output>, rules: &Rules) -> Result<Vec<LayerId>, FormatError> {
    let layers = output.value.layers(rules);
    let (found, masks) = (layers.len(), rules.masks);
    if found != usize::from(masks) {
        return Err(output.wrong(Problem::OutputCount { found, masks }));
    }
    match repeated(None, &layers) {
        Some(layer) => Err(output.wrong(Problem::OutputRepeated(layer))),
        None => Ok(layers),
    }
}

fn repeated(read: Option<LayerId>, layers: &[LayerId]) -> Option<LayerId> {
    let mut seen = Vec::from_iter(read);
    layers.iter().copied().find(|layer| {
        let again = seen.contains(layer);
        seen.push(*layer);
        again
    })
}
