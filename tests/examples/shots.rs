//! Pictures of the page, wide and narrow, light and dark, and its print.
//!
//! `cargo xtask shots` serves the page and gives the folder.

use std::path::PathBuf;

use strikeline_tests::browser::{Browser, Scheme};

fn main() {
    let folder = PathBuf::from(std::env::args().nth(1).expect("the folder for the pictures"));
    std::fs::create_dir_all(&folder).expect("the folder can be made");
    let write = |name: &str, bytes: Vec<u8>| {
        let file = folder.join(name);
        std::fs::write(&file, bytes).expect("the picture can be written");
        println!("   {}", file.display());
    };
    let runtime = tokio::runtime::Builder::new_current_thread().enable_all().build().expect("a runtime");
    runtime.block_on(async {
        let browser = Browser::start().await;
        browser.open("").await;
        for (scheme, colours) in [(Scheme::Light, "light"), (Scheme::Dark, "dark")] {
            browser.scheme(scheme).await;
            for (width, form) in [(1400, "desktop"), (390, "phone")] {
                // First the width: the height of the whole page follows from it.
                browser.view(width, 1000).await;
                let height = browser.script("return document.documentElement.scrollHeight").await;
                let height = height.as_u64().and_then(|h| u32::try_from(h).ok()).expect("a height");
                browser.view(width, height).await;
                write(&format!("{form}-{colours}.png"), browser.picture().await);
            }
        }
        browser.scheme(Scheme::Light).await;
        browser.view(1400, 1000).await;
        write("print.pdf", browser.print().await);
    });
}
