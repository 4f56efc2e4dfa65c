//! The cell: an open-circuit voltage behind `R₀` and two or three slow `R‖C` branches.
//!
//! `n` equal cells in parallel act as one. Full is z = 1 also for an aged cell: age takes capacity
//! away, not voltage. Heat capacity and cooling are those of all cells together. What the cell's
//! own hysteresis and diffusion do beyond three branches is left out.

use crate::math::{GAS_CONSTANT, Monotone, Polyline, REFERENCE_K, exp};
use crate::units::{AmpHours, Amps, Celsius, Ohms, Seconds, Volts};

/// How many branches a cell can have.
pub const MAX_BRANCHES: usize = 3;

/// One slow branch, at half charge, 25 °C and growth 1, of one cell.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Branch {
    /// Resistance, in Ω, 0 or more.
    pub resistance: Ohms,
    /// Time constant, in s, above 0; the same at every charge and temperature.
    pub time_constant: Seconds,
}

/// What a cell maker allows. `None`: not known, and then not judged.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct CellLimits {
    /// Highest voltage, when charging.
    pub upper: Option<Volts>,
    /// Lowest voltage, when discharging.
    pub lower: Option<Volts>,
    /// Continuous discharge current of one cell.
    pub continuous: Option<Amps>,
    /// Pulse discharge current of one cell.
    pub pulse: Option<Amps>,
    /// Charge current of one cell.
    pub charge: Option<Amps>,
    /// Discharge temperature window, lower end.
    pub discharge_cold: Option<Celsius>,
    /// Discharge temperature window, upper end.
    pub discharge_hot: Option<Celsius>,
}

/// One cell, or `parallel` equal ones.
#[derive(Debug, Clone, PartialEq)]
pub struct Cell {
    /// Number of equal cells in parallel, 1 or more.
    pub parallel: u32,
    /// Rated capacity of each.
    pub capacity: AmpHours,
    /// Fraction of the capacity that age has left, above 0 to 1.
    pub health: f64,
    /// Factor by which age has raised every resistance, above 0 (1 when new).
    pub growth: f64,
    /// Open-circuit voltage in V at 25 °C over the state of charge 0 to 1, rising.
    pub ocv: Monotone,
    /// Change of the open-circuit voltage with temperature, in V/K, over the state of charge.
    pub entropy: Polyline,
    /// `R₀` of one cell at half charge and 25 °C.
    pub r0: Ohms,
    /// Factor on `R₀` over the state of charge, 1 at 0.5.
    pub r0_shape: Polyline,
    /// Activation energy of `R₀`, in J/mol.
    pub r0_activation: f64,
    /// Two or three slow branches (none and one are allowed too).
    pub branches: Vec<Branch>,
    /// Factor on the branch resistances over the state of charge, 1 at 0.5.
    pub branch_shape: Polyline,
    /// Activation energy of the branch resistances, in J/mol.
    pub branch_activation: f64,
    /// Heat capacity of all cells together, in J/K, above 0.
    pub heat_capacity_j_per_k: f64,
    /// Heat let go to the surroundings by all cells together, in W/K, 0 or more.
    pub cooling_w_per_k: f64,
    /// What the maker allows.
    pub limits: CellLimits,
}

impl Cell {
    /// Charge of all cells from full to empty, in A·s.
    pub fn charge_as(&self) -> f64 {
        3600.0 * self.capacity.0 * self.health * f64::from(self.parallel)
    }

    /// Open-circuit voltage at state of charge `soc` (0 to 1) and temperature `t`.
    ///
    /// `U(z) + (T − 25)·dU/dT(z)`
    pub fn open_circuit(&self, soc: f64, t: Celsius) -> Volts {
        Volts(self.ocv.at(soc) + (t.0 - 25.0) * self.entropy.at(soc))
    }

    /// Ohmic resistance of all cells together.
    pub fn r0_at(&self, soc: f64, t: Celsius) -> Ohms {
        self.scaled(self.r0, &self.r0_shape, self.r0_activation, soc, t)
    }

    /// Resistance of branch `k` of all cells together; `k` counts from 0.
    pub fn branch_at(&self, k: usize, soc: f64, t: Celsius) -> Ohms {
        self.scaled(self.branches[k].resistance, &self.branch_shape, self.branch_activation, soc, t)
    }

    /// `R(z,T) = R₅₀ · s(z) · g · exp[Ea/R_g · (1/T − 1/298.15)] / n`
    fn scaled(&self, r: Ohms, shape: &Polyline, activation: f64, soc: f64, t: Celsius) -> Ohms {
        r * (shape.at(soc) * self.growth * arrhenius(activation, t) / f64::from(self.parallel))
    }
}

/// Factor of an Arrhenius law against 25 °C.
///
/// - `activation`: activation energy, in J/mol.
/// - `t`: temperature, above −273.15 °C.
pub fn arrhenius(activation: f64, t: Celsius) -> f64 {
    exp(activation / GAS_CONSTANT * (1.0 / t.kelvin() - 1.0 / REFERENCE_K))
}
