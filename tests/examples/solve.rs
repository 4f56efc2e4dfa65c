//! Takes a reference case and prints our result for it, in the reference's own form.
//!
//! `cargo run --release -p strikeline-tests --example solve -- case.json`

use std::process::ExitCode;

fn main() -> ExitCode {
    let Some(path) = std::env::args().nth(1) else {
        eprintln!("a case file is wanted: solve case.json");
        return ExitCode::from(2);
    };
    let result = std::fs::read_to_string(&path)
        .map_err(|e| e.to_string())
        .and_then(|text| strikeline_tests::case::read(&text).map_err(|e| e.to_string()))
        .and_then(|file| file.case.solve());
    match result {
        Ok(value) => {
            println!("{value}");
            ExitCode::SUCCESS
        }
        Err(message) => {
            eprintln!("{path}: {message}");
            ExitCode::from(2)
        }
    }
}
