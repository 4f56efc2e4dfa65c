//! The project's own commands: `serve`, `test`, `build`, `bench`, `shots`.
//!
//! They bring what is missing, say what they are doing, and use nothing that a machine with rustup and a C
//! compiler does not have or cannot fetch through cargo, rustup or (on Debian, as root) apt-get.

mod check;
mod finish;
mod server;
mod tools;

use std::path::PathBuf;
use std::process::{Command, ExitCode};

const USAGE: &str = "\
cargo xtask serve [--port N] [--no-open]   build the page and serve it on 127.0.0.1
cargo xtask test                           every check, the same by hand and in CI
cargo xtask build                          the static folder dist/
cargo xtask bench                          times one charge, natively
cargo xtask shots                          pictures of the page into target/shots/";

fn main() -> ExitCode {
    let words: Vec<String> = std::env::args().skip(1).collect();
    let words: Vec<&str> = words.iter().map(String::as_str).collect();
    let done = match words.as_slice() {
        ["serve", options @ ..] => serve(options),
        ["test"] => check::all(),
        ["build"] => build().map(|folder| say(&format!("the page stands in {}", folder.display()))),
        ["bench"] => cargo(&["run", "--release", "--locked", "-p", "strikeline-tests", "--example", "bench"]),
        ["shots"] => build().and_then(|folder| check::shots(&folder)),
        _ => Err(USAGE.into()),
    };
    match done {
        Ok(()) => ExitCode::SUCCESS,
        Err(message) => {
            eprintln!("{message}");
            ExitCode::FAILURE
        }
    }
}

/// Says what is being done.
pub fn say(text: &str) {
    println!("== {text}");
}

/// The top folder of the project: the one that cargo runs in now, also when it was moved after this was built.
pub fn root() -> PathBuf {
    let now = std::env::var_os("CARGO_MANIFEST_DIR").map(PathBuf::from);
    let then = PathBuf::from(env!("CARGO_MANIFEST_DIR"));
    let here = now.filter(|folder| folder.ends_with("crate/xtask")).unwrap_or(then);
    here.ancestors().nth(2).map_or(here.clone(), std::path::Path::to_path_buf)
}

/// Runs a command in the top folder; an error if it fails.
pub fn run(command: &mut Command) -> Result<(), String> {
    let name = command.get_program().to_string_lossy().into_owned();
    match command.current_dir(root()).status() {
        Ok(status) if status.success() => Ok(()),
        Ok(status) => Err(format!("{name} failed ({status})")),
        Err(error) => Err(format!("{name} could not be started: {error}")),
    }
}

/// Runs cargo in the top folder.
pub fn cargo(arguments: &[&str]) -> Result<(), String> {
    run(Command::new("cargo").args(arguments))
}

/// Builds the page into dist/.
fn build() -> Result<PathBuf, String> {
    let path = tools::bring()?;
    say("building the page (release)");
    run(Command::new("trunk")
        .args(["build", "--release", "--locked"])
        .env("PATH", &path)
        .env_remove("NO_COLOR"))?;
    let folder = root().join("dist");
    finish::finish(&folder)?;
    Ok(folder)
}

fn serve(options: &[&str]) -> Result<(), String> {
    let (mut port, mut open) = (8080, true);
    let mut options = options.iter();
    while let Some(option) = options.next() {
        match *option {
            "--no-open" => open = false,
            "--port" => {
                let text = options.next().ok_or("--port wants a number")?;
                port = text
                    .parse()
                    .ok()
                    .filter(|port| *port > 0)
                    .ok_or(format!("--port {text}: accepted is 1 to 65535"))?;
            }
            other => return Err(format!("{other} is not an option\n{USAGE}")),
        }
    }
    let folder = build()?;
    let server = server::Server::bind(&folder, port)?;
    let address = server.address();
    say(&format!("Strikeline is at {address} (Ctrl+C ends it)"));
    if open {
        show(&address);
    }
    server.serve();
    Ok(())
}

/// Opens an address where there is a desktop.
fn show(address: &str) {
    let desktop = ["DISPLAY", "WAYLAND_DISPLAY"].iter().any(|name| std::env::var_os(name).is_some());
    let program = match std::env::consts::OS {
        "macos" => "open",
        "windows" => "explorer",
        _ if desktop => "xdg-open",
        _ => return,
    };
    // Without such a program the address still stands above.
    let _ = Command::new(program).arg(address).spawn();
}
