//! What is entered, kept and shared.

pub mod shipped;
