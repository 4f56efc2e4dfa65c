//! Support for the reference tests.

pub mod case;
pub mod derive;
