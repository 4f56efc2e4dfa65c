//! A static server for one folder on 127.0.0.1: GET and HEAD of plain files, and nothing more.
//!
//! A path that leaves the folder is not found. Nothing is kept by the browser, so that a rebuilt page is what is
//! seen. One thread per connection, each closed after its answer.

use std::io::{BufRead, BufReader, ErrorKind, Read, Write};
use std::net::{Ipv4Addr, TcpListener, TcpStream};
use std::path::{Component, Path, PathBuf};
use std::time::Duration;

/// The longest request that is read, in bytes; the browser's own stay far below.
const LONGEST_REQUEST: u64 = 64 * 1024;

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
    /// A sentence, if no port is free or this machine does not give one.
    pub fn bind(folder: &Path, port: u16) -> Result<Self, String> {
        for next in port..=port.saturating_add(MORE_PORTS) {
            match TcpListener::bind((Ipv4Addr::LOCALHOST, next)) {
                Ok(listener) => return Ok(Self { listener, folder: folder.to_path_buf() }),
                Err(error) if error.kind() == ErrorKind::AddrInUse => {
                    crate::say(&format!("port {next} is in use by another program; trying the next"));
                }
                Err(error) => return Err(format!("port {next} on 127.0.0.1 cannot be opened: {error}")),
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

fn answer(stream: TcpStream, folder: &Path) -> std::io::Result<()> {
    stream.set_read_timeout(Some(Duration::from_secs(10)))?;
    let mut reader = BufReader::new((&stream).take(LONGEST_REQUEST));
    let mut line = String::new();
    reader.read_line(&mut line)?;
    let mut header = String::new();
    while reader.read_line(&mut header)? > 2 {
        header.clear();
    }
    let mut words = line.split_whitespace();
    let (method, target) = (words.next().unwrap_or(""), words.next().unwrap_or(""));
    let known = matches!(method, "GET" | "HEAD");
    let found = file(folder, target).filter(|_| known).and_then(|f| Some((kind(&f), std::fs::read(f).ok()?)));
    let (status, kind, body) = match found {
        Some((kind, body)) => ("200 OK", kind, body),
        None if known => ("404 Not Found", TEXT, b"There is no such file.\n".to_vec()),
        None => ("405 Method Not Allowed", TEXT, b"Only GET and HEAD.\n".to_vec()),
    };
    let mut out = &stream;
    write!(
        out,
        "HTTP/1.1 {status}\r\nContent-Type: {kind}\r\nContent-Length: {}\r\nCache-Control: no-store\r\n\
         X-Content-Type-Options: nosniff\r\nConnection: close\r\n\r\n",
        body.len()
    )?;
    if method != "HEAD" {
        out.write_all(&body)?;
    }
    out.flush()
}

/// The file that a request names, if it is inside `folder`; the page's names need no percent signs.
fn file(folder: &Path, target: &str) -> Option<PathBuf> {
    let name = target.split(['?', '#']).next()?.strip_prefix('/')?;
    let name = Path::new(if name.is_empty() { "index.html" } else { name });
    let inside = name.components().all(|part| matches!(part, Component::Normal(_)));
    inside.then(|| folder.join(name))
}

const TEXT: &str = "text/plain; charset=utf-8";

/// The media type by the end of the name.
fn kind(file: &Path) -> &'static str {
    match file.extension().and_then(|end| end.to_str()) {
        Some("html") => "text/html; charset=utf-8",
        Some("js" | "mjs") => "text/javascript; charset=utf-8",
        Some("wasm") => "application/wasm",
        Some("css") => "text/css; charset=utf-8",
        Some("svg") => "image/svg+xml",
        Some("png") => "image/png",
        Some("json") => "application/json",
        Some("webmanifest") => "application/manifest+json",
        Some("txt" | "md") => TEXT,
        _ => "application/octet-stream",
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn exact_only_files_inside_the_folder() {
        let folder = Path::new("dist");
        assert_eq!(file(folder, "/"), Some(folder.join("index.html")));
        assert_eq!(file(folder, "/a.js?v=1"), Some(folder.join("a.js")));
        for outside in ["/../Cargo.toml", "//etc/passwd", "/a/../../b", "a.js", "", "/./../x"] {
            assert_eq!(file(folder, outside), None, "{outside}");
        }
    }

    #[test]
    fn exact_a_busy_port_leads_to_a_later_one() {
        let taken = TcpListener::bind((Ipv4Addr::LOCALHOST, 0)).expect("a free port");
        let port = taken.local_addr().expect("its address").port();
        let server = Server::bind(Path::new("dist"), port).expect("one of the twenty after it");
        let found = server.listener.local_addr().expect("its address").port();
        assert!(found > port && found <= port + MORE_PORTS, "{found} after {port}");
    }

    #[test]
    fn exact_status_type_and_length() {
        let folder = std::env::temp_dir().join(format!("strikeline-server-{}", std::process::id()));
        std::fs::create_dir_all(&folder).expect("a folder");
        std::fs::write(folder.join("a.wasm"), [0, 1, 2]).expect("a file");
        let server = Server::bind(&folder, 0).expect("a free port");
        let host = server.listener.local_addr().expect("its address");
        std::thread::spawn(move || server.serve());
        let ask = |request: &str| {
            let mut stream = TcpStream::connect(host).expect("it listens");
            stream.write_all(request.as_bytes()).expect("it reads");
            let mut reply = Vec::new();
            stream.read_to_end(&mut reply).expect("it answers");
            String::from_utf8_lossy(&reply).into_owned()
        };
        let found = ask("GET /a.wasm HTTP/1.1\r\nHost: x\r\n\r\n");
        assert!(found.starts_with("HTTP/1.1 200 "), "{found}");
        assert!(found.contains("Content-Type: application/wasm\r\nContent-Length: 3\r\n"), "{found}");
        assert!(found.ends_with("\r\n\r\n\0\x01\x02"), "{found}");
        assert!(ask("HEAD /a.wasm HTTP/1.1\r\n\r\n").ends_with("\r\n\r\n"));
        assert!(ask("GET /b HTTP/1.1\r\n\r\n").starts_with("HTTP/1.1 404 "));
        assert!(ask("POST /a.wasm HTTP/1.1\r\n\r\n").starts_with("HTTP/1.1 405 "));
        std::fs::remove_dir_all(&folder).expect("it was made here");
    }
}
