//! Refusals of the command line as one line each.

use clap::error::{ContextKind, ContextValue, ErrorKind};

/// Says in one line what is wrong with the command line, and what would be right.
pub fn line(error: &clap::Error) -> String {
    let told = |kind| match error.get(kind) {
        Some(ContextValue::String(text)) => Some(text.clone()),
        Some(ContextValue::Strings(texts)) => Some(texts.join(", ")),
        _ => None,
    };
    let argument = told(ContextKind::InvalidArg).map_or(String::new(), |name| bare(&name));
    let value = told(ContextKind::InvalidValue).unwrap_or_default();
    let near = told(ContextKind::SuggestedArg)
        .or_else(|| told(ContextKind::SuggestedSubcommand))
        .map(|name| format!("; did you mean {name}?"));
    let hint = near.unwrap_or_else(|| {
        format!(
            "; maskproof {} --help lists what is possible",
            command(error)
        )
    });
    match error.kind() {
        ErrorKind::ValueValidation => match std::error::Error::source(error) {
            Some(reason) if value.is_empty() || reason.to_string().contains(&value) => {
                format!("{argument}: {reason}")
            }
            Some(reason) => format!("{argument}: {value:?}: {reason}"),
            None => format!("{argument}: {value:?} is no possible value"),
        },
        ErrorKind::InvalidValue if value.is_empty() => format!("{argument}: a value is missing"),
        ErrorKind::UnknownArgument => format!("{argument}: no such option{hint}"),
        ErrorKind::ArgumentConflict => format!("{argument}: given more than once"),
        ErrorKind::MissingRequiredArgument => format!("{argument} is missing{hint}"),
        ErrorKind::InvalidSubcommand => {
            let name = told(ContextKind::InvalidSubcommand).unwrap_or_default();
            format!("{name}: no such command{hint}")
        }
        ErrorKind::MissingSubcommand | ErrorKind::DisplayHelpOnMissingArgumentOrSubcommand => {
            "a command is missing: maskproof solve INPUT ... (maskproof --help)".to_owned()
        }
        _ => first_paragraph(&error.to_string()),
    }
}

/// The command that was meant, as clap's usage line names it.
fn command(error: &clap::Error) -> String {
    let usage = match error.get(ContextKind::Usage) {
        Some(ContextValue::StyledStr(usage)) => usage.to_string(),
        _ => String::new(),
    };
    let mut words = usage
        .split_whitespace()
        .skip_while(|&word| word != "maskproof");
    let is_plain = |word: &&str| word.chars().all(|c| c.is_ascii_lowercase());
    words.nth(1).filter(is_plain).unwrap_or("solve").to_owned()
}

/// `--masks` of `--masks <K>`; a positional argument keeps its name.
fn bare(argument: &str) -> String {
    let option = argument.split(' ').next().unwrap_or_default();
    option.trim_matches(['<', '>']).to_owned()
}

fn first_paragraph(text: &str) -> String {
    let text = text.strip_prefix("error: ").unwrap_or(text);
    let paragraph = text.split("\n\n").next().unwrap_or_default();
    paragraph.split_whitespace().collect::<Vec<_>>().join(" ")
}
