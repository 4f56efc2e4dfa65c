//! Support for the reference tests.

pub mod case;
pub mod derive;
pub mod draw;
pub mod flat;
