//! What the load needs to strike, where nobody has measured it: an estimate from its windings.
//!
//! The spread is large, and that is the point: it is carried as the tolerance of the strike voltage, and whoever
//! shows a number that rests on it says that it is an estimate.

use strikeline_core::driver::{self, Band};
use strikeline_core::units::{Amps, Celsius, Farads, Henries, Hertz, Volts};

use super::Reader;
use crate::quantity::Toleranced;

/// The resonance of the driver, with everything that belongs to it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tank {
    /// All capacitance, that of the winding included where it is known.
    pub capacitance: Farads,
    /// Inductance of the whole primary.
    pub inductance: Henries,
    /// Frequency it runs at.
    pub frequency: Hertz,
}

/// An estimated load.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Estimate {
    /// Peak voltage at which the gap breaks down.
    pub gap: Band,
    /// What the load needs at its terminals for that, by the turns alone.
    pub strike: Band,
    /// The resonance, where it is known.
    pub tank: Option<Tank>,
}

impl Estimate {
    /// Peak current in the tank's capacitors with `input` at the load's terminals, where the tank is known.
    pub fn tank_current(&self, input: Volts) -> Option<Amps> {
        let tank = self.tank?;
        Some(driver::tank_current(driver::winding_peak(input), tank.inductance, tank.capacitance))
    }

    /// The strike voltage with its spread; typical is the geometric middle, our choice.
    pub(super) fn toleranced(&self) -> Toleranced {
        let (low, high) = (self.strike.low.0, self.strike.high.0);
        Toleranced { typical: (low * high).sqrt(), min: low, max: high }
    }
}

/// How far a gap between needle points may be from its table, as a fraction either way. Our choice, no source.
const NEEDLES_WITHIN: f64 = 0.1;

/// What is left of a smooth gap's breakdown voltage at tens of kilohertz.
///
/// Source: Peek, Dielectric Phenomena in High-Voltage Engineering, as quoted by others: 3.65 kV at 40 kHz against
/// 4.95 kV at 60 Hz over 1 mm, and less of a difference over 10 mm. Taken for every gap, our choice.
const SMOOTH_AT_HIGH_FREQUENCY: f64 = 0.74;

/// How far a smooth gap may be above the formula, as a fraction. Source: as for
/// [`driver::uniform_breakdown`], within 3 % of the sphere-gap tables.
const SMOOTH_WITHIN: f64 = 0.03;

impl Reader<'_> {
    /// The estimate from the windings.
    ///
    /// - `air`: temperature of the air in the gap.
    pub(super) fn estimate(&mut self, air: Option<Celsius>) -> Option<Estimate> {
        let turns = (self.count("load.primary"), self.count("load.secondary"));
        let (gap, altitude) = (self.value("load.gap"), self.value("load.altitude"));
        let electrodes = self.choice("load.electrodes").to_string();
        let tank = self.tank();
        let (primary, secondary) = (f64::from(turns.0?), f64::from(turns.1?));
        let (gap_mm, altitude_m, air) = (gap? * 1e3, altitude?, air?);
        let full = driver::breakdown(gap_mm, altitude_m, air);
        let gap = match electrodes.as_str() {
            "points" => {
                Band { low: full.low * (1.0 - NEEDLES_WITHIN), high: full.low * (1.0 + NEEDLES_WITHIN) }
            }
            "smooth" => {
                Band { low: full.high * SMOOTH_AT_HIGH_FREQUENCY, high: full.high * (1.0 + SMOOTH_WITHIN) }
            }
            _ => full,
        };
        let strike = driver::strike_voltage(gap, primary, secondary);
        let accepted = 0.3..=60.0;
        if !accepted.contains(&strike.low.0) || !accepted.contains(&strike.high.0) {
            let message = format!(
                "with these turns it takes {:.3} V to {:.3} V at the load to strike; accepted are a gap and turns that take 0.3 V to 60 V",
                strike.low.0, strike.high.0
            );
            self.fault("load.gap", message);
            return None;
        }
        Some(Estimate { gap, strike, tank: tank? })
    }

    /// The tank; the outer `None` is a fault, the inner one a tank that is not known.
    fn tank(&mut self) -> Option<Option<Tank>> {
        let known = self.choice("load.tank").to_string();
        if known == "unknown" {
            return Some(None);
        }
        let capacitance = self.required("load.tank_capacitance", "a capacitance, e.g. 440 nF");
        if known == "values" {
            let inductance = self.required("load.tank_inductance", "an inductance, e.g. 10 µH");
            let (capacitance, inductance) = (Farads(capacitance?), Henries(inductance?));
            let frequency = driver::tank_frequency(inductance, capacitance);
            return Some(Some(Tank { capacitance, inductance, frequency }));
        }
        let alone = self.required("load.tank_alone", "a frequency, e.g. 320 kHz");
        let with = self.required("load.tank_with", "a frequency, e.g. 76 kHz");
        let (capacitance, alone, with) = (Farads(capacitance?), Hertz(alone?), Hertz(with?));
        if with >= alone {
            let message = format!("{with} is not below {alone} without the capacitor; accepted is less");
            self.fault("load.tank_with", message);
            return None;
        }
        let own = driver::own_capacitance(alone, with, capacitance);
        let inductance = driver::tank_inductance(alone, own);
        Some(Some(Tank { capacitance: capacitance + own, inductance, frequency: with }))
    }

    /// A value that may not stay empty with the choices made.
    fn required(&mut self, key: &'static str, accepted: &str) -> Option<f64> {
        let value = self.value(key);
        if value.is_none() && self.design.get(key).trim().is_empty() {
            self.fault(key, format!("nothing is entered; accepted is {accepted}"));
        }
        value
    }
}
