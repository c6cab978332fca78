//! Rules and the layer that they speak of: both ways to a layer on its grid, from rules as given and from
//! the rules of a certificate.

use std::path::Path;

use crate::formats::gdsii::{Label, Request, read as read_stream, read_with_labels};
use crate::formats::input::{self, Input};
use crate::formats::rules::{Given, RawRules, Sources};
use crate::formats::stitch_list::{self, StitchList};
use crate::formats::{FormatError, rules_toml};
use crate::layout::{LayerId, Layout, Rules};

/// Told bytes read and bytes in all.
pub(super) type Progress<'a> = &'a dyn Fn(u64, u64);

/// Reads a file of rules. The list of stitches that it names lies beside it.
pub(super) fn of_file(path: &Path) -> Result<RawRules, FormatError> {
    let name = path.display().to_string();
    let mut rules = rules_toml::read(&input::load(path, &name)?, &name)?;
    if let (Some(list), Some(home)) = (&mut rules.list, path.parent()) {
        list.value = home.join(&list.value);
    }
    Ok(rules)
}

/// Reads the layer that rules name, and puts them on its grid.
pub(super) fn layer(
    input: &Input,
    raw: &RawRules,
    top: Option<&str>,
    progress: Progress<'_>,
) -> Result<(Layout, Rules), FormatError> {
    let list = list(raw)?;
    let (layout, labels) = stream(input, raw, top, progress)?;
    let rules = raw.resolve(&Sources {
        unit_pm: layout.unit_pm,
        labels: &labels,
        list: list.as_ref(),
    })?;
    Ok((layout, rules))
}

/// Reads a layer once under rules that name the same layers as `first`, and puts that and them all on its grid.
pub(super) fn layer_under(
    input: &Input,
    first: &RawRules,
    all: &[RawRules],
    top: Option<&str>,
    progress: Progress<'_>,
) -> Result<(Layout, Rules, Vec<Rules>), FormatError> {
    let with_list = all.iter().find(|raw| raw.reads_list());
    let list = with_list.map(list).transpose()?.flatten();
    let (layout, labels) = stream(input, first, top, progress)?;
    let sources = Sources {
        unit_pm: layout.unit_pm,
        labels: &labels,
        list: list.as_ref(),
    };
    let first = first.resolve(&sources)?;
    let all = all.iter().map(|raw| raw.resolve(&sources));
    let all = all.collect::<Result<_, _>>()?;
    Ok((layout, first, all))
}

/// Rules on the grid of a layer that was read under others.
pub(super) fn on_grid_of(
    layout: &Layout,
    input: &Input,
    raw: &RawRules,
) -> Result<Rules, FormatError> {
    let list = list(raw)?;
    let labels = match raw.layers()?.labels.as_slice() {
        [] => Vec::new(),
        _ => stream(input, raw, Some(&layout.top), &|_, _| {})?.1,
    };
    raw.resolve(&Sources {
        unit_pm: layout.unit_pm,
        labels: &labels,
        list: list.as_ref(),
    })
}

/// Reads the layer of a certificate's rules.
pub(super) fn certified_layer(
    input: &Input,
    rules: &Rules,
    top: &str,
    progress: Progress<'_>,
) -> Result<Layout, FormatError> {
    let keep_outs = rules.stitch.keep_outs.iter();
    let keep_outs: Vec<LayerId> = keep_outs.map(|keep_out| keep_out.layer).collect();
    let request = Request {
        fixed: &rules.hand.fixed_layers,
        keep_outs: &keep_outs,
        top: Some(top),
        progress,
        ..Request::new(&input.name, rules.layer)
    };
    read_stream(&input.bytes, &request)
}

fn stream(
    input: &Input,
    raw: &RawRules,
    top: Option<&str>,
    progress: Progress<'_>,
) -> Result<(Layout, Vec<Label>), FormatError> {
    let layers = raw.layers()?;
    let request = Request {
        fixed: &layers.fixed,
        keep_outs: &layers.keep_outs,
        labels: &layers.labels,
        top,
        progress,
        ..Request::new(&input.name, layers.layer)
    };
    read_with_labels(&input.bytes, &request)
}

/// The list of stitches, where the policy reads one.
fn list(raw: &RawRules) -> Result<Option<StitchList>, FormatError> {
    match &raw.list {
        Some(Given { value: path, .. }) if raw.reads_list() => {
            let name = path.display().to_string();
            stitch_list::read(&input::load(path, &name)?, &name).map(Some)
        }
        _ => Ok(None),
    }
}
