//! Numbers only: interpolation and the transcendental functions.
//!
//! `exp` and `ln` come from here and nowhere else. The platform's own differ in the last digit
//! between a native test and the page; from one library both get the same bits.

mod curve;
pub(crate) mod dormand_prince;

pub use curve::{CurveError, Monotone, Polyline, Segment};

/// eˣ, the same bits natively and in the page.
pub fn exp(x: f64) -> f64 {
    libm::exp(x)
}

/// Natural logarithm, the same bits natively and in the page.
pub fn ln(x: f64) -> f64 {
    libm::log(x)
}

/// xʸ, the same bits natively and in the page.
pub fn powf(x: f64, y: f64) -> f64 {
    libm::pow(x, y)
}

/// Molar gas constant, in J/(mol·K). Source: CODATA 2018, exact since the 2019 SI.
pub const GAS_CONSTANT: f64 = 8.314_462_618;

/// The reference temperature of cells and switches, 25 °C, in K.
pub const REFERENCE_K: f64 = 298.15;
