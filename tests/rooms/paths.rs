//! The paths that a Rust source names, with grouped imports written out: enough of the language's
//! surface to see who uses whom, and no more.
//!
//! Comments and literals are dropped, the rest is cut into identifiers and signs, and each path is
//! followed through its braces. A path that climbs to the crate's root by `super` is written with
//! `crate`, so that it cannot slip past a rule.

/// A path and where it begins.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct NamedPath {
    /// Its segments, as `["crate", "layout", "Rules"]`.
    pub segments: Vec<String>,
    /// The line, from 1.
    pub line: usize,
}

#[derive(Clone, Debug, PartialEq, Eq)]
struct Token {
    text: String,
    line: usize,
}

/// Every path of at least two segments, and every name that an import or `extern crate` brings in
/// whole, of a source whose module lies `depth` steps below the crate's root.
pub fn named_paths(source: &str, depth: usize) -> Vec<NamedPath> {
    let tokens = tokens(source);
    let mut found = Vec::new();
    let mut modules = Modules::default();
    let mut at = 0;
    while at < tokens.len() {
        modules.step(&tokens, at);
        if !starts_path(&tokens, at) {
            at += 1;
            continue;
        }
        let alone = at > 0 && ["use", "crate"].contains(&tokens[at - 1].text.as_str());
        let mut paths = Vec::new();
        let end = follow(&tokens, at, &[], &mut paths);
        for segments in paths {
            let segments = absolute(segments, depth + modules.depth());
            if segments.len() > 1 || alone || segments[0] == "crate" && !is_visibility(&tokens, at)
            {
                let line = tokens[at].line;
                found.push(NamedPath { segments, line });
            }
        }
        // Braces inside a group are balanced, so that the module depth need not see them.
        at = end.max(at + 1);
    }
    found
}

/// The inline modules that the walk is inside of.
#[derive(Default)]
struct Modules {
    braces: Vec<bool>,
}

impl Modules {
    fn step(&mut self, tokens: &[Token], at: usize) {
        match tokens[at].text.as_str() {
            "{" => self.braces.push(at >= 2 && tokens[at - 2].text == "mod"),
            "}" => drop(self.braces.pop()),
            _ => {}
        }
    }

    fn depth(&self) -> usize {
        self.braces.iter().filter(|&&module| module).count()
    }
}

fn starts_path(tokens: &[Token], at: usize) -> bool {
    let before = at.checked_sub(1).map_or("", |i| tokens[i].text.as_str());
    if !is_name(&tokens[at].text) || before == "." {
        return false;
    }
    // A leading `::` begins a path; one after a name or `>` continues it.
    before != "::" || at < 2 || !(is_name(&tokens[at - 2].text) || tokens[at - 2].text == ">")
}

/// `pub(crate)` and `extern crate` name no path of the crate.
fn is_visibility(tokens: &[Token], at: usize) -> bool {
    at > 0 && (tokens[at - 1].text == "(" || tokens[at - 1].text == "extern")
}

/// Reads one path from `at`, after `prefix`; returns the place behind it.
fn follow(tokens: &[Token], at: usize, prefix: &[String], out: &mut Vec<Vec<String>>) -> usize {
    let text = |i: usize| {
        tokens
            .get(i)
            .map_or("", |token: &Token| token.text.as_str())
    };
    if text(at) == "::" {
        return follow(tokens, at + 1, prefix, out);
    }
    if text(at) == "{" {
        let mut next = at + 1;
        while !["}", ""].contains(&text(next)) {
            next = match text(next) {
                name if is_name(name) || ["*", "{", "::"].contains(&name) => {
                    skip_alias(tokens, follow(tokens, next, prefix, out))
                }
                _ => next + 1,
            };
        }
        return next + 1;
    }
    let mut path = prefix.to_vec();
    path.push(text(at).to_owned());
    let continues = is_name(text(at + 2)) || ["{", "*"].contains(&text(at + 2));
    if text(at + 1) == "::" && continues {
        return follow(tokens, at + 2, &path, out);
    }
    out.push(path);
    at + 1
}

fn skip_alias(tokens: &[Token], at: usize) -> usize {
    match tokens.get(at) {
        Some(token) if token.text == "as" => at + 2,
        _ => at,
    }
}

/// Writes a path that climbs to the root as one from `crate`.
fn absolute(segments: Vec<String>, depth: usize) -> Vec<String> {
    let own = usize::from(segments[0] == "self");
    let climbed = segments[own..].iter().take_while(|s| *s == "super").count();
    if climbed == 0 || climbed < depth {
        return segments;
    }
    let rest = segments.into_iter().skip(own + climbed);
    std::iter::once("crate".to_owned()).chain(rest).collect()
}

fn is_name(text: &str) -> bool {
    text.starts_with(|c: char| c.is_alphabetic() || c == '_')
}

/// Identifiers, `::` and single signs of a source, without comments and literals.
fn tokens(source: &str) -> Vec<Token> {
    let chars: Vec<char> = source.chars().collect();
    let mut tokens = Vec::new();
    let (mut at, mut line) = (0, 1);
    while at < chars.len() {
        let end = token_end(&chars, at);
        let text: String = chars[at..end].iter().collect();
        let kept = is_name(&text) && !text.contains('"') || text == "::";
        if kept || text.len() == 1 && text.chars().all(|c| c.is_ascii_punctuation()) {
            tokens.push(Token {
                text: text.trim_start_matches("r#").to_owned(),
                line,
            });
        }
        line += chars[at..end].iter().filter(|&&c| c == '\n').count();
        at = end;
    }
    tokens
}

/// The end of the token, comment, literal or blank that begins at `at`.
fn token_end(chars: &[char], at: usize) -> usize {
    let rest = &chars[at..];
    let is_word = |c: &char| c.is_alphanumeric() || *c == '_';
    match rest {
        ['/', '/', ..] => at + rest.iter().take_while(|&&c| c != '\n').count(),
        ['/', '*', ..] => at + block_comment(rest),
        ['"', ..] | ['b' | 'c', '"', ..] => at + quoted(rest),
        ['r', '#', c, ..] if is_word(c) => {
            at + 2 + rest[2..].iter().take_while(|c| is_word(c)).count()
        }
        ['r', '"' | '#', ..] => at + raw(rest),
        ['b' | 'c', 'r', '"' | '#', ..] => at + 1 + raw(&rest[1..]),
        ['\'', '\\', ..] => {
            at + 2 + rest[2..].iter().skip(1).take_while(|&&c| c != '\'').count() + 2
        }
        ['\'', _, '\'', ..] => at + 3,
        [':', ':', ..] => at + 2,
        [c, ..] if is_word(c) => at + rest.iter().take_while(|c| is_word(c)).count(),
        _ => at + 1,
    }
    .min(chars.len())
}

fn block_comment(rest: &[char]) -> usize {
    let (mut depth, mut at) = (0, 0);
    while at < rest.len() {
        match &rest[at..] {
            ['/', '*', ..] => (depth, at) = (depth + 1, at + 2),
            ['*', '/', ..] => (depth, at) = (depth - 1, at + 2),
            _ => at += 1,
        }
        if depth == 0 {
            break;
        }
    }
    at
}

fn quoted(rest: &[char]) -> usize {
    let mut at = 1 + rest.iter().take_while(|&&c| c != '"').count();
    while at < rest.len() && rest[at] != '"' {
        at += 1 + usize::from(rest[at] == '\\');
    }
    at + 1
}

fn raw(rest: &[char]) -> usize {
    let hashes = rest[1..].iter().take_while(|&&c| c == '#').count();
    let mut at = hashes + 2;
    while at < rest.len() {
        let closes = rest[at] == '"' && rest[at + 1..].iter().take(hashes).all(|&c| c == '#');
        at += 1;
        if closes {
            return at + hashes;
        }
    }
    at
}
