//! The layers that rules name: each is read for one purpose.

use super::{FixedBy, Given, Problem, RawRules, RawSet};
use crate::formats::FormatError;
use crate::layout::LayerId;
use encodings::Mask;

/// The layers to read, all that are drawn different.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Layers {
    /// The layer to split.
    pub layer: LayerId,
    /// Layers whose shapes are part of it, and on a mask.
    pub fixed: Vec<(LayerId, Mask)>,
    /// Layers that stitches keep away from.
    pub keep_outs: Vec<LayerId>,
    /// Layers and texttypes of labels, ascending.
    pub labels: Vec<LayerId>,
}

const SPLIT: &str = "the layer to split";
const FIXED: &str = "a fixed layer";
const KEEP_OUT: &str = "a keep-out of stitches";

impl RawRules {
    /// The layers to read, which must be known before the layout is.
    ///
    /// # Errors
    /// No layer is given, one is given for two purposes or twice for one, or a mask is out of range.
    pub fn layers(&self) -> Result<Layers, FormatError> {
        let layer = self.layer()?;
        let mut seen = vec![(layer, SPLIT)];
        let mut once = |layer: LayerId, second, at: &dyn Fn(Problem) -> FormatError| match seen
            .iter()
            .find(|(earlier, _)| *earlier == layer)
        {
            None => {
                seen.push((layer, second));
                Ok(())
            }
            Some(&(_, first)) => {
                let second = if first == second {
                    "that once more"
                } else {
                    second
                };
                Err(at(Problem::LayerTwice {
                    layer,
                    first,
                    second,
                }))
            }
        };
        let mut fixed = Vec::new();
        for given in &self.hand.fixed {
            let mask = mask(&given.value.mask, self.required_masks()?)?;
            if let FixedBy::Layer(layer) = &given.value.by {
                once(layer.value, FIXED, &|problem| layer.wrong(problem))?;
                fixed.push((layer.value, mask));
            }
        }
        let mut keep_outs = Vec::new();
        for given in &self.keep_outs {
            let layer = given.value.layer;
            once(layer, KEEP_OUT, &|problem| given.wrong(problem))?;
            keep_outs.push(layer);
        }
        let sets = self.hand.same.iter().chain(&self.hand.different);
        let mut labels: Vec<LayerId> = sets
            .filter_map(|set| match &set.value {
                RawSet::Labels(named) => Some(named.layer.value),
                RawSet::Points(_) => None,
            })
            .collect();
        labels.sort_unstable();
        labels.dedup();
        Ok(Layers {
            layer,
            fixed,
            keep_outs,
            labels,
        })
    }
}

/// A mask, numbered from 1 by people.
pub(super) fn mask(given: &Given<u64>, masks: u8) -> Result<Mask, FormatError> {
    match given.value {
        number @ 1.. if number <= u64::from(masks) => Ok(number as Mask - 1),
        given_mask => Err(given.wrong(Problem::NoMask {
            given: given_mask,
            masks,
        })),
    }
}
