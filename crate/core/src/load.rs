//! The load: a driver that starts, runs, strikes an arc and holds it, behind an input capacitor.
//!
//! Voltages are those at the load's own terminals. What happens on the high-voltage side is left
//! out: the draw is what a bench supply shows.

use crate::math::Polyline;
use crate::units::{Amps, Farads, Ohms, Seconds, Volts, Watts};

/// What the load draws while its arc is lit.
#[derive(Debug, Clone, PartialEq)]
pub enum LitDraw {
    /// The same current at every voltage.
    Current(Amps),
    /// The same power at every voltage.
    Power(Watts),
    /// A resistance.
    Resistance(Ohms),
    /// Measured points, current in A over voltage in V, joined by straight lines; outside them
    /// proportional to the voltage from the nearest point.
    Table(Polyline),
}

/// The load as the path sees it.
#[derive(Debug, Clone, PartialEq)]
pub struct Load {
    /// Draw while lit.
    pub lit: LitDraw,
    /// Draw while it runs without an arc, as a resistance.
    pub unlit: Ohms,
    /// Draw below the start voltage, as a resistance; `None`: the unlit draw.
    pub stall: Option<Ohms>,
    /// The oscillator runs from here, above 0.
    pub start: Volts,
    /// The arc ignites from here, above `hold`.
    pub strike: Volts,
    /// How long the strike voltage must stand, above 0.
    pub strike_time: Seconds,
    /// The arc stays lit down to here, above `start`.
    pub hold: Volts,
    /// Extra current at the moment the start voltage is first reached, 0 or more.
    pub surge: Amps,
    /// Its time constant, above 0.
    pub surge_time: Seconds,
    /// Input capacitance, at least 1 µF, empty at each press.
    pub capacitance: Farads,
    /// Series resistance of the input capacitor, 0 or more.
    pub esr: Ohms,
    /// Peak of the running load's draw over its mean, 1 or more.
    pub peak_factor: f64,
}
