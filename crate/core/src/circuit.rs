//! The circuit at one instant: what the path gives, what the load takes.
//!
//! `e` is the cell's inner voltage `U_E = U(z) + (T−25)·dU/dT − Σ v_k`. The switch resistance falls
//! with the board's supply voltage, which falls with the current, so the current has to be solved
//! for. `R_on` never rises with voltage, hence `I·R_total(I)` rises with `I` and there is exactly one
//! solution; on one straight piece of `R_on` it is the root of a quadratic. With a second protector
//! the equation is a cubic and is solved by a bracketed Newton iteration.

use std::cell::Cell as Hint;

use crate::board::Board;
use crate::cell::{Cell, MAX_BRANCHES};
use crate::load::LitDraw;
use crate::math::{GAS_CONSTANT, Polyline, REFERENCE_K, exp};
use crate::report::Mode;
use crate::setup::Setup;
use crate::units::Celsius;

/// A switch pair in the path, in plain numbers.
pub(crate) struct Switch {
    on: Polyline,
    /// The straight pieces of `on` with the constant ends, by rising voltage:
    /// (upper end, value at 0 V, slope).
    pieces: Vec<(f64, f64, f64)>,
    hint: Hint<usize>,
    alpha: f64,
    /// One over the number of pairs.
    share: f64,
    pub(crate) shunt: f64,
    pub(crate) thermal_k_per_w: f64,
    pub(crate) thermal_time_s: f64,
}

impl Switch {
    fn new(board: &Board) -> Self {
        let on = board.on_resistance.clone();
        let (x, y) = (on.x(), on.y());
        let mut pieces = vec![(x[0], y[0], 0.0)];
        for k in 1..x.len() {
            let slope = (y[k] - y[k - 1]) / (x[k] - x[k - 1]);
            pieces.push((x[k], y[k - 1] - slope * x[k - 1], slope));
        }
        pieces.push((f64::INFINITY, y[y.len() - 1], 0.0));
        let hint = Hint::new(pieces.len() - 1);
        Self {
            on,
            pieces,
            hint,
            alpha: board.alpha_per_k,
            share: 1.0 / f64::from(board.pairs),
            shunt: board.shunt.0,
            thermal_k_per_w: board.thermal_k_per_w,
            thermal_time_s: board.thermal_time.0,
        }
    }

    /// What multiplies one pair's resistance at 25 °C.
    pub(crate) fn factor(&self, t: f64) -> f64 {
        (1.0 + self.alpha * (t - 25.0)) * self.share
    }

    /// How far a constant current warms the pair above the ambient temperature, at which it begins, in K; ∞ where it
    /// runs away.
    ///
    /// - `ohms`: resistance of the pair at the temperature `at`.
    pub(crate) fn rise(&self, ambient: f64, at: f64, ohms: f64, current: f64, length_s: f64) -> f64 {
        // τ·dT/dt = I²·R·Rθ − (T − T_a) with R = R_25·(1 + α·(T − 25)) is linear in T.
        let cold = ohms / (1.0 + self.alpha * (at - 25.0));
        let heat = current * current * cold * self.thermal_k_per_w;
        let times = length_s / self.thermal_time_s;
        let x = (1.0 - heat * self.alpha) * times;
        let share = if x.abs() < 1e-6 { 1.0 - 0.5 * x } else { (1.0 - exp(-x)) / x };
        heat * (1.0 + self.alpha * (ambient - 25.0)) * times * share
    }

    /// Change of `factor` per K.
    fn factor_slope(&self) -> f64 {
        self.alpha * self.share
    }
}

/// The cell's curves at one state of charge and temperature, all cells together.
#[derive(Clone, Copy, Default)]
pub(crate) struct CellNow {
    /// Open-circuit voltage with its temperature part.
    pub(crate) ocv: f64,
    /// Its slope over the state of charge.
    pub(crate) ocv_slope: f64,
    /// `dU/dT`.
    pub(crate) entropy: f64,
    pub(crate) r0: f64,
    /// Change of `r0` over the state of charge and per K.
    pub(crate) r0_slope: (f64, f64),
    /// What multiplies a branch's own resistance.
    pub(crate) branch_factor: f64,
}

/// What the path does at one load voltage.
#[derive(Clone, Copy, Default)]
pub(crate) struct PathNow {
    pub(crate) current: f64,
    /// `−dI/dV`, in S.
    pub(crate) conductance: f64,
    /// The board's pair, without shunt.
    pub(crate) pair: f64,
    /// Slope of the pair's resistance over its supply voltage.
    pub(crate) pair_slope: f64,
    /// The second protector's pair, without shunt.
    pub(crate) second: f64,
    /// The board's supply.
    pub(crate) board: f64,
    /// The second protector's supply: the cell's terminals.
    pub(crate) cell: f64,
}

/// The parts of a setup in plain numbers, as the solver uses them.
pub(crate) struct Circuit<'a> {
    cell: &'a Cell,
    parallel: f64,
    pub(crate) charge_as: f64,
    pub(crate) branch_count: usize,
    /// Resistance of each branch before its factor; 0 where there is none.
    pub(crate) branch_ohm: [f64; MAX_BRANCHES],
    /// Its rate, 1/τ; 0 where there is none.
    pub(crate) branch_rate: [f64; MAX_BRANCHES],
    pub(crate) second: Option<Switch>,
    pub(crate) ahead: f64,
    pub(crate) board: Option<Switch>,
    pub(crate) after: f64,
    pub(crate) load: &'a crate::load::Load,
    pub(crate) stall_ohm: f64,
    /// The Arrhenius factors at the whole degree last asked for.
    anchor: Hint<Anchor>,
    /// The pieces of the cell's four curves that were right last time.
    pieces: [Hint<usize>; 4],
}

/// Both Arrhenius factors at a whole degree.
#[derive(Clone, Copy)]
struct Anchor {
    degree: f64,
    inverse_kelvin: f64,
    r0: f64,
    branch: f64,
}

impl<'a> Circuit<'a> {
    pub(crate) fn new(setup: &'a Setup) -> Self {
        let cell = &setup.cell;
        let mut branch_ohm = [0.0; MAX_BRANCHES];
        let mut branch_rate = [0.0; MAX_BRANCHES];
        for (k, branch) in cell.branches.iter().take(MAX_BRANCHES).enumerate() {
            branch_ohm[k] = branch.resistance.0;
            branch_rate[k] = 1.0 / branch.time_constant.0;
        }
        Self {
            cell,
            parallel: f64::from(cell.parallel),
            charge_as: cell.charge_as(),
            branch_count: cell.branches.len().min(MAX_BRANCHES),
            branch_ohm,
            branch_rate,
            second: setup.second_protector.as_ref().map(Switch::new),
            ahead: setup.path.ahead.0,
            board: setup.board_in_path().map(Switch::new),
            after: setup.path.after.0,
            load: &setup.load,
            stall_ohm: setup.load.stall.unwrap_or(setup.load.unlit).0,
            anchor: Hint::new(Anchor { degree: f64::NAN, inverse_kelvin: 0.0, r0: 1.0, branch: 1.0 }),
            pieces: Default::default(),
        }
    }

    /// The Arrhenius factors of `R₀` and of the branches at `t` in °C, `1/T` in 1/K given.
    ///
    /// From the factors at the nearest whole degree by the series of eˣ: within half a degree |x| stays
    /// below 0.06 for activation energies up to 80 kJ/mol, where five terms are good to 10⁻⁸. It is a
    /// function of the temperature alone, whatever was asked before.
    fn arrhenius(&self, t: f64, inverse_kelvin: f64) -> (f64, f64) {
        let cell = self.cell;
        let mut anchor = self.anchor.get();
        // Inside half a degree the anchor is the nearest whole degree; on the half it is looked up.
        let near = (t - anchor.degree).abs() < 0.5;
        if !near {
            let degree = t.round();
            let inverse = 1.0 / Celsius(degree).kelvin();
            let x = (inverse - 1.0 / REFERENCE_K) / GAS_CONSTANT;
            anchor = Anchor {
                degree,
                inverse_kelvin: inverse,
                r0: exp(cell.r0_activation * x),
                branch: exp(cell.branch_activation * x),
            };
            self.anchor.set(anchor);
        }
        let x = (inverse_kelvin - anchor.inverse_kelvin) / GAS_CONSTANT;
        let series = |x: f64| 1.0 + x * (1.0 + x * (0.5 + x * (1.0 / 6.0 + x * (1.0 / 24.0))));
        (anchor.r0 * series(cell.r0_activation * x), anchor.branch * series(cell.branch_activation * x))
    }

    pub(crate) fn cell_now(&self, soc: f64, t: f64) -> CellNow {
        let cell = self.cell;
        let (u, u_slope) = cell.ocv.at_near(soc, &self.pieces[0]);
        let (entropy, entropy_slope) = cell.entropy.at_near(soc, &self.pieces[1]);
        let (shape, shape_slope) = cell.r0_shape.at_near(soc, &self.pieces[2]);
        let kelvin = Celsius(t).kelvin();
        let (r0_factor, branch_factor) = self.arrhenius(t, 1.0 / kelvin);
        let base = cell.r0.0 * cell.growth / self.parallel * r0_factor;
        let r0 = base * shape;
        CellNow {
            ocv: u + (t - 25.0) * entropy,
            ocv_slope: u_slope + (t - 25.0) * entropy_slope,
            entropy,
            r0,
            r0_slope: (base * shape_slope, -r0 * cell.r0_activation / (GAS_CONSTANT * kelvin * kelvin)),
            branch_factor: cell.branch_shape.at_near(soc, &self.pieces[3]).0 * cell.growth / self.parallel
                * branch_factor,
        }
    }

    /// The current that the path carries when its end is held at `v`.
    ///
    /// - `e`: the cell's inner voltage.
    /// - `factors`: of the board's pair and of the second protector's.
    pub(crate) fn path(&self, e: f64, r0: f64, factors: (f64, f64), v: f64) -> PathNow {
        match (&self.second, &self.board) {
            (None, None) => {
                let fixed = r0 + self.ahead + self.after;
                let current = (e - v) / fixed;
                PathNow {
                    current,
                    conductance: 1.0 / fixed,
                    board: e - current * (r0 + self.ahead),
                    cell: e - current * r0,
                    ..PathNow::default()
                }
            }
            (None, Some(switch)) => self.path_with_board(switch, e, r0, factors.0, v),
            (Some(second), board) => self.path_with_second(second, board.as_ref(), e, r0, factors, v),
        }
    }

    fn path_with_board(&self, switch: &Switch, e: f64, r0: f64, factor: f64, v: f64) -> PathNow {
        let upstream = r0 + self.ahead;
        let fixed = upstream + switch.shunt + self.after;
        let mut k = switch.hint.get();
        // Each move goes towards the root, which lies on one piece, so there are at most as many
        // moves as pieces; rounding at a knot could swing once between two, hence the count.
        for _ in 0..2 * switch.pieces.len() {
            let (_, at_zero, slope) = switch.pieces[k];
            // I·(fixed + f·(c + m·(e − I·R_up))) = e − v
            let a = -factor * slope * upstream;
            let b = fixed + factor * (at_zero + slope * e);
            let root = (b * b + 4.0 * a * (e - v)).max(0.0).sqrt();
            let current = 2.0 * (e - v) / (b + root);
            let board = e - current * upstream;
            let below = k > 0 && board < switch.pieces[k - 1].0;
            if below {
                k -= 1;
            } else if board > switch.pieces[k].0 {
                k += 1;
            } else {
                switch.hint.set(k);
                return PathNow {
                    current,
                    conductance: 1.0 / root,
                    pair: factor * (at_zero + slope * board),
                    pair_slope: factor * slope,
                    second: 0.0,
                    board,
                    cell: e - current * r0,
                };
            }
        }
        // Rounding right at a knot: both neighbours agree there to the last bits.
        let (_, at_zero, slope) = switch.pieces[k];
        let total = fixed + factor * switch.on.at(switch.pieces[k].0.min(1e3));
        let current = (e - v) / total;
        let board = e - current * upstream;
        PathNow {
            current,
            conductance: 1.0 / total,
            pair: factor * (at_zero + slope * board),
            pair_slope: factor * slope,
            second: 0.0,
            board,
            cell: e - current * r0,
        }
    }

    fn path_with_second(
        &self,
        second: &Switch,
        board: Option<&Switch>,
        e: f64,
        r0: f64,
        factors: (f64, f64),
        v: f64,
    ) -> PathNow {
        let fixed = r0 + second.shunt + self.ahead + self.after + board.map_or(0.0, |b| b.shunt);
        // Everything at one current, with d(I·R_total)/dI.
        let at = |current: f64| {
            let cell = e - current * r0;
            let (on, slope) = second.on.at_with_slope(cell);
            let (r2, r2_di) = (factors.1 * on, -factors.1 * slope * r0);
            let supply = cell - current * (r2 + second.shunt + self.ahead);
            let supply_di = -(r0 + r2 + second.shunt + self.ahead) - current * r2_di;
            let (pair, pair_slope) = board.map_or((0.0, 0.0), |b| {
                let (on, slope) = b.on.at_with_slope(supply);
                (factors.0 * on, factors.0 * slope)
            });
            let total = fixed + r2 + pair;
            let rise = total + current * (r2_di + pair_slope * supply_di);
            (
                PathNow {
                    current,
                    conductance: 1.0 / rise,
                    pair,
                    pair_slope,
                    second: r2,
                    board: supply,
                    cell,
                },
                total,
            )
        };
        let drop = e - v;
        let (mut low, mut high) = if drop >= 0.0 { (0.0, drop / fixed) } else { (drop / fixed, 0.0) };
        let mut current =
            drop / (fixed + factors.1 * second.on.at(e) + board.map_or(0.0, |b| factors.0 * b.on.at(e)));
        let mut now = at(current);
        for _ in 0..100 {
            let miss = current * now.1 - drop;
            if miss > 0.0 {
                high = current;
            } else {
                low = current;
            }
            let mut next = current - miss * now.0.conductance;
            if !(next > low && next < high) {
                next = 0.5 * (low + high);
            }
            let moved = (next - current).abs();
            current = next;
            now = at(current);
            if moved <= 1e-14 * current.abs() + 1e-15 {
                break;
            }
        }
        now.0
    }

    /// `dI/dt` at a held load voltage, from the rates of the slow states.
    ///
    /// From `I·R_total = e − V`: `∂/∂t` of both sides over `d(I·R_total)/dI`.
    pub(crate) fn current_drift(
        &self,
        path: &PathNow,
        e_rate: f64,
        r0_rate: f64,
        switch_rates: (f64, f64),
        factors: (f64, f64),
    ) -> f64 {
        let i = path.current;
        let pair_rate = match &self.board {
            Some(s) => path.pair / factors.0 * s.factor_slope() * switch_rates.0,
            None => 0.0,
        };
        let second_rate = match &self.second {
            Some(s) => path.second / factors.1 * s.factor_slope() * switch_rates.1,
            None => 0.0,
        };
        let supply_rate = e_rate - i * (r0_rate + second_rate);
        let resistance_rate = r0_rate + second_rate + pair_rate + path.pair_slope * supply_rate;
        path.conductance * (e_rate - i * resistance_rate)
    }

    /// Draw of the load without surge, and its slope over the voltage, at `v`.
    pub(crate) fn draw(&self, mode: Mode, v: f64) -> (f64, f64) {
        match mode {
            Mode::Stalled | Mode::Pinned => (v / self.stall_ohm, 1.0 / self.stall_ohm),
            Mode::Unlit => (v / self.load.unlit.0, 1.0 / self.load.unlit.0),
            Mode::Lit => self.lit_draw(v),
        }
    }

    /// Draw while lit, and its slope. A constant power is taken at 1 mV at least.
    pub(crate) fn lit_draw(&self, v: f64) -> (f64, f64) {
        match &self.load.lit {
            LitDraw::Current(i) => (i.0, 0.0),
            LitDraw::Power(p) => {
                let i = p.0 / v.max(1e-3);
                (i, -i / v.max(1e-3))
            }
            LitDraw::Resistance(r) => (v / r.0, 1.0 / r.0),
            LitDraw::Table(table) => {
                let (x, y) = (table.x(), table.y());
                let last = x.len() - 1;
                if v < x[0] {
                    (y[0] * v / x[0], y[0] / x[0])
                } else if v > x[last] {
                    (y[last] * v / x[last], y[last] / x[last])
                } else {
                    table.at_with_slope(v)
                }
            }
        }
    }
}
