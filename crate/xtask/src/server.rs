//! A static server for one folder on 127.0.0.1.

use std::io::{BufRead, BufReader, Write};
use std::net::{Ipv4Addr, TcpListener, TcpStream};
use std::path::{Component, Path, PathBuf};

/// How many ports after a busy one are tried.
const MORE_PORTS: u16 = 20;

/// A folder, ready to be served.
pub struct Server {
    listener: TcpListener,
    folder: PathBuf,
}

impl Server {
    /// On `port`, or on the next free one; 0 for any.
    ///
    /// # Errors
    /// A sentence, if no port is free.
    pub fn bind(folder: &Path, port: u16) -> Result<Self, String> {
        for next in port..=port.saturating_add(MORE_PORTS) {
            match TcpListener::bind((Ipv4Addr::LOCALHOST, next)) {
                Ok(listener) => return Ok(Self { listener, folder: folder.to_path_buf() }),
                Err(error) => crate::say(&format!("port {next} cannot be had ({error}); trying the next")),
            }
        }
        Err(format!("no port from {port} on is free; choose another with --port N"))
    }

    /// Where it can be reached.
    pub fn address(&self) -> String {
        let port = self.listener.local_addr().map_or(0, |a| a.port());
        format!("http://127.0.0.1:{port}/")
    }

    /// Serves until the process ends.
    pub fn serve(self) {
        for stream in self.listener.incoming().flatten() {
            let folder = self.folder.clone();
            std::thread::spawn(move || {
                // A browser that goes away in the middle is no fault.
                let _ = answer(stream, &folder);
            });
        }
    }
}

fn answer(mut stream: TcpStream, folder: &Path) -> std::io::Result<()> {
    let mut line = String::new();
    let mut reader = BufReader::new(stream.try_clone()?);
    reader.read_line(&mut line)?;
    let mut header = String::new();
    while reader.read_line(&mut header)? > 2 {
        header.clear();
    }
    let target = line.split_whitespace().nth(1).unwrap_or("/");
    let wanted = target.split(['?', '#']).next().unwrap_or("/").trim_start_matches('/');
    let wanted = Path::new(if wanted.is_empty() { "index.html" } else { wanted });
    let inside = wanted.components().all(|c| matches!(c, Component::Normal(_)));
    let body = if inside { std::fs::read(folder.join(wanted)).ok() } else { None };
    let kind = match wanted.extension().and_then(|e| e.to_str()) {
        Some("html") => "text/html; charset=utf-8",
        Some("js") => "text/javascript",
        Some("wasm") => "application/wasm",
        Some("css") => "text/css",
        Some("svg") => "image/svg+xml",
        Some("json" | "webmanifest") => "application/json",
        _ => "application/octet-stream",
    };
    let (status, body) = match body {
        Some(body) => ("200 OK", body),
        None => ("404 Not Found", Vec::new()),
    };
    write!(
        stream,
        "HTTP/1.1 {status}\r\nContent-Type: {kind}\r\nContent-Length: {}\r\nCache-Control: no-cache\r\nConnection: close\r\n\r\n",
        body.len()
    )?;
    stream.write_all(&body)
}
