//! The page: what it says and draws as pure functions, and the browser part as thin as it can be.
//!
//! Sentences, charts and markup are texts made from numbers, so they are tested natively. The charts are
//! SVG written here and not by a plotting library: they take the page's colours and type, have direct labels
//! and a text for screen readers, and cost a few kilobytes of download.

pub mod arrangements;
pub mod charging;
pub mod chart;
pub mod form;
pub mod further;
pub mod hazards;
pub mod margins;
pub mod number;
pub mod results;
pub mod sentences;
pub mod time_current;
#[cfg(target_arch = "wasm32")]
pub mod view;
