//! The equations: everything at one instant from the state, and when the capacitor is slaved.

use super::{
    BRANCH, CAP, CELL_T, Celsius, Held, MAX_BRANCHES, Mode, Moment, Point, SECOND_T, SLAVED_WITHIN, STATES,
    SWITCH_T, Simulator, Step, Y, Z, dormand_prince, exp,
};

/// A surge below this many A is over: over its time constant it moves microvolts.
const SURGE_OVER: f64 = 1e-5;
/// How much of a surge's second-order lag is not in the drift. Path and load bend by a few percent over it; it is held against
/// the solved voltage in every step.
const SURGE_BEND: f64 = 0.1;

/// How long Newton's last move to the operating point may be, in V: what is left after it is of the order of its
/// square.
const MEETS: f64 = 1e-5;

impl Simulator<'_> {
    pub(super) fn factors(&self, y: &Y) -> (f64, f64) {
        let c = &self.circuit;
        (
            c.board.as_ref().map_or(0.0, |s| s.factor(y[SWITCH_T])),
            c.second.as_ref().map_or(0.0, |s| s.factor(y[SECOND_T])),
        )
    }

    /// Extra current after the start, in a running load.
    pub(super) fn surge(&self, t: f64, mode: Mode) -> f64 {
        match (mode, self.surge_from) {
            (Mode::Unlit | Mode::Lit, Some(from)) if self.setup.load.surge.0 > 0.0 => {
                let x = (t - from) / self.setup.load.surge_time.0;
                // Below 10⁻¹⁷ of itself it no longer moves a digit.
                if x > 40.0 { 0.0 } else { self.setup.load.surge.0 * exp(-x) }
            }
            _ => 0.0,
        }
    }

    /// Voltage of the capacitor itself.
    pub(super) fn capacitor(&self, y: &Y, point: &Point) -> f64 {
        if self.slaved { point.at.v - self.setup.load.esr.0 * point.at.charging } else { y[CAP] }
    }

    /// The capacitor becomes a state of its own, from where it is.
    pub(super) fn free(&mut self, now: &mut Moment<'_, '_>) {
        if self.slaved {
            now.y[CAP] = self.capacitor(&now.y, &now.point);
            self.slaved = false;
        }
    }

    pub(super) fn step(&self, y: &Y, t: f64, h: f64, first: &Point) -> Step {
        dormand_prince::step(y, t, h, first, |y, t| self.point(y, t))
    }

    /// Everything at one instant, from the state.
    pub(super) fn point(&self, y: &Y, t: f64) -> Point {
        let c = &self.circuit;
        let load = &self.setup.load;
        let cell = c.cell_now(y[Z], y[CELL_T]);
        let polar = y[BRANCH] + y[BRANCH + 1] + y[BRANCH + 2];
        let e = cell.ocv - polar;
        let factors = self.factors(y);
        let surge = self.surge(t, self.mode);
        let at = |v: f64| {
            let path = c.path(e, cell.r0, factors, v);
            let (draw, slope) = c.draw(self.mode, v);
            let draw = draw + surge;
            Held { path, v, draw, draw_slope: slope, charging: path.current - draw }
        };
        let mut point = Point { rate: [0.0; STATES], cell, polar, at: Held::default(), drift: 0.0 };
        if self.mode == Mode::Pinned {
            let v = load.start.0;
            let path = c.path(e, cell.r0, factors, v);
            let charging = if load.esr.0 == 0.0 || self.slaved { 0.0 } else { (v - y[CAP]) / load.esr.0 };
            point.at = Held { path, v, draw: path.current - charging, draw_slope: 0.0, charging };
        } else if self.slaved {
            point.at = self.meet(y[CAP], cell.r0, &at);
        } else if load.esr.0 == 0.0 {
            point.at = at(y[CAP]);
        } else {
            point.at = self.behind_esr(y[CAP], e, &at);
        }
        self.fill_rates(&mut point, y, factors, surge);
        if self.slaved && self.mode != Mode::Pinned {
            // i_C = C·dV/dt moves the operating point a little.
            let charging = load.capacitance.0 * point.drift;
            let shift = -charging / (point.at.path.conductance + point.at.draw_slope);
            let extra = self.shift(&mut point.at, shift, cell.r0);
            point.at.charging = point.at.path.current - point.at.draw;
            self.add_current(&mut point, extra);
        }
        point
    }

    /// Moves a held point by a small voltage, to first order; the current that it gains.
    fn shift(&self, held: &mut Held, by: f64, r0: f64) -> f64 {
        let c = &self.circuit;
        let extra = -held.path.conductance * by;
        let second_shunt = c.second.as_ref().map_or(0.0, |s| s.shunt);
        held.v += by;
        held.draw += held.draw_slope * by;
        held.path.current += extra;
        held.path.cell -= extra * r0;
        held.path.board -= extra * (r0 + c.ahead + held.path.second + second_shunt);
        extra
    }

    /// The operating point nearest to `guess`: where path and load draw the same.
    fn meet(&self, guess: f64, r0: f64, at: &impl Fn(f64) -> Held) -> Held {
        let mut held = at(guess);
        for _ in 0..20 {
            let by = held.charging / (held.path.conductance + held.draw_slope);
            if by.abs() < MEETS {
                // What is left is of the order of the square of that.
                self.shift(&mut held, by, r0);
                return held;
            }
            held = at(held.v + by);
        }
        // The point has vanished: with the current nothing in a step that meets this is a number, and the
        // step is refused.
        held.v = f64::NAN;
        held.path.current = f64::NAN;
        held
    }

    /// The rates, for a current that is a little larger.
    fn add_current(&self, point: &mut Point, extra: f64) {
        let c = &self.circuit;
        let twice = 2.0 * point.at.path.current * extra;
        point.rate[Z] -= extra / c.charge_as;
        for k in 0..MAX_BRANCHES {
            point.rate[BRANCH + k] += extra * c.branch_ohm[k] * point.cell.branch_factor * c.branch_rate[k];
        }
        point.rate[CELL_T] +=
            (extra * point.polar + twice * point.cell.r0) / self.setup.cell.heat_capacity_j_per_k;
        if let Some(s) = &c.board {
            point.rate[SWITCH_T] += twice * point.at.path.pair * s.thermal_k_per_w / s.thermal_time_s;
        }
        if let Some(s) = &c.second {
            point.rate[SECOND_T] += twice * point.at.path.second * s.thermal_k_per_w / s.thermal_time_s;
        }
    }

    /// The voltage at the load when the capacitor with its series resistance is at `cap`.
    ///
    /// `V − v_C − ESR·(I(V) − I_load(V))` rises with V above the voltage at which a falling draw is
    /// steeper than 1/ESR; below that there is nothing to find, and the arc has dropped.
    pub(super) fn behind_esr(&self, cap: f64, e: f64, at: &impl Fn(f64) -> Held) -> Held {
        let esr = self.setup.load.esr.0;
        let mut low = match (&self.mode, &self.setup.load.lit) {
            (Mode::Lit, crate::load::LitDraw::Power(p)) => (esr * p.0).sqrt().max(1e-3),
            _ => 0.0,
        };
        let mut high = e.max(cap);
        let mut v = self.guess.clamp(low, high.max(low));
        let mut now = at(v);
        for _ in 0..100 {
            let miss = v - cap - esr * now.charging;
            if miss > 0.0 {
                high = v;
            } else {
                low = v;
            }
            let mut next = v - miss / (1.0 + esr * (now.path.conductance + now.draw_slope));
            if !(next >= low && next <= high) {
                next = 0.5 * (low + high);
            }
            let moved = (next - v).abs();
            v = next;
            now = at(v);
            if moved <= 1e-13 {
                break;
            }
        }
        now
    }

    pub(super) fn fill_rates(&self, point: &mut Point, y: &Y, factors: (f64, f64), surge: f64) {
        let c = &self.circuit;
        let cell = &self.setup.cell;
        let ambient = self.setup.usage.ambient.0;
        let i = point.at.path.current;
        let i2 = i * i;
        let rate = &mut point.rate;
        rate[Z] = -i / c.charge_as;
        let mut polar_rate = 0.0;
        for k in 0..MAX_BRANCHES {
            let r = c.branch_ohm[k] * point.cell.branch_factor;
            rate[BRANCH + k] = (i * r - y[BRANCH + k]) * c.branch_rate[k];
            polar_rate += rate[BRANCH + k];
        }
        let heat =
            i * (point.polar + i * point.cell.r0) - i * Celsius(y[CELL_T]).kelvin() * point.cell.entropy;
        rate[CELL_T] = (heat - cell.cooling_w_per_k * (y[CELL_T] - ambient)) / cell.heat_capacity_j_per_k;
        if let Some(s) = &c.board {
            rate[SWITCH_T] =
                (i2 * point.at.path.pair * s.thermal_k_per_w - (y[SWITCH_T] - ambient)) / s.thermal_time_s;
        }
        if let Some(s) = &c.second {
            rate[SECOND_T] =
                (i2 * point.at.path.second * s.thermal_k_per_w - (y[SECOND_T] - ambient)) / s.thermal_time_s;
        }
        rate[CAP] = point.at.charging / self.setup.load.capacitance.0;
        let e_rate = point.cell.ocv_slope * rate[Z] + point.cell.entropy * rate[CELL_T] - polar_rate;
        let r0_rate = point.cell.r0_slope.0 * rate[Z] + point.cell.r0_slope.1 * rate[CELL_T];
        let drift =
            c.current_drift(&point.at.path, e_rate, r0_rate, (rate[SWITCH_T], rate[SECOND_T]), factors);
        let stiffness = point.at.path.conductance + point.at.draw_slope;
        // A decaying surge seen through a first-order lag: s·e^(−t/τ)/(1 − τ_fast/τ).
        let surge_drift = if surge > 0.0 {
            let lag = self.fast_time(point) / self.setup.load.surge_time.0;
            surge / self.setup.load.surge_time.0 / (1.0 - lag).max(0.5)
        } else {
            0.0
        };
        point.drift = (drift + surge_drift) / stiffness;
        if self.slaved {
            // Kept beside the solved voltage, to be held against it.
            point.rate[CAP] = if self.mode == Mode::Pinned { 0.0 } else { point.drift };
        }
    }

    /// Time constant with which the capacitor follows.
    pub(super) fn fast_time(&self, point: &Point) -> f64 {
        let load = &self.setup.load;
        if self.mode == Mode::Pinned {
            return load.capacitance.0 * load.esr.0;
        }
        load.capacitance.0 * (1.0 / (point.at.path.conductance + point.at.draw_slope) + load.esr.0)
    }

    /// Takes the capacitor out of the state, or puts it back; whether it did.
    pub(super) fn change_regime(&mut self, now: &mut Moment<'_, '_>) -> bool {
        let point = now.point;
        let load = &self.setup.load;
        let stiffness = point.at.path.conductance + point.at.draw_slope;
        if self.mode == Mode::Pinned {
            let settled = load.esr.0 == 0.0 || (point.at.v - now.y[CAP]).abs() < SLAVED_WITHIN;
            if !self.slaved && settled {
                self.slaved = true;
                return true;
            }
            return false;
        }
        let fast = self.fast_time(&point);
        // The operating point must move slowly against the capacitor's time constant: what is
        // neglected is τ² times its second derivative, about the drift over the shortest slow time.
        let mut slow_rate = self.circuit.branch_rate.iter().copied().fold(0.0, f64::max);
        let mut part = 1.0;
        if self.surge_now(&point) {
            slow_rate = slow_rate.max(1.0 / load.surge_time.0);
            // The lag behind a decaying surge is in the drift already; what is neglected is only how far path and
            // load are from straight lines over it.
            part = SURGE_BEND;
        }
        let neglected = part * fast * fast * point.drift.abs() * slow_rate;
        let follows = stiffness > 0.0 && neglected < SLAVED_WITHIN && fast * slow_rate < 0.05;
        if self.slaved {
            if follows {
                return false;
            }
            self.free(now);
            return true;
        }
        let away = (point.at.charging / load.capacitance.0 - point.drift) * fast;
        if follows && away.abs() < SLAVED_WITHIN && neglected < 0.3 * SLAVED_WITHIN {
            self.slaved = true;
            self.guess = point.at.v;
            return true;
        }
        false
    }

    pub(super) fn surge_now(&self, point: &Point) -> bool {
        let (draw, _) = self.circuit.draw(self.mode, point.at.v);
        point.at.draw - draw > SURGE_OVER
    }

    /// A first step after a change.
    pub(super) fn first_step(&self, point: &Point) -> f64 {
        if self.slaved {
            return self.hints[usize::from(self.mode == Mode::Lit)];
        }
        let fast = self.fast_time(point);
        let fast = if fast > 0.0 { fast } else { self.setup.load.capacitance.0 / point.at.path.conductance };
        (0.4 * fast).max(1e-12)
    }
}
