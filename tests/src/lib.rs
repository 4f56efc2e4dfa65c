//! Support for the reference tests.

#[cfg(feature = "browser")]
pub mod browser;
pub mod case;
pub mod derive;
pub mod draw;
pub mod flat;
