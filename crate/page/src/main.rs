//! Starts the page.

fn main() {
    #[cfg(target_arch = "wasm32")]
    strikeline_page::view::start();
    #[cfg(not(target_arch = "wasm32"))]
    eprintln!("this is the page; it is built for wasm32 by `cargo xtask build`");
}
