//! What a step runs into, and where in it.

use super::{Crossing, EVENT_WITHIN, Mode, Moment, Point, Simulator, Step, Z};

impl Simulator<'_> {
    /// How far past each thing that could happen a point is, one after the other; positive when it
    /// happened.
    pub(super) fn each(&self, point: &Point, z: f64, t: f64, mut look: impl FnMut(f64, Crossing)) {
        let load = &self.setup.load;
        match self.mode {
            Mode::Stalled => look(point.at.v - load.start.0, Crossing::Start),
            Mode::Pinned => {
                let run = load.start.0 / load.unlit.0 + self.surge(t, Mode::Unlit);
                look(point.at.draw - run, Crossing::PinEndsAbove);
                look(load.start.0 / self.circuit.stall_ohm - point.at.draw, Crossing::PinEndsBelow);
            }
            Mode::Unlit => {
                look(load.start.0 - point.at.v, Crossing::BelowStart);
                if self.strike_since.is_none() {
                    look(point.at.v - load.strike.0, Crossing::Strike);
                } else {
                    look(load.strike.0 - point.at.v, Crossing::StrikeLost);
                }
            }
            Mode::Lit => look(load.hold.0 - point.at.v, Crossing::BelowHold),
        }
        for (k, watch) in self.watches.iter().enumerate() {
            let excess = self.excess(watch, &point.at);
            look(if watch.since.is_some() { -excess } else { excess }, Crossing::Limit(k));
        }
        look(-z, Crossing::Empty);
    }

    /// The furthest of them, without those in `skip` (a bit each, in their order).
    pub(super) fn furthest(&self, point: &Point, z: f64, t: f64, skip: u64) -> (f64, Crossing) {
        let mut most = (f64::NEG_INFINITY, Crossing::Empty);
        let mut bit = 1_u64;
        self.each(point, z, t, |value, crossing| {
            if value > most.0 && skip & bit == 0 {
                most = (value, crossing);
            }
            bit = bit.rotate_left(1);
        });
        most
    }

    /// The part of a step that ends where `crossing` happens, at about the fraction `x` of it.
    ///
    /// The interpolant has told where; the step is taken again to there and mended until it ends on
    /// the threshold itself.
    pub(super) fn land(&self, whole: &Step, x: f64, crossing: Crossing, now: &mut Moment<'_, '_>) -> Step {
        let (t, first) = (now.t, &now.point);
        let tally = &mut now.tally;
        const LANDED: f64 = 1e-9;
        let past = |point: &Point, z: f64, time: f64| {
            let mut found = 0.0;
            self.each(point, z, time, |value, which| {
                if which == crossing {
                    found = value;
                }
            });
            found
        };
        let mut h = (x * whole.h).max(f64::MIN_POSITIVE);
        let mut part = self.step(&whole.from, t, h, first);
        tally.steps += 1;
        let mut miss = past(&part.last, part.to[Z], t + h);
        if x == 0.0 || miss.abs() <= LANDED {
            return part;
        }
        let (near, other) = if x > 0.5 { (x - 0.02, 0.02) } else { (x + 0.02, -0.02) };
        let state = whole.at(near);
        let time = t + near * whole.h;
        let there = whole.at(x);
        let rise = past(&self.point(&there, t + x * whole.h), there[Z], t + x * whole.h)
            - past(&self.point(&state, time), state[Z], time);
        let mut slope = rise / (other * whole.h);
        for _ in 0..4 {
            let next = h - miss / slope;
            if !(next > 0.0 && next <= whole.h) {
                break;
            }
            let again = self.step(&whole.from, t, next, first);
            tally.steps += 1;
            let missed = past(&again.last, again.to[Z], t + next);
            if missed.abs() >= miss.abs() {
                break;
            }
            slope = (missed - miss) / (next - h);
            (part, h, miss) = (again, next, missed);
            if miss.abs() <= LANDED {
                break;
            }
        }
        part
    }

    /// The first thing that happens inside a step, and at what fraction of it.
    pub(super) fn find(&self, before: &Point, step: &Step, t: f64) -> Option<(f64, Crossing)> {
        // What a step begins past is what has just happened, to rounding; it counts only if the step
        // ends past it too.
        let mut skip = 0;
        let mut bit = 1_u64;
        self.each(before, step.from[Z], t, |value, _| {
            if value > 0.0 {
                skip |= bit;
            }
            bit = bit.rotate_left(1);
        });
        if skip != 0 {
            let (mut bit, mut still) = (1_u64, None);
            self.each(&step.last, step.to[Z], t + step.h, |value, crossing| {
                if value > 0.0 && skip & bit != 0 && still.is_none() {
                    still = Some(crossing);
                }
                bit = bit.rotate_left(1);
            });
            if let Some(crossing) = still {
                return Some((0.0, crossing));
            }
        }
        let at = |x: f64| {
            let y = step.at(x);
            let time = t + x * step.h;
            self.furthest(&self.point(&y, time), y[Z], time, skip)
        };
        let mut high = 1.0;
        let mut there = self.furthest(&step.last, step.to[Z], t + step.h, skip);
        // V may turn inside the step and touch something that both ends miss.
        let (v0, v1) = if self.slaved {
            (before.drift, step.last.drift)
        } else {
            (before.at.charging, step.last.at.charging)
        };
        if v0 * v1 < 0.0 {
            let turn = v0 / (v0 - v1);
            let extreme = at(turn);
            if extreme.0 > 0.0 {
                (high, there) = (turn, extreme);
            }
        }
        if there.0 <= 0.0 || there.0.is_nan() {
            return None;
        }
        let mut low = 0.0;
        let mut below = self.furthest(before, step.from[Z], t, skip).0;
        let mut above = there.0;
        // Regula falsi with the Illinois correction, bisection as a last resort.
        let mut side = 0;
        for round in 0..60 {
            if high - low <= EVENT_WITHIN {
                break;
            }
            let secant = low + (high - low) * (-below / (above - below));
            let x = if round > 20 || !(secant > low && secant < high) { 0.5 * (low + high) } else { secant };
            let value = at(x);
            if value.0 > 0.0 {
                (high, above, there) = (x, value.0, value);
                if side == 1 {
                    below *= 0.5;
                }
                side = 1;
            } else {
                (low, below) = (x, value.0);
                if side == -1 {
                    above *= 0.5;
                }
                side = -1;
            }
            if there.0.abs() < 1e-12 {
                break;
            }
        }
        Some((high, there.1))
    }
}
