//! The protection board: a switch pair in the return path, watched by any number of stages.
//!
//! The same parts make a second protector inside a cell's own wrap. A stage's timer runs while its
//! threshold is exceeded, is reset when it is not, and opens the switch when it reaches its delay.
//! What a tolerance does to a threshold is left to whoever draws the designs: a board here has one
//! value for everything.

use crate::math::Polyline;
use crate::units::{Amps, Ohms, Seconds, Volts};

/// What a stage compares.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Threshold {
    /// The sense voltage, over the pair or the shunt.
    Sense(Volts),
    /// The current itself.
    Current(Amps),
}

/// One level of current protection.
#[derive(Debug, Clone, PartialEq)]
pub struct Stage {
    /// Its name, as events and reports print it, such as `over_current`.
    pub name: String,
    /// Exceeded strictly above this.
    pub threshold: Threshold,
    /// How long it must stay exceeded, 0 or more.
    pub delay: Seconds,
}

/// Over-discharge protection by the board's own supply voltage.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct OverDischarge {
    /// Exceeded while the supply is below this.
    pub threshold: Volts,
    /// How long it must stay so, 0 or more.
    pub delay: Seconds,
}

/// Where the board measures its sense voltage.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum SensePoint {
    /// Over the switch pair.
    Pair,
    /// Over a shunt in series with the pair.
    Shunt,
}

/// What a board needs after a trip before it conducts again.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Release {
    /// The load must be taken away.
    LoadRemoved,
    /// It tries again by itself.
    Retry {
        /// Time between two tries.
        every: Seconds,
    },
    /// A charger must be connected.
    ChargerNeeded,
}

/// A protection board, or a second protector in the cell's wrap.
#[derive(Debug, Clone, PartialEq)]
pub struct Board {
    /// Resistance of one pair (both its switches) at 25 °C in Ω, over the protector's supply
    /// voltage in V; never rising.
    pub on_resistance: Polyline,
    /// Rise of the pair's resistance, as a fraction per K.
    pub alpha_per_k: f64,
    /// Number of pairs in parallel, 1 or more.
    pub pairs: u32,
    /// Thermal resistance of the whole group of pairs, in K/W.
    pub thermal_k_per_w: f64,
    /// Thermal time constant of the group, above 0.
    pub thermal_time: Seconds,
    /// Shunt in series with the pair, 0 where there is none.
    pub shunt: Ohms,
    /// What the stages see.
    pub sense: SensePoint,
    /// The current stages.
    pub stages: Vec<Stage>,
    /// Over-discharge, where the board has it.
    pub over_discharge: Option<OverDischarge>,
    /// What it takes to conduct again.
    pub release: Release,
}
