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
        let on_layer = |datatype: &u16| LayerId {
            layer: rules.layer.layer,
            datatype: *datatype,
        };
        let masks = rules.masks;
        let (layers, position) = match &self.output {
            None => {
                let datatypes = (0..u16::from(masks)).map(|mask| FIRST_DATATYPE + mask);
                let layers = datatypes.map(|datatype| on_layer(&datatype)).collect();
                (layers, Position::default())
            }
            Some(Given {
                value: Output::Datatypes(datatypes),
                position,
            }) => (
                datatypes.iter().map(on_layer).collect::<Vec<_>>(),
                position.clone(),
            ),
            Some(Given {
                value: Output::Layers(layers),
                position,
            }) => (layers.clone(), position.clone()),
        };
        let problem = if self.output.is_none() && layers.contains(&rules.layer) {
            Problem::NoDefaultOutput
        } else if layers.len() != usize::from(masks) {
            Problem::OutputCount {
                found: layers.len(),
                masks,
            }
        } else if let Some(layer) = repeated(rules.layer, &layers) {
            Problem::OutputRepeated(layer)
        } else {
            return Ok(layers);
        };
        Err(FormatError::new(position, problem))
    }
}

fn repeated(read: LayerId, layers: &[LayerId]) -> Option<LayerId> {
    let mut seen = vec![read];
    layers.iter().copied().find(|layer| {
        let again = seen.contains(layer);
        seen.push(*layer);
        again
    })
}
