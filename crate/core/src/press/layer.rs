//! The fast stretch after a change, by quadrature.
//!
//! For the first few time constants of the input capacitor the slow states stand still, so the
//! capacitor's equation `dv_C/dt = i_C(V)/C` has only V in it and time is an integral over V:
//! `t = ∫ C·(dv_C/dV)/i_C dV`. A threshold is then a bound of the integral instead of a root to be
//! searched for in time. Where the stretch ends on an operating point V_e, which it reaches never, the
//! variable is `s = ln[(V_e − V₀)/(V_e − V)]`, in which the integrand is smooth up to the end.
//!
//! What it leaves out is checked afterwards: where the slow states would have moved the source by more
//! than a few microvolts, where a surge flows or a sample is wanted, the stretch is left to the steps.

use crate::load::LitDraw;

use super::{
    BRANCH, CAP, CELL_T, CHARGE, Celsius, Crossing, ESR, Held, I2, LOAD, MAX_BRANCHES, Mode, Moment, PAIR,
    SECOND, SECOND_T, SUMS, SWITCH_T, Simulator, Z,
};

/// Nodes and weights of Gauss and Legendre's rule with five points on −1 to 1, exact to degree 9.
///
/// Source: Abramowitz and Stegun, Handbook of Mathematical Functions, table 25.4.
const NODES: [(f64, f64); 5] = [
    (-0.906_179_845_938_664, 0.236_926_885_056_189),
    (-0.538_469_310_105_683, 0.478_628_670_499_366),
    (0.0, 0.568_888_888_888_889),
    (0.538_469_310_105_683, 0.478_628_670_499_366),
    (0.906_179_845_938_664, 0.236_926_885_056_189),
];
/// How near to an operating point a stretch goes, in V; the capacitor is slaved from there.
const NEAR: f64 = 1e-6;
/// Energy, in J, by which the capacitor's may be wrong where the end of a stretch is taken as straight over V.
const TAIL_WITHIN: f64 = 1e-10;
/// How long Newton's last move to an operating point may be, in V.
const FOUND: f64 = 1e-8;
/// How far the slow states may move the source within a stretch, in V.
const STILL: f64 = 6e-5;

/// Where a stretch leads.
#[derive(Clone, Copy)]
enum Goal {
    /// To a threshold.
    Threshold(Crossing),
    /// To an operating point, and stays.
    Settled,
}

impl Simulator<'_> {
    /// Follows the fast stretch from `now`, if it is one; whether it did.
    pub(super) fn layer(&mut self, now: &mut Moment<'_, '_>, stop: f64) -> bool {
        let load = &self.setup.load;
        let wants_samples = now.recorder.as_ref().is_some_and(|r| now.next_sample < r.wanted.len());
        let surges = load.surge.0 > 0.0 && self.surge_from.is_some();
        if self.slaved || self.mode == Mode::Pinned || load.esr.0 > 0.0 || wants_samples || surges {
            return false;
        }
        let from = now.point;
        let Some((last, goal, settled)) = self.goal(now) else { return false };
        let to = last.v;
        let Some((length, sums, nodes)) = self.quadrature(now, &last, settled) else { return false };
        let c = &self.circuit;
        // The slow states over the stretch, to first order; they must hardly have moved.
        let charge = sums[CHARGE];
        let mut y = now.y;
        y[Z] -= charge / c.charge_as;
        let mut moved = from.cell.ocv_slope.abs() * charge / c.charge_as;
        for k in 0..MAX_BRANCHES {
            let r = c.branch_ohm[k] * from.cell.branch_factor;
            let rise = (r * charge - now.y[BRANCH + k] * length) * c.branch_rate[k];
            y[BRANCH + k] += rise;
            moved += rise.abs();
        }
        if moved > STILL || now.t + length >= stop || y[Z] <= 0.0 {
            return false;
        }
        let cell = &self.setup.cell;
        let ambient = self.setup.usage.ambient.0;
        let kelvin = Celsius(now.y[CELL_T]).kelvin();
        let heat = charge * (from.polar - kelvin * from.cell.entropy) + sums[I2] * from.cell.r0;
        y[CELL_T] +=
            (heat - cell.cooling_w_per_k * (y[CELL_T] - ambient) * length) / cell.heat_capacity_j_per_k;
        if let Some(s) = &c.board {
            y[SWITCH_T] +=
                (sums[PAIR] * s.thermal_k_per_w - (y[SWITCH_T] - ambient) * length) / s.thermal_time_s;
        }
        if let Some(s) = &c.second {
            y[SECOND_T] +=
                (sums[SECOND] * s.thermal_k_per_w - (y[SECOND_T] - ambient) * length) / s.thermal_time_s;
        }
        y[CAP] = to;
        now.tally.steps += nodes;
        self.book(&mut now.tally, &sums, (from.at.v, last.v), length);
        now.tally.reach(&y, last.path.current);
        now.y = y;
        now.t += length;
        self.guess = to;
        match goal {
            Goal::Settled => {
                self.slaved = true;
                now.point = self.point(&now.y, now.t);
                now.stale = false;
                self.settle_charge(now, to);
                // A load that the slow states move too fast for that is followed by steps.
                self.change_regime(now);
            }
            Goal::Threshold(crossing) => {
                // The slow states have hardly moved: what follows at once needs path and load only. The rates
                // are filled in before a step needs them.
                now.point.at = last;
                now.point.polar = y[BRANCH] + y[BRANCH + 1] + y[BRANCH + 2];
                now.stale = true;
                self.cross(crossing, now);
            }
        }
        true
    }

    /// Books the charge by which the capacitor follows the slow states to where they have moved the operating
    /// point during the stretch: it flows through the path as the current does there, but not into the load.
    fn settle_charge(&self, now: &mut Moment<'_, '_>, from: f64) {
        let held = now.point.at;
        if held.path.current <= 0.0 {
            return;
        }
        let charge = self.setup.load.capacitance.0 * (held.v - from);
        let time = charge / held.path.current;
        let flow = now.point.flow_at(&held);
        for (k, sum) in now.tally.sums.iter_mut().enumerate() {
            if k != LOAD && k != ESR {
                *sum += time * flow[k];
            }
        }
    }

    /// Where the capacitor is heading: path and load there, what is there, and the operating point if the way
    /// leads towards one.
    fn goal(&self, now: &Moment<'_, '_>) -> Option<(Held, Goal, Option<f64>)> {
        let load = &self.setup.load;
        let from = &now.point;
        if from.at.charging.abs() < 1e-9 {
            return None;
        }
        let rising = from.at.charging > 0.0;
        let threshold = match (self.mode, rising) {
            (Mode::Stalled, true) => Some((load.start.0, Crossing::Start)),
            (Mode::Unlit, true) if self.strike_since.is_none() => Some((load.strike.0, Crossing::Strike)),
            (Mode::Unlit, false) if self.strike_since.is_some() => {
                Some((load.strike.0, Crossing::StrikeLost))
            }
            (Mode::Unlit, false) => Some((load.start.0, Crossing::BelowStart)),
            (Mode::Lit, false) => Some((load.hold.0, Crossing::BelowHold)),
            (Mode::Stalled, false) | (Mode::Lit, true) | (Mode::Unlit, true) => None,
            (Mode::Pinned, _) => return None,
        };
        // Past it already, by rounding or because it was just left: not a stretch.
        let threshold = threshold.filter(|(v, _)| if rising { *v > from.at.v } else { *v < from.at.v });
        let at_threshold = threshold.map(|(v, _)| self.held(now, v));
        let reached = at_threshold
            .is_some_and(|there| if rising { there.charging > 0.0 } else { there.charging < 0.0 });
        let knot = self.turning_knot(now, threshold.map(|(v, _)| v));
        let settled = match threshold {
            // i_C keeps its sign to the threshold if it has one change of sign at most; constant power has two.
            Some((v, _)) if knot.is_none() && reached => self.power_meeting(now, v),
            _ => Some(self.operating_point(now, knot.or(threshold.map(|(v, _)| v)))?),
        };
        let (mut end, mut goal) = match (settled, at_threshold.zip(threshold)) {
            (Some(v), _) => (self.held(now, v + if rising { -NEAR } else { NEAR }), Goal::Settled),
            (None, Some((there, (_, crossing)))) => (there, Goal::Threshold(crossing)),
            (None, None) => return None,
        };
        if (end.v - from.at.v) * from.at.charging <= 0.0 {
            return None;
        }
        // A limit whose sign changes on the way comes first.
        for k in 0..self.watches.len() {
            let watch = &self.watches[k];
            let over = watch.since.is_some();
            let passes = |excess: f64| if over { excess < 0.0 } else { excess > 0.0 };
            if passes(self.excess(watch, &from.at)) || !passes(self.excess(watch, &end)) {
                continue;
            }
            end = self.at_limit(now, k, &end);
            goal = Goal::Threshold(Crossing::Limit(k));
        }
        Some((end, goal, settled))
    }

    /// Path and load with the load held at `v`, the slow states as they are.
    fn held(&self, now: &Moment<'_, '_>, v: f64) -> Held {
        let point = &now.point;
        let e = point.cell.ocv - point.polar;
        let path = self.circuit.path(e, point.cell.r0, self.factors(&now.y), v);
        let (draw, draw_slope) = self.circuit.draw(self.mode, v);
        Held { path, v, draw, draw_slope, charging: path.current - draw }
    }

    /// On a measured table that may rise and fall: the first of its points on the way to `limit` beyond which
    /// the capacitor would turn back. Between two points the draw is straight, and there is one change of sign.
    fn turning_knot(&self, now: &Moment<'_, '_>, limit: Option<f64>) -> Option<f64> {
        let (Mode::Lit, LitDraw::Table(table)) = (self.mode, &self.setup.load.lit) else { return None };
        let from = &now.point.at;
        let rising = from.charging > 0.0;
        let turns = |v: &f64| (self.held(now, *v).charging > 0.0) != rising;
        if rising {
            let far = limit.unwrap_or(f64::INFINITY);
            table.x().iter().copied().filter(|v| (from.v..far).contains(v)).find(turns)
        } else {
            let far = limit.unwrap_or(0.0);
            table.x().iter().rev().copied().filter(|v| *v > far && *v < from.v).find(turns)
        }
    }

    /// Where the fall from above onto a constant power ends, if it does above `limit`.
    ///
    /// `i_C(V)` is concave on each straight piece of the switch's resistance, so Newton's rule comes down to the
    /// upper meeting point and not past it; where there is none it leaves towards the limit or meets a slope
    /// that leads nowhere. A bend between two pieces can take it past the point, which is then in a bracket.
    fn power_meeting(&self, now: &Moment<'_, '_>, limit: f64) -> Option<f64> {
        let (Mode::Lit, LitDraw::Power(_)) = (self.mode, &self.setup.load.lit) else { return None };
        let mut point = now.point.at;
        for _ in 0..60 {
            let stiffness = point.path.conductance + point.draw_slope;
            let next = point.v + point.charging / stiffness;
            if stiffness <= 0.0 || next <= limit {
                return None;
            }
            if (next - point.v).abs() < FOUND {
                return Some(next);
            }
            point = self.held(now, next);
            if point.charging > 0.0 {
                return self.operating_point(now, Some(next));
            }
        }
        None
    }

    /// The operating point ahead, found by Newton's rule kept between the start and `limit`.
    fn operating_point(&self, now: &Moment<'_, '_>, limit: Option<f64>) -> Option<f64> {
        let from = &now.point;
        let rising = from.at.charging > 0.0;
        let far = limit.unwrap_or(if rising { from.cell.ocv - from.polar } else { 1e-3 });
        let (mut before, mut behind) = (from.at.v, far);
        let mut v = from.at.v;
        let mut point = from.at;
        for _ in 0..60 {
            let stiffness = point.path.conductance + point.draw_slope;
            let by = point.charging / stiffness;
            if stiffness > 0.0 && by.abs() < FOUND {
                // What is left is of the order of the square of that.
                return Some(v + by);
            }
            let mut next = v + by;
            let inside = if rising { next > before && next < behind } else { next < before && next > behind };
            if !(stiffness > 0.0 && inside) {
                next = 0.5 * (before + behind);
                if next == before || next == behind {
                    return None;
                }
            }
            v = next;
            point = self.held(now, v);
            if (point.charging > 0.0) == rising {
                before = v;
            } else {
                behind = v;
            }
        }
        None
    }

    /// The place between here and `end` at which limit `k` is just met.
    fn at_limit(&self, now: &Moment<'_, '_>, k: usize, end: &Held) -> Held {
        let excess = |held: &Held| self.excess(&self.watches[k], held);
        let (mut a, mut b) = (now.point.at.v, end.v);
        let (mut at_a, mut at_b) = (excess(&now.point.at), excess(end));
        let mut there = *end;
        let mut side = 0;
        for _ in 0..60 {
            let secant = a + (b - a) * at_a / (at_a - at_b);
            let v =
                if secant.is_finite() && (secant - a) * (secant - b) < 0.0 { secant } else { 0.5 * (a + b) };
            there = self.held(now, v);
            let value = excess(&there);
            // Far below what counts as past a limit.
            if value.abs() < 1e-11 || (b - a).abs() < 1e-12 {
                return there;
            }
            if (value > 0.0) == (at_a > 0.0) {
                (a, at_a) = (v, value);
                if side == 1 {
                    at_b *= 0.5;
                }
                side = 1;
            } else {
                (b, at_b) = (v, value);
                if side == -1 {
                    at_a *= 0.5;
                }
                side = -1;
            }
        }
        there
    }

    /// Time and sums of the way to `last`, and how many nodes it took.
    fn quadrature(
        &self,
        now: &Moment<'_, '_>,
        last: &Held,
        settled: Option<f64>,
    ) -> Option<(f64, [f64; SUMS], u32)> {
        let (from, to) = (now.point.at.v, last.v);
        let capacitance = self.setup.load.capacitance.0;
        let mut length = 0.0;
        let mut sums = [0.0; SUMS];
        let mut nodes = 0;
        // `dv` is dV over the variable of integration at V.
        let mut add = |v: f64, dv: f64, weight: f64| {
            let point = self.held(now, v);
            let time = weight * capacitance * dv / point.charging;
            length += time;
            for (sum, flow) in sums.iter_mut().zip(now.point.flow_at(&point)) {
                *sum += time * flow;
            }
            nodes += 1;
        };
        match settled {
            Some(v_e) => {
                let whole = v_e - from;
                let all = crate::math::ln(whole / (v_e - to));
                let mut a = 0.0;
                // The integrand goes to a constant as e^(−s): pieces grow with s.
                // What is not straight in the tail is of the order of C·(V_e − V)² there.
                let tail = 0.5 * crate::math::ln(capacitance * whole * whole / TAIL_WITHIN);
                let tail = tail.clamp(1.5, 10.0);
                for b in [1.5, if tail <= 6.5 { tail } else { 5.0 }, tail] {
                    let b = all.min(b).min(tail);
                    if b <= a {
                        break;
                    }
                    let (middle, half) = (0.5 * (a + b), 0.5 * (b - a));
                    for (x, weight) in NODES {
                        let away = whole * crate::math::exp(-(middle + half * x));
                        add(v_e - away, away, weight * half);
                    }
                    a = b;
                }
                if all > a {
                    // So near the operating point everything is straight over V, and the way is an exponential:
                    // two places tell all. `away` integrates to its own fall, over what falls by one in an s.
                    let (begin, end) = (whole * crate::math::exp(-a), v_e - to);
                    let mean = (begin - end) / (all - a);
                    // Weights that integrate 1 and `away` over s exactly, from the places `begin` and `end`.
                    let at_begin = (all - a) * (mean - end) / (begin - end);
                    add(v_e - begin, begin, at_begin);
                    add(v_e - end, end, (all - a) - at_begin);
                }
            }
            None => {
                // Near an operating point 1/i_C is steep: two pieces there.
                let steep = last.charging / now.point.at.charging < 0.3;
                let pieces = if steep { 2 } else { 1 };
                let piece = (to - from) / f64::from(pieces);
                for k in 0..pieces {
                    let middle = from + piece * (f64::from(k) + 0.5);
                    for (x, weight) in NODES {
                        add(middle + 0.5 * piece * x, 1.0, weight * 0.5 * piece);
                    }
                }
            }
        }
        (length.is_finite() && length >= 0.0).then_some((length, sums, nodes))
    }
}
