//! What the builds need beyond cargo, brought when it is missing.

use std::ffi::OsString;
use std::process::Command;

use crate::{root, run, say};

/// The bundler; Trunk.toml asks for the same.
const TRUNK: &str = "0.21.14";

/// The output of a command that succeeds.
fn output(program: &str, arguments: &[&str], path: Option<&OsString>) -> Option<String> {
    let mut command = Command::new(program);
    command.args(arguments);
    if let Some(path) = path {
        command.env("PATH", path);
    }
    let output = command.output().ok().filter(|o| o.status.success())?;
    Some(String::from_utf8_lossy(&output.stdout).into_owned())
}

fn debian_root() -> bool {
    // Not its descendants: not every one has these packages under these names.
    std::fs::read_to_string("/etc/os-release").is_ok_and(|text| text.lines().any(|line| line == "ID=debian"))
        && output("id", &["-u"], None).is_some_and(|id| id.trim() == "0")
}

/// Installs Debian packages as root, or says what to install.
fn packages(names: &[&str], why: &str) -> Result<(), String> {
    if !debian_root() {
        return Err(format!("{why} is missing: install {} (Debian names) and try again", names.join(" ")));
    }
    say(&format!("installing {} ({why})", names.join(", ")));
    run(Command::new("apt-get").args(["update", "-q"]))?;
    let mut install = Command::new("apt-get");
    install
        .args(["install", "-y", "-q", "--no-install-recommends"])
        .args(names)
        .env("DEBIAN_FRONTEND", "noninteractive");
    run(&mut install)
}

/// The wasm32 target.
pub fn target() -> Result<(), String> {
    let installed = output("rustup", &["target", "list", "--installed"], None).unwrap_or_default();
    if installed.lines().any(|t| t.trim() == "wasm32-unknown-unknown") {
        return Ok(());
    }
    say("adding the wasm32 target");
    run(Command::new("rustup").args(["target", "add", "wasm32-unknown-unknown"]))
}

/// The checkers that a minimal toolchain lacks.
pub fn checkers() -> Result<(), String> {
    for (program, component) in [("cargo-fmt", "rustfmt"), ("cargo-clippy", "clippy")] {
        if output(program, &["--version"], None).is_none() {
            say(&format!("adding {component}"));
            run(Command::new("rustup").args(["component", "add", component]))?;
        }
    }
    Ok(())
}

/// wasm-bindgen's version in Cargo.lock.
fn bindgen_version() -> Result<String, String> {
    let lock = std::fs::read_to_string(root().join("Cargo.lock")).map_err(|e| format!("Cargo.lock: {e}"))?;
    let mut lines = lock.lines();
    lines.find(|l| *l == "name = \"wasm-bindgen\"").ok_or("wasm-bindgen is not in Cargo.lock")?;
    let version =
        lines.next().and_then(|l| l.split('"').nth(1)).ok_or("Cargo.lock: no version of wasm-bindgen")?;
    let wanted = format!("wasm_bindgen = \"{version}\"");
    let trunk = std::fs::read_to_string(root().join("Trunk.toml")).map_err(|e| format!("Trunk.toml: {e}"))?;
    if !trunk.lines().any(|line| line.trim() == wanted) {
        return Err(format!("Trunk.toml: its tools must say {wanted}, the version in Cargo.lock"));
    }
    Ok(version.to_string())
}

/// Brings target, Trunk and wasm-bindgen; the PATH on which they are found.
///
/// They go into target/tools/, so that nothing of the machine's own is changed and a second start installs
/// nothing. One found on the PATH in the right version is used as it is.
pub fn bring() -> Result<OsString, String> {
    if output("cc", &["--version"], None).is_none() && cfg!(unix) {
        packages(&["gcc", "libc6-dev"], "a C compiler, which links Rust programs")?;
    }
    target()?;
    let folder = root().join("target/tools");
    let old = std::env::var_os("PATH").unwrap_or_default();
    let mut places = vec![folder.join("bin")];
    places.extend(std::env::split_paths(&old));
    let path = std::env::join_paths(places).map_err(|e| e.to_string())?;
    let bindgen = bindgen_version()?;
    let has = |program: &str, version: &str| {
        output(program, &["--version"], Some(&path))
            .is_some_and(|text| text.split_whitespace().any(|w| w == version))
    };
    let install = |arguments: &[&str]| {
        let mut command = Command::new("cargo");
        command.arg("install").args(arguments).arg("--root").arg(&folder).env_remove("CARGO_TARGET_DIR");
        run(&mut command)
    };
    if !has("wasm-bindgen", &bindgen) {
        say(&format!("installing wasm-bindgen {bindgen} (about two minutes, once)"));
        // Without --locked: its own lock names a crate that is not to be had any more.
        install(&["wasm-bindgen-cli", "--version", &bindgen, "--debug"])?;
    }
    if !has("trunk", TRUNK) {
        say(&format!("installing Trunk {TRUNK} (about four minutes, once)"));
        install(&["trunk", "--version", TRUNK, "--locked", "--no-default-features", "--debug"])?;
    }
    Ok(path)
}

/// A browser and its driver.
pub fn browser() -> Result<(), String> {
    let there = ["chromium", "chromedriver"].iter().all(|p| output(p, &["--version"], None).is_some());
    if there {
        Ok(())
    } else {
        packages(&["chromium", "chromium-driver", "fonts-dejavu-core"], "a browser to test the page in")
    }
}
