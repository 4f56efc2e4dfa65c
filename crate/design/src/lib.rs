//! What is entered, kept and shared: the field catalogue and what is made from it.
//!
//! A design travels one way: text → catalogue → checked parts → model → report.

pub mod catalogue;
pub mod check;
pub mod design;
pub mod file;
pub mod link;
pub mod quantity;
pub mod report;
pub mod shipped;
pub mod versions;
