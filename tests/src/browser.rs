//! A Chromium of its own for the tests of the page, through its driver.
//!
//! Every browser has a new profile, so that nothing is kept from another one, and ends with its driver when it is
//! dropped, also when a test fails. A helper that cannot do its work panics and says what it looked for.

use std::io::{Read, Write};
use std::net::TcpStream;
use std::path::PathBuf;
use std::process::Child;
use std::time::Duration;

use fantoccini::wd::WebDriverCompatibleCommand;
use fantoccini::{Client, ClientBuilder, Locator};
use serde_json::{Value, json};

/// A browser with the page's address.
pub struct Browser {
    client: Client,
    driver: Child,
    port: u16,
    session: String,
    profile: PathBuf,
    address: String,
}

/// The colours that the visitor's system asks for.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Scheme {
    /// Dark on light.
    Light,
    /// Light on dark.
    Dark,
}

impl Browser {
    /// Starts one, 1400 px wide. `STRIKELINE_PAGE` must tell where the page is served.
    pub async fn start() -> Self {
        let address =
            std::env::var("STRIKELINE_PAGE").expect("STRIKELINE_PAGE tells where the page is served");
        let port = std::net::TcpListener::bind("127.0.0.1:0")
            .and_then(|l| l.local_addr())
            .expect("a free port")
            .port();
        let driver = std::process::Command::new("chromedriver")
            .arg(format!("--port={port}"))
            .stdout(std::process::Stdio::null())
            .spawn()
            .expect("chromedriver starts");
        let profile = std::env::temp_dir().join(format!("strikeline-{}-{port}", std::process::id()));
        let arguments = [
            "--headless",
            "--no-sandbox",
            "--disable-gpu",
            "--disable-quic",
            "--no-first-run",
            "--disable-background-networking",
            "--disable-component-update",
            "--disable-sync",
            "--hide-scrollbars",
            "--window-size=1400,1000",
            &format!("--user-data-dir={}", profile.display()),
        ];
        let wanted = json!({
            "goog:chromeOptions": { "args": arguments },
            "goog:loggingPrefs": { "browser": "ALL" },
        });
        let Value::Object(wanted) = wanted else { unreachable!("an object was written above") };
        let mut last = String::new();
        for _ in 0..100 {
            let mut builder = ClientBuilder::new(hyper_util::client::legacy::connect::HttpConnector::new());
            match builder.capabilities(wanted.clone()).connect(&format!("http://127.0.0.1:{port}")).await {
                Ok(client) => {
                    let session = client.session_id().await.expect("the session").unwrap_or_default();
                    return Self { client, driver, port, session, profile, address };
                }
                Err(error) => last = error.to_string(),
            }
            tokio::time::sleep(Duration::from_millis(100)).await;
        }
        panic!("no session with chromedriver: {last}");
    }

    /// Opens the page anew, with a fragment or "", nothing kept from before, and waits until it has computed.
    pub async fn open(&self, fragment: &str) {
        self.client.goto(&self.address).await.expect("the page");
        self.script("localStorage.clear()").await;
        // A fragment alone would not load the page anew.
        self.client.goto("about:blank").await.expect("a blank page");
        self.client.goto(&format!("{}{fragment}", self.address)).await.expect("the page");
        self.until("document.body.hasAttribute('data-chain-ms')").await;
    }

    /// What a script in the page returns.
    pub async fn script(&self, text: &str) -> Value {
        self.client.execute(text, vec![]).await.unwrap_or_else(|error| panic!("{text}: {error}"))
    }

    /// Waits until an expression in the page is true, 5 s at most.
    pub async fn until(&self, condition: &str) {
        for _ in 0..100 {
            if self.script(&format!("return Boolean({condition})")).await == json!(true) {
                return;
            }
            tokio::time::sleep(Duration::from_millis(50)).await;
        }
        panic!("never: {condition}");
    }

    /// The visible text of the first element that a selector finds.
    pub async fn text(&self, css: &str) -> String {
        let found = self.client.find(Locator::Css(css)).await.expect(css);
        found.text().await.expect("its text")
    }

    /// An attribute of the first element that a selector finds; none where it is not set.
    pub async fn attribute(&self, css: &str, name: &str) -> Option<String> {
        let found = self.client.find(Locator::Css(css)).await.expect(css);
        found.attr(name).await.expect("its attribute")
    }

    /// Writes a text into the field of a key of the catalogue, as if typed.
    pub async fn fill(&self, key: &str, text: &str) {
        let id = format!("f-{}", key.replace('.', "-"));
        let script = format!(
            "const e = document.getElementById({id}); e.value = {text}; e.dispatchEvent(new Event('input', {{bubbles: true}}));",
            id = json!(id),
            text = json!(text)
        );
        self.script(&script).await;
    }

    /// Gives the page a view of this size in CSS px; any width, also below that of the narrowest window.
    pub async fn view(&self, width: u32, height: u32) {
        let size = json!({ "width": width, "height": height, "deviceScaleFactor": 1, "mobile": false });
        self.devtools("Emulation.setDeviceMetricsOverride", size).await;
        self.until(&format!("innerWidth === {width}")).await;
    }

    /// Asks for light or dark colours, as the visitor's system would.
    pub async fn scheme(&self, scheme: Scheme) {
        let value = if scheme == Scheme::Dark { "dark" } else { "light" };
        let features = json!({ "features": [{ "name": "prefers-color-scheme", "value": value }] });
        self.devtools("Emulation.setEmulatedMedia", features).await;
        self.until(&format!("matchMedia('(prefers-color-scheme: {value})').matches")).await;
    }

    /// The errors that the browser's console has shown since this was last asked.
    pub async fn errors(&self) -> Vec<String> {
        let command = Vendor { path: "se/log", body: json!({ "type": "browser" }) };
        let log = self.client.issue_cmd(command).await.expect("the console's log");
        let entries = log.as_array().expect("a list of entries");
        entries.iter().filter(|e| e["level"] == "SEVERE").map(|e| e["message"].to_string()).collect()
    }

    /// A picture of the view, as PNG.
    pub async fn picture(&self) -> Vec<u8> {
        self.client.screenshot().await.expect("a picture")
    }

    /// The page as it prints, as PDF.
    pub async fn print(&self) -> Vec<u8> {
        let paper = fantoccini::wd::PrintConfiguration::default();
        self.client.print(paper).await.expect("a print")
    }

    async fn devtools(&self, method: &str, parameters: Value) {
        let command =
            Vendor { path: "goog/cdp/execute", body: json!({ "cmd": method, "params": parameters }) };
        self.client.issue_cmd(command).await.unwrap_or_else(|error| panic!("{method}: {error}"));
    }
}

impl Drop for Browser {
    /// Also when a test fails: a driver left behind would keep the check waiting, and a driver that is killed
    /// leaves its browser behind. So the session is ended first, by a request of its own that needs no runtime.
    fn drop(&mut self) {
        let host = ("127.0.0.1", self.port);
        if let Ok(mut stream) = TcpStream::connect(host) {
            let request = format!(
                "DELETE /session/{} HTTP/1.1\r\nHost: 127.0.0.1:{}\r\nConnection: close\r\n\r\n",
                self.session, self.port
            );
            stream.set_read_timeout(Some(Duration::from_secs(10))).ok();
            stream.write_all(request.as_bytes()).ok();
            // Its answer comes when the browser has gone; of no further use.
            stream.read_exact(&mut [0; 1]).ok();
        }
        self.driver.kill().ok();
        self.driver.wait().ok();
        std::fs::remove_dir_all(&self.profile).ok();
    }
}

/// A command that only Chromium's driver knows.
#[derive(Debug)]
struct Vendor {
    path: &'static str,
    body: Value,
}

impl WebDriverCompatibleCommand for Vendor {
    fn endpoint(&self, base: &url::Url, session: Option<&str>) -> Result<url::Url, url::ParseError> {
        base.join(&format!("session/{}/{}", session.unwrap_or_default(), self.path))
    }

    fn method_and_body(&self, _: &url::Url) -> (http::Method, Option<String>) {
        (http::Method::POST, Some(self.body.to_string()))
    }
}
