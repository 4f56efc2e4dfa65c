//! A recorded current applied to a cell alone.
//!
//! Between two samples the current is constant at the earlier one's value, as a bench load or a logger
//! reports it. Within such a stretch the branches are exponential for the resistance they have; the
//! stretch is halved until resistance, voltage and temperature hardly change over a piece, so a step of
//! an hour is as right as 3600 of a second. The state of charge may leave 0 to 1 (the curves stay at
//! their ends there); it is reported so that one can see it.

use crate::cell::{Cell, MAX_BRANCHES};
use crate::math::exp;
use crate::units::{Amps, Celsius, Seconds, Volts};

/// One row of a record.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Recorded {
    /// When; rows in rising order.
    pub time: Seconds,
    /// From then on; discharge is positive, charge negative.
    pub current: Amps,
}

/// Where a replay begins.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ReplayStart {
    /// State of charge, 0 to 1, everything relaxed.
    pub soc: f64,
    /// Temperature of the cell.
    pub temperature: Celsius,
    /// Ambient temperature.
    pub ambient: Celsius,
}

/// What the cell shows at one row, with that row's current flowing.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Predicted {
    /// When.
    pub time: Seconds,
    /// At the terminals.
    pub voltage: Volts,
    /// Of the cell.
    pub temperature: Celsius,
    /// State of charge; it may leave 0 to 1.
    pub soc: f64,
}

/// How far a state may move in one piece: charge, as a fraction, and temperature, in K.
const PIECE_SOC: f64 = 1e-3;
const PIECE_K: f64 = 0.25;
/// Bound on the pieces between two rows.
const MOST_PIECES: f64 = 20_000.0;

struct State {
    soc: f64,
    t: f64,
    v: [f64; MAX_BRANCHES],
}

/// Applies a record to a cell.
///
/// Rows whose time does not rise take no time. A row is answered with its own current flowing.
pub fn run(cell: &Cell, start: &ReplayStart, record: &[Recorded]) -> Vec<Predicted> {
    let mut state = State { soc: start.soc, t: start.temperature.0, v: [0.0; MAX_BRANCHES] };
    let mut out = Vec::with_capacity(record.len());
    for (k, row) in record.iter().enumerate() {
        let temperature = Celsius(state.t);
        let slow: f64 = state.v.iter().sum();
        let voltage = cell.open_circuit(state.soc, temperature).0
            - slow
            - row.current.0 * cell.r0_at(state.soc, temperature).0;
        out.push(Predicted { time: row.time, voltage: Volts(voltage), temperature, soc: state.soc });
        let Some(next) = record.get(k + 1) else { break };
        let length = next.time.0 - row.time.0;
        if length > 0.0 && length.is_finite() && row.current.0.is_finite() {
            hold(cell, &mut state, row.current.0, start.ambient.0, length);
        }
    }
    out
}

/// Holds a current for a time.
fn hold(cell: &Cell, state: &mut State, current: f64, ambient: f64, length: f64) {
    let charge = cell.charge_as();
    let mut left = length;
    let shortest = length / MOST_PIECES;
    while left > 0.0 {
        let temperature = Celsius(state.t);
        let slow: f64 = state.v.iter().sum();
        let r0 = cell.r0_at(state.soc, temperature).0;
        let entropy = cell.entropy.at(state.soc);
        let heat = current * (slow + current * r0) - current * temperature.kelvin() * entropy;
        let warming = (heat - cell.cooling_w_per_k * (state.t - ambient)) / cell.heat_capacity_j_per_k;
        // Small enough for charge and temperature, and for the branches' own change of heat.
        let mut h = left;
        if current != 0.0 {
            h = h.min(PIECE_SOC * charge / current.abs());
            // The heat of a branch that is still rising wants a few pieces per time constant.
            if let Some(fastest) = cell.branches.iter().map(|b| b.time_constant.0).reduce(f64::min)
                && slow.abs() < 0.95 * current.abs() * resistance(cell, state)
            {
                h = h.min(0.5 * fastest.max(shortest));
            }
        }
        if warming != 0.0 {
            h = h.min((PIECE_K / warming.abs()).max(shortest));
        }
        h = h.max(shortest).min(left);
        // The middle of the piece decides the resistances: second order.
        let soc_middle = state.soc - 0.5 * current * h / charge;
        let t_middle = Celsius(state.t + 0.5 * warming * h);
        let mut slow_mean = 0.0;
        for (k, branch) in cell.branches.iter().take(MAX_BRANCHES).enumerate() {
            let settled = current * cell.branch_at(k, soc_middle, t_middle).0;
            let tau = branch.time_constant.0;
            let decay = exp(-h / tau);
            let before = state.v[k];
            state.v[k] = settled + (before - settled) * decay;
            // Mean of an exponential over the piece.
            slow_mean += settled + (before - settled) * (1.0 - decay) * tau / h;
        }
        let r0 = cell.r0_at(soc_middle, t_middle).0;
        let entropy = cell.entropy.at(soc_middle);
        let heat = current * (slow_mean + current * r0) - current * t_middle.kelvin() * entropy;
        state.t = if cell.cooling_w_per_k > 0.0 {
            let settled = ambient + heat / cell.cooling_w_per_k;
            settled + (state.t - settled) * exp(-h * cell.cooling_w_per_k / cell.heat_capacity_j_per_k)
        } else {
            state.t + heat * h / cell.heat_capacity_j_per_k
        };
        state.soc -= current * h / charge;
        left -= h;
        if left < 1e-12 * length {
            break;
        }
    }
}

fn resistance(cell: &Cell, state: &State) -> f64 {
    (0..cell.branches.len().min(MAX_BRANCHES)).map(|k| cell.branch_at(k, state.soc, Celsius(state.t)).0).sum()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::cell::{Branch, CellLimits};
    use crate::math::{Monotone, Polyline};
    use crate::units::{AmpHours, Ohms};

    /// A cell with flat curves: everything has a closed form.
    fn flat() -> Cell {
        Cell {
            parallel: 1,
            capacity: AmpHours(1000.0),
            health: 1.0,
            growth: 1.0,
            ocv: Monotone::new(vec![0.0, 1.0], vec![3.7, 3.7]).expect("two points"),
            entropy: Polyline::constant(0.0),
            r0: Ohms::from_milli(30.0),
            r0_shape: Polyline::constant(1.0),
            r0_activation: 0.0,
            branches: vec![Branch { resistance: Ohms::from_milli(20.0), time_constant: Seconds(5.0) }],
            branch_shape: Polyline::constant(1.0),
            branch_activation: 0.0,
            heat_capacity_j_per_k: 50.0,
            cooling_w_per_k: 0.1,
            limits: CellLimits::default(),
        }
    }

    fn at(times: &[f64], current: f64) -> Vec<Recorded> {
        times.iter().map(|&t| Recorded { time: Seconds(t), current: Amps(current) }).collect()
    }

    const START: ReplayStart = ReplayStart { soc: 0.5, temperature: Celsius(25.0), ambient: Celsius(25.0) };

    #[test]
    fn exact_rc_step() {
        for (t, got) in [0.0, 1.0, 10.0].into_iter().zip(run(&flat(), &START, &at(&[0.0, 1.0, 10.0], 3.0))) {
            let want = 3.7 - 3.0 * (0.030 + 0.020 * (1.0 - exp(-t / 5.0)));
            assert!((got.voltage.0 - want).abs() < 1e-12, "{t} s: {} V, not {want} V", got.voltage.0);
        }
    }

    #[test]
    fn law_one_long_step_is_as_right_as_many_short_ones() {
        let mut cell = flat();
        cell.capacity = AmpHours(3.0);
        cell.ocv = Monotone::new(vec![0.0, 0.1, 0.5, 1.0], vec![3.0, 3.5, 3.7, 4.2]).expect("four points");
        cell.r0_activation = 20e3;
        cell.branch_activation = 30e3;
        cell.branch_shape = Polyline::new(vec![0.0, 0.2, 1.0], vec![3.0, 1.0, 1.0]).expect("three points");
        let start = ReplayStart { soc: 0.9, ..START };
        let long = run(&cell, &start, &at(&[0.0, 1800.0], 2.0));
        let short: Vec<f64> = (0..=1800).map(f64::from).collect();
        let short = run(&cell, &start, &at(&short, 2.0));
        let (a, b) = (long[1], short[1800]);
        assert!((a.voltage.0 - b.voltage.0).abs() < 2e-4, "{} and {} V", a.voltage.0, b.voltage.0);
        assert!((a.temperature.0 - b.temperature.0).abs() < 0.01);
    }

    #[test]
    fn exact_charge_and_discharge_cancel() {
        let mut record = at(&[0.0], 3.0);
        record.extend(at(&[600.0], -3.0));
        record.extend(at(&[1200.0], 0.0));
        let end = run(&flat(), &START, &record)[2];
        assert!((end.soc - 0.5).abs() < 1e-12);
    }
}
