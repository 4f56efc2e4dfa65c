//! Every check, in the order in which a fault is cheapest to find.

use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::Command;
use std::time::Instant;

use crate::server::Server;
use crate::{cargo, root, run, say, tools};

/// What the download may weigh compressed, in bytes.
const BUDGET: usize = 350_000;

/// Runs every check; all of them, also after one has failed.
pub fn all() -> Result<(), String> {
    let begin = Instant::now();
    let mut failed = Vec::new();
    let mut passed = 0;
    let mut step = |name: &str, done: &mut dyn FnMut() -> Result<(), String>| {
        say(name);
        let from = Instant::now();
        match done() {
            Ok(()) => passed += 1,
            Err(message) => {
                eprintln!("{name}: {message}");
                failed.push(name.to_string());
            }
        }
        println!("   {:.0} s", from.elapsed().as_secs_f64());
    };
    step("tools for the checks", &mut || tools::checkers().and_then(|()| tools::target()));
    step("format", &mut || cargo(&["fmt", "--all", "--check"]));
    let strict = ["--", "-D", "warnings"];
    step("lints, native", &mut || {
        let mut arguments = vec!["clippy", "--locked", "--workspace", "--all-targets", "--all-features"];
        arguments.extend(strict);
        cargo(&arguments)
    });
    step("lints, wasm32", &mut || {
        let mut arguments =
            vec!["clippy", "--locked", "-p", "strikeline-page", "--target", "wasm32-unknown-unknown"];
        arguments.extend(strict);
        cargo(&arguments)
    });
    step("unit, reference and documentation tests", &mut || {
        cargo(&["test", "--locked", "--workspace", "--no-fail-fast"])
    });
    step("documentation without warnings", &mut || {
        let mut command = Command::new("cargo");
        command.args(["doc", "--locked", "--workspace", "--no-deps", "--document-private-items"]);
        run(command.env("RUSTDOCFLAGS", "-D warnings"))
    });
    let mut page = None;
    step("the page", &mut || {
        page = Some(crate::build()?);
        Ok(())
    });
    // An older page may lie there; it is not the one to judge.
    let built = page.as_deref().ok_or("not run: the page could not be built");
    step("size of the download", &mut || size(built?));
    step("the page in a browser", &mut || in_browser(built?));
    step("the charge's speed", &mut || {
        cargo(&["run", "--release", "--locked", "-q", "-p", "strikeline-tests", "--example", "bench"])
    });
    println!("{passed} passed, {} failed", failed.len());
    println!("   {:.0} s in all", begin.elapsed().as_secs_f64());
    if failed.is_empty() { Ok(()) } else { Err(format!("failed: {}", failed.join(", "))) }
}

/// Prints the compressed size of the download, file by file; an error above the budget.
fn size(folder: &Path) -> Result<(), String> {
    let mut total = 0;
    for file in files(folder)? {
        let bytes = std::fs::read(&file).map_err(|e| format!("{}: {e}", file.display()))?;
        let mut packer = flate2::write::GzEncoder::new(Vec::new(), flate2::Compression::best());
        packer.write_all(&bytes).map_err(|e| e.to_string())?;
        let packed = packer.finish().map_err(|e| e.to_string())?.len();
        total += packed;
        let name = file.strip_prefix(folder).unwrap_or(&file);
        println!("   {:>9} bytes, {packed:>8} compressed: {}", bytes.len(), name.display());
    }
    println!("   download: {:.1} kB compressed (gzip), budget {} kB", total as f64 / 1e3, BUDGET / 1000);
    match total {
        0 => Err("there is nothing to download".into()),
        _ if total > BUDGET => Err(format!("{total} bytes are more than {BUDGET}")),
        _ => Ok(()),
    }
}

/// Every file below a folder, in order of name.
fn files(folder: &Path) -> Result<Vec<PathBuf>, String> {
    let failed = |error: std::io::Error| format!("{}: {error}", folder.display());
    let mut found = Vec::new();
    for entry in std::fs::read_dir(folder).map_err(failed)? {
        let path = entry.map_err(failed)?.path();
        if path.is_dir() { found.extend(files(&path)?) } else { found.push(path) }
    }
    found.sort();
    Ok(found)
}

/// Serves the page and runs the browser tests on it.
fn in_browser(folder: &Path) -> Result<(), String> {
    tools::browser()?;
    let server = Server::bind(folder, 8090)?;
    let address = server.address();
    std::thread::spawn(move || server.serve());
    let mut command = Command::new("cargo");
    command.args([
        "test",
        "--locked",
        "-p",
        "strikeline-tests",
        "--features",
        "browser",
        "--test",
        "browser",
    ]);
    command.args(["--", "--nocapture", "--test-threads", "1"]);
    run(command.env("STRIKELINE_PAGE", address))
}

/// Pictures of the page: desktop and phone, light and dark, and the print.
pub fn shots(folder: &Path) -> Result<(), String> {
    tools::browser()?;
    let server = Server::bind(folder, 8090)?;
    let address = server.address();
    std::thread::spawn(move || server.serve());
    say("taking the pictures");
    let mut command = Command::new("cargo");
    command.args(["run", "--locked", "-q", "-p", "strikeline-tests", "--features", "browser"]);
    command.args(["--example", "shots", "--"]).arg(root().join("target/shots"));
    run(command.env("STRIKELINE_PAGE", address))
}
