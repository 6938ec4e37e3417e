//! The rules. Each returns what is wrong with a file, in words.

use super::source::{Token, from_root, is_for_tests, module_of, paths, tokens};

/// The modules of the crate; each may use itself and those before it.
pub const ORDER: [&str; 13] = [
    "error",
    "constants",
    "math",
    "time",
    "earth",
    "ephemeris",
    "site",
    "refraction",
    "astrometry",
    "horizon",
    "events",
    "windows",
    "grid",
];

/// Parts of the standard library that reach outside the process.
const OUTSIDE: [&str; 6] = ["fs", "net", "env", "process", "io", "os"];
/// Macros that write where nobody asked, leave work undone, or read the build's surroundings.
const FORBIDDEN_MACROS: [&str; 11] = [
    "print",
    "println",
    "eprint",
    "eprintln",
    "dbg",
    "todo",
    "unimplemented",
    "include",
    "env",
    "option_env",
    "thread_local",
];
/// Types that make a `static` change while the program runs. `OnceLock` is not among them: what it holds
/// is a function of the source alone, worked out once.
const CHANGING: [&str; 6] = ["Mutex", "RwLock", "Cell", "RefCell", "UnsafeCell", "LazyCell"];

/// The one file with `unsafe`; its documentation says why.
pub const UNSAFE: &str = "math/dispatch.rs";
/// Lines a file may have. Committed tables of coefficients are written by a program and may be longer.
pub const LINES_MAX: usize = 600;
const TABLES: &str = "rust/core/src/earth/tables/";

fn rank(module: &str) -> Option<usize> {
    ORDER.iter().position(|&known| known == module)
}

/// A module may use itself and what stands above it, by whatever path.
pub fn order_faults(file: &str, source: &str) -> Vec<String> {
    let tokens = tokens(source);
    let module = module_of(file);
    let mut faults = Vec::new();
    for (at, token) in tokens.iter().enumerate() {
        let next = tokens.get(at + 1).map_or("", |token| token.text);
        let before = at.checked_sub(1).map_or("", |at| tokens[at].text);
        if token.text == "crate" && next != "::" && before != "(" {
            faults.push(format!("{file}:{}: gives the crate another name", token.line));
        }
        if token.text == "path" && before == "[" {
            faults.push(format!("{file}:{}: a module out of its place", token.line));
        }
    }
    let Some(&own) = module.first() else { return faults };
    let Some(own_rank) = rank(own) else {
        faults.push(format!("{file}: no module {own} in the order"));
        return faults;
    };
    for written in paths(&tokens) {
        let Some(used) = from_root(&written, &module) else { continue };
        match used.first().map(|&first| (first, rank(first))) {
            Some((_, Some(used_rank))) if used_rank <= own_rank => {}
            Some((first, Some(_))) => {
                faults.push(format!("{file}:{}: {own} uses {first}, which stands below it", written.line));
            }
            _ => faults.push(format!("{file}:{}: reaches into the root of the crate", written.line)),
        }
    }
    faults
}

/// No file, network, environment, process, clock or console; threads and the stopwatch only in `grid`,
/// which must ask its caller every so often whether to go on. Tests may do as they please.
pub fn purity_faults(file: &str, source: &str) -> Vec<String> {
    let tokens = tokens(source);
    let module = module_of(file);
    let mut faults = Vec::new();
    let mut fault = |line: usize, what: &str| faults.push(format!("{file}:{line}: {what}"));
    for (at, token) in tokens.iter().enumerate() {
        if token.text == "tests" && at > 0 && tokens[at - 1].text == "mod" && !is_for_tests(&tokens, at - 1) {
            fault(token.line, "tests that are compiled into the crate");
        }
    }
    if module.contains(&"tests") {
        return faults;
    }
    let in_grid = module.first() == Some(&"grid");
    for written in paths(&tokens).iter().filter(|written| !written.in_tests) {
        let [root, part, ..] = written.segments[..] else { continue };
        if !matches!(root, "std" | "core" | "alloc") {
            continue;
        }
        let timer = written.segments.get(2).is_some_and(|&item| matches!(item, "Duration" | "Instant"));
        if OUTSIDE.contains(&part)
            || part == "*"
            || part == "thread" && !in_grid
            || part == "time" && !(in_grid && timer)
        {
            fault(written.line, &format!("uses {}", written.segments.join("::")));
        }
    }
    let tests = test_lines(&tokens);
    for (at, token) in tokens.iter().enumerate() {
        if tests.iter().any(|lines| lines.contains(&token.line)) {
            continue;
        }
        let next = tokens.get(at + 1).map_or("", |token| token.text);
        match token.text {
            name if next == "!" && FORBIDDEN_MACROS.contains(&name)
                // `name != x` is no macro.
                && tokens.get(at + 2).is_some_and(|token| matches!(token.text, "(" | "[" | "{")) =>
            {
                fault(token.line, &format!("uses {name}!"));
            }
            "extern" => fault(token.line, "reaches for another crate or language"),
            "static" => {
                let declared = tokens[at..].iter().take_while(|token| !matches!(token.text, "=" | ";"));
                if next == "mut"
                    || declared
                        .map(|token| token.text)
                        .any(|name| CHANGING.contains(&name) || name.starts_with("Atomic"))
                {
                    fault(token.line, "a static that changes");
                }
            }
            _ => {}
        }
    }
    faults
}

/// The lines of the inline modules that are compiled for tests only.
fn test_lines(tokens: &[Token<'_>]) -> Vec<std::ops::RangeInclusive<usize>> {
    let mut found = Vec::new();
    for at in 2..tokens.len() {
        if tokens[at].text == "{" && tokens[at - 2].text == "mod" && is_for_tests(tokens, at - 2) {
            let mut depth = 0;
            let end = tokens[at..].iter().find(|token| {
                depth += match token.text {
                    "{" => 1,
                    "}" => -1,
                    _ => 0,
                };
                depth == 0
            });
            found.push(tokens[at].line..=end.map_or(usize::MAX, |token| token.line));
        }
    }
    found
}

pub fn unsafe_faults(file: &str, source: &str) -> Vec<String> {
    let tokens = tokens(source);
    let allowed = |at: usize| at >= 2 && tokens[at - 2].text == "allow";
    (0..tokens.len())
        .filter(|&at| tokens[at].text == "unsafe" || tokens[at].text == "unsafe_code" && allowed(at))
        .filter(|_| file != UNSAFE)
        .map(|at| format!("{file}:{}: unsafe outside {UNSAFE}", tokens[at].line))
        .collect()
}

/// Other crates that a manifest asks for, in the tables that end in `dependencies`.
pub fn dependencies(manifest: &str) -> Vec<&str> {
    let mut within = false;
    let mut found = Vec::new();
    for line in manifest.lines().map(str::trim) {
        if let Some(table) = line.strip_prefix('[') {
            let table = table.trim_end_matches(']');
            within = table.ends_with("dependencies");
            // [dependencies.name] names its crate in the header.
            found.extend(table.rsplit_once("dependencies.").map(|(_, name)| name));
        } else if within && !line.is_empty() && !line.starts_with('#') {
            found.extend(line.split(['=', '.']).next().map(str::trim));
        }
    }
    found
}

pub fn length_fault(file: &str, source: &str) -> Option<String> {
    let lines = source.lines().count();
    (lines > LINES_MAX && !file.starts_with(TABLES))
        .then(|| format!("{file}: {lines} lines, {LINES_MAX} at most"))
}
