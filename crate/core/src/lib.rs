//! The simulator: plain data and pure functions; reports as numbers.
//!
//! No browser, clock, thread, file, text format or random source lives here.
//! Discharge current is positive; SI inside; temperatures in °C at the edge.

pub mod arrangements;
pub mod board;
pub mod cell;
pub mod charge;
pub mod charger;
mod circuit;
pub mod driver;
pub mod hazard;
pub mod load;
pub mod margins;
pub mod math;
pub mod press;
pub mod ratings;
pub mod replay;
pub mod report;
pub mod setup;
pub mod thermal;
pub mod time_current;
pub mod units;
pub mod verdict;
pub mod wiring;
