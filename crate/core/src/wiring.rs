//! Conductors: what leads take from the voltage.
//!
//! A device has two conductors between any two parts, so a lead of a length counts twice.

use crate::math::powf;
use crate::units::{Celsius, Ohms};

/// Resistivity of annealed copper at 20 °C, in Ω·mm²/m.
///
/// Source: IEC 60028:1925, 1/58.
pub const COPPER_20: f64 = 1.0 / 58.0;

/// Temperature coefficient of copper at 20 °C, per K.
///
/// Source: IEC 60028:1925.
pub const COPPER_ALPHA_20: f64 = 3.93e-3;

/// How a conductor is made.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Conductor {
    /// Pure copper of the nominal section: the least it can be.
    Ideal,
    /// Solid, class 1.
    Solid,
    /// Flexible, class 5: fine strands.
    Flexible,
    /// Flexible, class 5, strands tinned.
    FlexibleTinned,
}

/// (section in mm², largest resistance at 20 °C in Ω/km) of solid and stranded conductors.
///
/// Source: IEC 60228:2004, tables 1 and 2.
const CLASS_1: [(f64, f64); 5] = [(0.5, 36.0), (0.75, 24.5), (1.0, 18.1), (1.5, 12.1), (2.5, 7.41)];

/// The same for plain flexible conductors. Source: IEC 60228:2004, table 3; below 0.5 mm² DIN VDE 0295.
const CLASS_5: [(f64, f64); 13] = [
    (0.05, 380.0),
    (0.08, 237.0),
    (0.11, 170.0),
    (0.12, 150.0),
    (0.14, 134.0),
    (0.22, 96.0),
    (0.25, 76.0),
    (0.34, 53.0),
    (0.5, 39.0),
    (0.75, 26.0),
    (1.0, 19.5),
    (1.5, 13.3),
    (2.5, 7.98),
];

/// The same for tinned flexible conductors. Source: IEC 60228:2004, table 3; below 0.5 mm² DIN VDE 0295.
const CLASS_5_TINNED: [(f64, f64); 13] = [
    (0.05, 392.0),
    (0.08, 244.0),
    (0.11, 175.0),
    (0.12, 155.0),
    (0.14, 138.0),
    (0.22, 99.0),
    (0.25, 79.0),
    (0.34, 56.0),
    (0.5, 40.1),
    (0.75, 26.7),
    (1.0, 20.0),
    (1.5, 13.7),
    (2.5, 8.21),
];

/// Largest resistance of one conductor at 20 °C, in Ω per km.
///
/// - `area_mm2`: nominal section, in mm², above 0. Between two listed sections the excess over pure copper
///   is that of the nearer smaller one (our choice); a listed section gives the listed figure.
pub fn per_km_20(area_mm2: f64, conductor: Conductor) -> f64 {
    let ideal = 1000.0 * COPPER_20 / area_mm2;
    let table: &[(f64, f64)] = match conductor {
        Conductor::Ideal => return ideal,
        Conductor::Solid => &CLASS_1,
        Conductor::Flexible => &CLASS_5,
        Conductor::FlexibleTinned => &CLASS_5_TINNED,
    };
    let k = table.partition_point(|(area, _)| *area <= area_mm2 * (1.0 + 1e-9)).max(1) - 1;
    let (area, listed) = table[k];
    ideal * listed * area / (1000.0 * COPPER_20)
}

/// Factor of a copper resistance against 20 °C.
///
/// - `t`: conductor temperature; the linear law is used from −40 to 120 °C.
pub fn copper_factor(t: Celsius) -> f64 {
    1.0 + COPPER_ALPHA_20 * (t.0 - 20.0)
}

/// Resistance of a lead, there and back.
///
/// - `length_m`: one way, in m, 0 or more.
/// - `area_mm2`: nominal section of one conductor, in mm², above 0.
/// - `t`: conductor temperature.
pub fn lead(length_m: f64, area_mm2: f64, conductor: Conductor, t: Celsius) -> Ohms {
    Ohms(2.0 * length_m * per_km_20(area_mm2, conductor) * 1e-3 * copper_factor(t))
}

/// Diameter of a wire by its gauge, in mm.
///
/// - `gauge`: AWG number, 0 to 40.
///
/// Source: ASTM B258: d = 0.127 mm · 92^((36 − n)/39).
pub fn awg_diameter_mm(gauge: f64) -> f64 {
    0.127 * powf(92.0, (36.0 - gauge) / 39.0)
}

/// Section of a wire by its gauge, in mm².
pub fn awg_area_mm2(gauge: f64) -> f64 {
    let d = awg_diameter_mm(gauge);
    core::f64::consts::FRAC_PI_4 * d * d
}
