//! What keeps the crate in shape: the order of its modules, its purity, where `unsafe` may stand, how
//! long a file may be. Each rule is tried on a bad sample too, so that none can pass by seeing nothing.

mod rules;
mod source;

use rules::*;
use source::tokens;
use std::fs;
use std::path::{Path, PathBuf};

fn root() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../..")
}

/// Files below a folder of the project with one of the endings: (path from that folder, text).
fn files(folder: &str, endings: &[&str]) -> Vec<(String, String)> {
    fn walk(folder: &Path, found: &mut Vec<PathBuf>) {
        for entry in fs::read_dir(folder).unwrap_or_else(|error| panic!("{}: {error}", folder.display())) {
            let path = entry.unwrap().path();
            let name = path.file_name().unwrap().to_string_lossy().into_owned();
            if path.is_dir() && !name.starts_with('.') && name != "target" {
                walk(&path, found);
            } else if path.is_file() {
                found.push(path);
            }
        }
    }
    let base = root().join(folder);
    let mut paths = Vec::new();
    if base.exists() {
        walk(&base, &mut paths);
    }
    paths.retain(|path| endings.iter().any(|ending| path.extension().is_some_and(|found| found == *ending)));
    paths.sort();
    let name = |path: &Path| path.strip_prefix(&base).unwrap().to_string_lossy().replace('\\', "/");
    paths.iter().map(|path| (name(path), fs::read_to_string(path).unwrap())).collect()
}

fn core_faults(rule: impl Fn(&str, &str) -> Vec<String>) -> Vec<String> {
    let sources = files("rust/core/src", &["rs"]);
    assert!(sources.len() > 50, "the crate has more than {} files", sources.len());
    sources.iter().flat_map(|(file, source)| rule(file, source)).collect()
}

fn none(faults: &[String]) {
    assert!(faults.is_empty(), "\n{}", faults.join("\n"));
}

#[test]
fn every_module_uses_only_those_above_it() {
    none(&core_faults(order_faults));
}

#[test]
fn the_root_declares_the_modules_of_the_order_and_nothing_else() {
    let source = fs::read_to_string(root().join("rust/core/src/lib.rs")).unwrap();
    let tokens = tokens(&source);
    let declared: Vec<&str> =
        tokens.windows(2).filter(|pair| pair[0].text == "mod").map(|pair| pair[1].text).collect();
    assert_eq!(declared, ORDER);
    assert!(!tokens.iter().any(|token| token.text == "use"), "the root hands nothing on under another name");
}

#[test]
fn nothing_reaches_outside_the_crate() {
    none(&core_faults(purity_faults));
    let core = fs::read_to_string(root().join("rust/core/Cargo.toml")).unwrap();
    assert_eq!(dependencies(&core), [] as [&str; 0], "the core depends on nothing");
    for folder in ["rust/core", "rust/py", "rust/tables"] {
        assert!(!root().join(folder).join("build.rs").exists(), "{folder}: no build script");
    }
}

#[test]
fn nothing_depends_on_the_tables() {
    for folder in ["rust/core", "rust/py"] {
        let manifest = fs::read_to_string(root().join(folder).join("Cargo.toml")).unwrap();
        assert!(!dependencies(&manifest).contains(&"hourarc-tables"), "{folder}");
    }
}

#[test]
fn unsafe_stands_in_one_file() {
    none(&core_faults(unsafe_faults));
}

#[test]
fn no_file_is_longer_than_it_should_be() {
    let mut faults = Vec::new();
    let mut seen = 0;
    for folder in ["rust", "python", "tests", "bench"] {
        for (file, source) in files(folder, &["rs", "py", "pyi"]) {
            faults.extend(length_fault(&format!("{folder}/{file}"), &source));
            seen += 1;
        }
    }
    assert!(seen > 50, "the project has more than {seen} files");
    none(&faults);
}

// ---------------------------------------------------------------------------------------------------
// The rules, tried on what they must find

fn lines(faults: &[String]) -> Vec<usize> {
    faults
        .iter()
        .map(|fault| fault.split(':').nth(1).and_then(|line| line.parse().ok()).unwrap_or(0))
        .collect()
}

#[test]
fn the_order_sees_every_way_up() {
    let source = r##"
        use crate::grid::Workers;
        use crate::{math::vector, events::{self, Arc}};
        use super::super::windows::Limits as Known;
        pub(in crate::earth) fn f() -> crate::horizon::Latitude { super::time::x::<crate::error::Status>() }
        //! [`crate::grid`] in a comment, /* crate::grid */
        const TEXT: &str = "crate::grid"; const RAW: &str = r#"crate::grid""#; const C: char = '"';
        mod inner { use super::super::nutation; use super::super::super::site::Site; fn g<'a>() {} }
        use crate::*;
        use crate as other;
        fn g() { self::super::super::refraction::none(); std::fs::read(crate::constants::TURN); }
        mod tests { use super::*; use super::super::*; }
        fn h() { <crate::windows::Limits as Default>::default(); }
        #[path = "../grid/mod.rs"] mod elsewhere;
    "##;
    // In earth/rotation.rs, where super is earth; twice on a line with two faults.
    let mut found = lines(&order_faults("earth/rotation.rs", source));
    found.sort_unstable();
    // Two on line 3 for the two leaves of the tree.
    assert_eq!(found, [2, 3, 3, 4, 5, 8, 9, 10, 11, 13, 14]);
    assert!(order_faults("grid/mod.rs", "use crate::windows::Limits; use super::events;").is_empty());
    assert_eq!(order_faults("planner.rs", "").len(), 1);
}

#[test]
fn purity_sees_every_way_out() {
    let source = r##"
        use std::{fmt, fs::File, sync::OnceLock};
        use std::io::Write as _;
        fn now() -> std::time::SystemTime { std::time::SystemTime::now() }
        fn wait() { std::thread::sleep(std::time::Duration::ZERO) }
        fn say(println: bool) { if println != true { println!("{}", 1) } dbg!(2); }
        static mut COUNT: u32 = 0;
        static LAST: Mutex<u32> = Mutex::new(0);
        static FIRST: std::sync::atomic::AtomicU32 = std::sync::atomic::AtomicU32::new(0);
        static TABLE: OnceLock<[f64; 3]> = OnceLock::new();
        fn text() -> &'static str { "std::fs::read; println!()" }
        mod tests { fn f() { std::env::args(); } }
        #[cfg(test)]
        mod tests { fn f() { std::env::args(); println!(); } }
        extern crate libc;
        thread_local! { static A: u8 = 0; }
    "##;
    let mut found = lines(&purity_faults("time/utc.rs", source));
    found.sort_unstable();
    assert_eq!(found, [2, 3, 4, 4, 5, 5, 6, 6, 7, 8, 9, 12, 12, 15, 16]);
    let timer = "use std::time::{Duration, Instant}; use std::thread; use std::time::SystemTime;";
    assert_eq!(purity_faults("grid/parallel.rs", timer).len(), 1);
    assert_eq!(purity_faults("horizon.rs", timer).len(), 4);
}

#[test]
fn unsafe_and_length_and_dependencies_are_seen() {
    let source =
        "fn f() { unsafe { g() } }\n#[allow(unsafe_code)] fn h() {}\n// unsafe\n#![deny(unsafe_code)]";
    assert_eq!(lines(&unsafe_faults("math/roots.rs", source)), [1, 2]);
    assert!(unsafe_faults(UNSAFE, source).is_empty());
    let long = "x\n".repeat(LINES_MAX + 1);
    assert!(length_fault("rust/core/src/horizon.rs", &long).is_some());
    assert!(length_fault("rust/core/src/earth/tables/planetary.rs", &long).is_none());
    assert!(length_fault("rust/core/src/horizon.rs", &long[2..]).is_none());
    let manifest = "[package]\nname = \"x\"\n[dependencies]\n# none\nnumpy = \"0.29\"\nrayon.workspace = true\n\
                    [target.'cfg(unix)'.dependencies.libc]\nversion = \"1\"\n[dev-dependencies]\nproptest = \"1\"\n\
                    [features]\ndefault = []\n";
    assert_eq!(dependencies(manifest), ["numpy", "rayon", "libc", "proptest"]);
}
