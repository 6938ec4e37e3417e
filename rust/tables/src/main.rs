//! Regenerates the committed tables from checksummed sources.
//!
//! `hourarc-tables iau [--check] --source PATH`; with `--check` nothing is written, and a table that is
//! not what its source gives is a failure.

mod iau;

use std::path::Path;
use std::process::ExitCode;

fn main() -> ExitCode {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let words: Vec<&str> = arguments.iter().map(String::as_str).collect();
    let outcome = match words[..] {
        ["iau", "--source", path] => iau::run(false, Path::new(path)),
        ["iau", "--check", "--source", path] => iau::run(true, Path::new(path)),
        _ => Err("usage: hourarc-tables iau [--check] --source PATH".to_string()),
    };
    match outcome {
        Ok(()) => ExitCode::SUCCESS,
        Err(message) => {
            eprintln!("hourarc-tables: {message}");
            ExitCode::FAILURE
        }
    }
}
