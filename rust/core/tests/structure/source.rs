//! As much of Rust's grammar as it takes to see which paths a file uses.

/// A word or a mark of the source; comments, strings, characters and lifetimes are left out.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Token<'a> {
    pub text: &'a str,
    pub line: usize,
}

pub fn tokens(source: &str) -> Vec<Token<'_>> {
    let mut found = Vec::new();
    let mut rest = source;
    while let Some(first) = rest.chars().next() {
        let length = if rest.starts_with("//") {
            rest.find('\n').unwrap_or(rest.len())
        } else if rest.starts_with("/*") {
            comment_length(rest)
        } else if let Some(length) = string_length(rest) {
            length
        } else if first == '\'' {
            quote_length(rest)
        } else if first.is_whitespace() {
            first.len_utf8()
        } else {
            let raw = if rest.starts_with("r#") { 2 } else { 0 };
            let word = rest[raw..]
                .find(|c: char| !(c.is_alphanumeric() || c == '_'))
                .map_or(rest.len(), |length| raw + length);
            let length = match word - raw {
                0 if rest.starts_with("::") => 2,
                0 => first.len_utf8(),
                _ => word,
            };
            let line = source[..source.len() - rest.len()].matches('\n').count() + 1;
            found.push(Token { text: &rest[..length], line });
            length
        };
        rest = &rest[length..];
    }
    found
}

fn comment_length(rest: &str) -> usize {
    let (mut depth, mut at) = (0, 0);
    while at < rest.len() {
        if rest[at..].starts_with("/*") {
            (depth, at) = (depth + 1, at + 2);
        } else if rest[at..].starts_with("*/") {
            (depth, at) = (depth - 1, at + 2);
            if depth == 0 {
                return at;
            }
        } else {
            at += rest[at..].chars().next().map_or(1, char::len_utf8);
        }
    }
    rest.len()
}

/// Length of the string literal, of any kind, that the text begins with.
fn string_length(rest: &str) -> Option<usize> {
    let prefix = ["br", "cr", "b", "c", "r", ""].into_iter().find(|prefix| {
        let after = rest.strip_prefix(prefix).unwrap_or("");
        let hashes = if prefix.ends_with('r') { after.trim_start_matches('#') } else { after };
        hashes.starts_with('"')
    })?;
    let body = &rest[prefix.len()..];
    if prefix.ends_with('r') {
        let hashes = body.len() - body.trim_start_matches('#').len();
        let end = format!("\"{}", "#".repeat(hashes));
        let start = hashes + 1;
        return Some(body[start..].find(&end).map_or(rest.len(), |at| prefix.len() + start + at + end.len()));
    }
    let mut escaped = false;
    for (at, c) in body.char_indices().skip(1) {
        match c {
            _ if escaped => escaped = false,
            '\\' => escaped = true,
            '"' => return Some(prefix.len() + at + 1),
            _ => {}
        }
    }
    Some(rest.len())
}

/// Length of a character, `'a'` or `'\n'`, or of the mark of a lifetime, `'a`.
fn quote_length(rest: &str) -> usize {
    let mut characters = rest.char_indices().skip(1);
    match characters.next() {
        Some((_, '\\')) => {
            characters.next();
            characters.find(|&(_, c)| c == '\'').map_or(rest.len(), |(at, _)| at + 1)
        }
        Some((_, _)) => match characters.next() {
            Some((at, '\'')) => at + 1,
            _ => rest[1..].find(|c: char| !(c.is_alphanumeric() || c == '_')).map_or(rest.len(), |at| at + 1),
        },
        None => 1,
    }
}

/// A path as it is written, one for each leaf of a braced tree, and where it stands.
#[derive(Debug, PartialEq)]
pub struct Written<'a> {
    pub segments: Vec<&'a str>,
    /// The inline modules it stands in.
    pub within: Vec<&'a str>,
    /// Whether one of them is compiled for tests only.
    pub in_tests: bool,
    pub line: usize,
}

/// Everything the rules want to know of a file.
pub fn paths<'a>(tokens: &[Token<'a>]) -> Vec<Written<'a>> {
    let text = |at: usize| tokens.get(at).map_or("", |token| token.text);
    let mut found = Vec::new();
    // One entry an open brace: the module it opens, if it opens one, and whether that is for tests.
    let mut open: Vec<(Option<&str>, bool)> = Vec::new();
    let mut at = 0;
    while at < tokens.len() {
        match text(at) {
            "{" => {
                let module = (at >= 2 && text(at - 2) == "mod").then(|| text(at - 1));
                open.push((module, module.is_some() && is_for_tests(tokens, at - 2)));
            }
            "}" => {
                open.pop();
            }
            _ if text(at + 1) == "::" && is_word(text(at)) && (at == 0 || text(at - 1) != "::") => {
                let within: Vec<&str> = open.iter().filter_map(|(module, _)| *module).collect();
                let in_tests = open.iter().any(|&(_, tests)| tests);
                let (line, mut leaves) = (tokens[at].line, Vec::new());
                at = leaves_of_tree(tokens, at, &[], &mut leaves);
                found.extend(leaves.into_iter().map(|segments| Written {
                    segments,
                    within: within.clone(),
                    in_tests,
                    line,
                }));
                continue;
            }
            _ => {}
        }
        at += 1;
    }
    found
}

/// Collects the paths of a tree that begins at a token; returns the first token after it.
fn leaves_of_tree<'a>(
    tokens: &[Token<'a>],
    mut at: usize,
    before: &[&'a str],
    leaves: &mut Vec<Vec<&'a str>>,
) -> usize {
    let text = |at: usize| tokens.get(at).map_or("", |token| token.text);
    let mut path = before.to_vec();
    loop {
        match text(at) {
            "{" => {
                at += 1;
                while !matches!(text(at), "}" | "") {
                    if is_word(text(at)) || matches!(text(at), "*" | "{") {
                        at = leaves_of_tree(tokens, at, &path, leaves);
                    } else {
                        at += 1;
                    }
                }
                return at + 1;
            }
            segment if is_word(segment) || segment == "*" => {
                path.push(segment);
                at += 1;
                // A turbofish ends the path that names modules.
                if text(at) != "::" || text(at + 1) == "<" {
                    break;
                }
                at += 1;
            }
            _ => break,
        }
    }
    // `as` gives a leaf a name of its own.
    at += if text(at) == "as" { 2 } else { 0 };
    leaves.push(path);
    at
}

fn is_word(text: &str) -> bool {
    text.chars().next().is_some_and(|c| c.is_alphanumeric() || c == '_')
}

/// Whether `#[cfg(test)]` stands directly before the `mod` at a token.
pub fn is_for_tests(tokens: &[Token<'_>], module: usize) -> bool {
    let attribute = ["#", "[", "cfg", "(", "test", ")", "]"];
    module >= attribute.len()
        && tokens[module - attribute.len()..module].iter().map(|token| token.text).eq(attribute)
}

/// The module that a file of the crate is, by its path below `src`.
pub fn module_of(file: &str) -> Vec<&str> {
    let mut module: Vec<&str> = file.trim_end_matches(".rs").split('/').collect();
    if matches!(module.last(), Some(&("mod" | "lib"))) {
        module.pop();
    }
    module
}

/// The path from the root of the crate, or none if it leads to another crate or is relative.
pub fn from_root<'a>(written: &Written<'a>, module: &[&'a str]) -> Option<Vec<&'a str>> {
    let mut base: Vec<&str> = module.iter().chain(&written.within).copied().collect();
    let mut segments = written.segments.as_slice();
    match *segments.first()? {
        "crate" => {
            base.clear();
            segments = &segments[1..];
        }
        "self" => segments = &segments[1..],
        "super" => {}
        _ => return None,
    }
    while let Some((&"super", rest)) = segments.split_first() {
        base.pop();
        segments = rest;
    }
    base.extend(segments.iter().filter(|&&segment| segment != "self"));
    Some(base)
}
