//! The resonant driver: start values for a load that nobody has measured yet. **An estimate.**
//!
//! Meant is a push-pull oscillator: two half-windings, centre tap fed through a choke from the input, each end
//! switched to ground for half a cycle. An ideal choke keeps the centre tap's mean at the input voltage, so a
//! sine there has the peak π/2·V, and the whole winding and the open switch see π·V. What the secondary's own
//! resonance, the coupling and the load do to that is left out, and so is what humidity, dust, electrode
//! material and the first microseconds do to a spark gap. Hence a band instead of a figure: from needle points
//! to a uniform field it spans a factor of about four. Every use of a number from here says that it is an
//! estimate and asks to measure it on the bench.

use crate::math::{Polyline, powf};
use crate::units::{Amps, Celsius, Farads, Henries, Hertz, Ohms, Volts};
use core::f64::consts::{FRAC_PI_2, PI, SQRT_2};

/// From the lowest to the highest that can be expected.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Band {
    /// Lowest.
    pub low: Volts,
    /// Highest.
    pub high: Volts,
}

/// Frequency of a tank.
///
/// - `inductance`, `capacitance`: above 0.
///
/// `f = 1/(2π√(LC))` (Thomson)
pub fn tank_frequency(inductance: Henries, capacitance: Farads) -> Hertz {
    Hertz(1.0 / (2.0 * PI * (inductance.0 * capacitance.0).sqrt()))
}

/// Inductance of a tank with a known capacitance and frequency, both above 0.
///
/// `L = 1/[(2πf)²C]`
pub fn tank_inductance(frequency: Hertz, capacitance: Farads) -> Henries {
    let omega = 2.0 * PI * frequency.0;
    Henries(1.0 / (omega * omega * capacitance.0))
}

/// Capacitance that a coil has by itself, from its frequency alone and with a known capacitor added.
///
/// - `alone`, `with_added`: above 0, `with_added` the lower one.
///
/// `C₀ = C_add/[(f₁/f₂)² − 1]`
pub fn own_capacitance(alone: Hertz, with_added: Hertz, added: Farads) -> Farads {
    let ratio = alone / with_added;
    added / (ratio * ratio - 1.0)
}

/// Peak at the centre tap of an ideal driver.
///
/// `V̂ = π/2·V_in`: the mean of a rectified sine is 2/π of its peak.
pub fn centre_tap_peak(input: Volts) -> Volts {
    input * FRAC_PI_2
}

/// Peak over the whole primary winding, and over an open switch, of an ideal driver.
///
/// `V̂ = π·V_in`
pub fn winding_peak(input: Volts) -> Volts {
    input * PI
}

/// Effective value over the whole primary winding of an ideal driver.
///
/// `V = π/√2·V_in`
pub fn winding_rms(input: Volts) -> Volts {
    input * (PI / SQRT_2)
}

/// Peak of the secondary by the turns alone, before any resonance of its own.
///
/// - `primary_turns`: of the whole primary, both halves, above 0.
/// - `secondary_turns`: 0 or more.
///
/// `V̂_s = N_s·π·V_in/N_p`
pub fn secondary_peak(input: Volts, primary_turns: f64, secondary_turns: f64) -> Volts {
    winding_peak(input) * (secondary_turns / primary_turns)
}

/// Peak current in the tank's capacitors.
///
/// `Î = V̂/√(L/C)`
pub fn tank_current(peak: Volts, inductance: Henries, capacitance: Farads) -> Amps {
    peak / Ohms((inductance.0 / capacitance.0).sqrt())
}

/// Draw of an ideal driver whose whole winding is loaded by `loading`.
///
/// `I = (π·V_in)²/(2·R·V_in)`: what goes in is the power in the resistance.
pub fn feed_current(input: Volts, loading: Ohms) -> Amps {
    Amps(PI * PI * input.0 / (2.0 * loading.0))
}

/// Pressure of the standard atmosphere, in bar.
///
/// - `altitude_m`: above sea level, −1000 to 11 000 m.
///
/// `p = 1.01325·(1 − 0.0065·h/288.15)^5.25588`; the exponent is g·M/(R·0.0065 K/m)
///
/// Source: ISO 2533:1975.
pub fn standard_pressure_bar(altitude_m: f64) -> f64 {
    1.01325 * powf(1.0 - 0.0065 * altitude_m / 288.15, 5.25588)
}

/// Density of air against that at 1.01325 bar and 20 °C.
///
/// - `t`: above −273 °C.
///
/// `δ = (p/760)·293/(273 + T)` with p in Torr; 760 Torr are 1.01325 bar.
pub fn air_density(pressure_bar: f64, t: Celsius) -> f64 {
    pressure_bar / 1.01325 * 293.0 / (273.0 + t.0)
}

/// Peak voltage at which a gap between large smooth electrodes breaks down.
///
/// - `gap_mm`: 0 or more; the curve is meant for 0.1 to 10 mm.
/// - `pressure_bar`, `t`: of the air. The pressure that counts is that of equal density at 20 °C.
///
/// `V = 2.44·pd + 2.12·√(pd)` in kV, bar and mm
///
/// Source: the curve fit of high-voltage textbooks; within ±3 % of the sphere-gap tables of IEC 60052 at 5 and
/// 10 mm.
pub fn uniform_breakdown(gap_mm: f64, pressure_bar: f64, t: Celsius) -> Volts {
    let pd = 1.01325 * air_density(pressure_bar, t) * gap_mm;
    Volts(1e3 * (2.44 * pd + 2.12 * pd.sqrt()))
}

/// (gap in mm, peak voltage in kV) of needle points at 760 mmHg and 25 °C.
///
/// Source: needle-gap table of the AIEE standards, as reprinted.
const NEEDLES: ([f64; 7], [f64; 7]) =
    ([0.0, 4.2, 8.5, 13.0, 17.5, 22.0, 26.9], [0.0, 5.0, 10.0, 15.0, 20.0, 25.0, 30.0]);

/// Peak voltage at which a gap between needle points breaks down.
///
/// - `gap_mm`: 0 to 26.9 mm; above that the answer is that of 26.9 mm.
/// - `pressure_bar`, `t`: of the air.
///
/// Straight lines between the table's points; below 4.2 mm a straight line to zero, and in proportion to the
/// air's density: both our choice.
pub fn needle_breakdown(gap_mm: f64, pressure_bar: f64, t: Celsius) -> Volts {
    let (x, y) = NEEDLES;
    let density = air_density(pressure_bar, t) / air_density(1.01325, Celsius(25.0));
    let table = Polyline::new(x.to_vec(), y.to_vec()).expect("the table above rises");
    Volts(1e3 * table.at(gap_mm) * density)
}

/// Band of the peak voltage at which a gap breaks down, from needle points to a uniform field.
///
/// - `gap_mm`: 0.1 to 20 mm.
/// - `altitude_m`: above sea level.
/// - `t`: of the air.
pub fn breakdown(gap_mm: f64, altitude_m: f64, t: Celsius) -> Band {
    let pressure = standard_pressure_bar(altitude_m);
    Band { low: needle_breakdown(gap_mm, pressure, t), high: uniform_breakdown(gap_mm, pressure, t) }
}

/// What the load needs at its terminals to strike over a gap, by the turns alone.
///
/// - `gap`: as [`breakdown`] gives it.
/// - `primary_turns`, `secondary_turns`: above 0; `primary_turns` counts both halves.
pub fn strike_voltage(gap: Band, primary_turns: f64, secondary_turns: f64) -> Band {
    let per_volt = secondary_peak(Volts(1.0), primary_turns, secondary_turns).0;
    Band { low: gap.low / per_volt, high: gap.high / per_volt }
}
