//! One charge: press after press from a full cell, every press simulated, until it ends.
//!
//! It starts full, at ambient temperature and relaxed; from press to press everything but the input
//! capacitor is carried on. In a rest the current is the standby draw, so branches and temperatures
//! have closed forms; the only thing that can happen is an over-discharge limit or an empty cell.
//! A rest costs a handful of exponentials.

use crate::cell::MAX_BRANCHES;
use crate::math::exp;
use crate::press::{BRANCH, CELL_T, PressOptions, PressStart, SECOND_T, STATES, SWITCH_T, Simulator, Z};
use crate::report::{ChargeEnd, ChargeReport, Ledger, Limit, PressEnd, PressLine, PressSummary};
use crate::setup::Setup;
use crate::units::{AmpHours, Celsius, Joules, Seconds, Volts};

/// Usual bound on the integration steps of one charge beyond what its presses ordinarily take; reaching it is a
/// stated outcome.
///
/// A load that flickers lights once per strike time, thousands of times a press: that is what the bound is for.
pub const MAX_STEPS: u64 = 150_000;
/// What a press may take without being counted as extraordinary: some sixty are usual, some 260 with a surge.
pub const STEPS_PER_PRESS: u64 = 500;

/// Simulates one charge.
pub fn run(setup: &Setup) -> ChargeReport {
    run_from(setup, &PressStart::relaxed(setup, 1.0, setup.usage.ambient), MAX_STEPS)
}

/// Simulates a charge from another place than full and relaxed, with a bound of its own beside
/// [`STEPS_PER_PRESS`].
pub fn run_from(setup: &Setup, start: &PressStart, max_steps: u64) -> ChargeReport {
    follow(setup, start, max_steps, false).0
}

/// A charge that is followed to its first press that is not full, with that one; the end is then
/// [`ChargeEnd::PressLimit`], unless the press ended the charge itself.
pub fn run_full_presses(setup: &Setup) -> ChargeReport {
    follow(setup, &PressStart::relaxed(setup, 1.0, setup.usage.ambient), MAX_STEPS, true).0
}

/// Where the press with this index in the charge begins, to look at it more closely; `None` if the
/// charge has no such press.
pub fn press_start(setup: &Setup, index: usize) -> Option<PressStart> {
    let mut limited = setup.clone();
    limited.usage.max_presses = u32::try_from(index).ok()?.checked_add(1)?;
    let (report, start) =
        follow(&limited, &PressStart::relaxed(setup, 1.0, setup.usage.ambient), u64::MAX, false);
    (report.presses.len() == index + 1).then_some(start)
}

/// A charge from `start`, and where its last press began.
fn follow(setup: &Setup, start: &PressStart, max_steps: u64, full_only: bool) -> (ChargeReport, PressStart) {
    let mut simulator = Simulator::new(setup, PressOptions::default().max_events);
    let mut y = start.state();
    let mut report = empty_report(setup);
    let mut last_start;
    let mut after_full = false;
    report.end = loop {
        let number = report.presses.len() as u32 + 1;
        let rested = simulator.terminal(&y, setup.usage.standby.0);
        if core::mem::take(&mut after_full) {
            report.mark_in_use_after = Some(Volts(rested));
        }
        last_start = PressStart::from_state(&y);
        let soc = y[Z];
        let allowed = max_steps.saturating_add(STEPS_PER_PRESS.saturating_mul(u64::from(number)));
        let left = allowed.saturating_sub(report.steps);
        let summary = simulator.press(&mut y, None, left);
        let full = summary.not_full.is_none();
        report.steps += u64::from(summary.steps);
        report.clock.0 += summary.end_time.0;
        report.lit.0 += summary.lit.0;
        add(&mut report.ledger, &summary.ledger);
        warmest(&mut report, &summary);
        if full {
            report.full_presses += 1;
            report.recharge_mark = Some(setup.cell.open_circuit(y[Z], setup.usage.ambient));
            report.mark_relaxed_before = Some(setup.cell.open_circuit(soc, setup.usage.ambient));
            report.mark_in_use_before = Some(Volts(rested));
            report.mark_in_use_after = None;
            after_full = true;
        } else if report.first_imperfect.is_none() {
            report.first_imperfect = Some(report.presses.len());
        }
        let (end, not_full, lit) = (summary.end, summary.not_full, summary.lit);
        report.presses.push(PressLine { number, rested: Volts(rested), summary });
        match end {
            PressEnd::Opened(limit) => break ChargeEnd::Opened(limit),
            PressEnd::CellEmpty => break ChargeEnd::CellEmpty,
            PressEnd::EventLimit => break ChargeEnd::WorkLimit,
            PressEnd::Released => {}
        }
        if let (Some(why), true) = (not_full, lit.0 == 0.0) {
            break ChargeEnd::NoLitTime(why);
        }
        if number >= setup.usage.max_presses || (full_only && not_full.is_some()) {
            break ChargeEnd::PressLimit;
        }
        if report.steps >= allowed {
            break ChargeEnd::WorkLimit;
        }
        let rest = simulator.rest(&mut y, setup.usage.rest.0);
        report.clock.0 += rest.length;
        report.ledger.source.0 += rest.source;
        report.ledger.cell_ohmic.0 += rest.ohmic;
        report.ledger.cell_polarisation.0 += rest.polar;
        report.ledger.second_protector.0 += rest.second;
        report.ledger.ahead.0 += rest.ahead;
        report.ledger.standby.0 += rest.standby;
        match rest.end {
            RestEnd::Over => {}
            RestEnd::Opened(limit) => break ChargeEnd::OpenedInRest(limit),
            RestEnd::Empty => break ChargeEnd::EmptyInRest,
        }
    };
    report.soc_left = y[Z];
    report.charge_left = AmpHours(y[Z] * setup.cell.charge_as() / 3600.0);
    (report, last_start)
}

fn empty_report(setup: &Setup) -> ChargeReport {
    let ambient = setup.usage.ambient;
    ChargeReport {
        presses: Vec::with_capacity(512),
        full_presses: 0,
        lit: Seconds(0.0),
        ledger: Ledger::default(),
        recharge_mark: None,
        mark_relaxed_before: None,
        mark_in_use_before: None,
        mark_in_use_after: None,
        soc_left: 1.0,
        charge_left: AmpHours(0.0),
        first_imperfect: None,
        end: ChargeEnd::PressLimit,
        clock: Seconds(0.0),
        cell_temperature_max: ambient,
        switch_temperature_max: ambient,
        second_temperature_max: ambient,
        steps: 0,
    }
}

fn warmest(report: &mut ChargeReport, press: &PressSummary) {
    let pairs = [
        (&mut report.cell_temperature_max, press.cell_temperature_max),
        (&mut report.switch_temperature_max, press.switch_temperature_max),
        (&mut report.second_temperature_max, press.second_temperature_max),
    ];
    for (most, now) in pairs {
        *most = Celsius(most.0.max(now.0));
    }
}

fn add(sum: &mut Ledger, part: &Ledger) {
    let entries = [
        (&mut sum.source, part.source),
        (&mut sum.cell_ohmic, part.cell_ohmic),
        (&mut sum.cell_polarisation, part.cell_polarisation),
        (&mut sum.second_protector, part.second_protector),
        (&mut sum.ahead, part.ahead),
        (&mut sum.pair, part.pair),
        (&mut sum.shunt, part.shunt),
        (&mut sum.after, part.after),
        (&mut sum.esr, part.esr),
        (&mut sum.capacitor_left, part.capacitor_left),
        (&mut sum.load_lit, part.load_lit),
        (&mut sum.load_unlit, part.load_unlit),
        (&mut sum.load_stalled, part.load_stalled),
        (&mut sum.standby, part.standby),
    ];
    for (total, joules) in entries {
        *total = Joules(total.0 + joules.0);
    }
}

enum RestEnd {
    Over,
    Opened(Limit),
    Empty,
}

struct Rest {
    length: f64,
    source: f64,
    ohmic: f64,
    polar: f64,
    second: f64,
    ahead: f64,
    standby: f64,
    end: RestEnd,
}

/// The largest part of the charge that one closed-form piece of a rest may take.
const REST_PIECE: f64 = 2e-3;
/// The most pieces a rest is divided into.
const REST_PIECES: f64 = 256.0;

impl Simulator<'_> {
    /// Voltage at the cell's terminals at a small current.
    fn terminal(&self, y: &[f64; STATES], current: f64) -> f64 {
        let cell = self.circuit.cell_now(y[Z], y[CELL_T]);
        cell.ocv - (y[BRANCH] + y[BRANCH + 1] + y[BRANCH + 2]) - current * cell.r0
    }

    /// The supplies of board and second protector at the standby current.
    fn supplies(&self, y: &[f64; STATES]) -> (f64, f64) {
        let current = self.setup.usage.standby.0;
        let cell = self.circuit.cell_now(y[Z], y[CELL_T]);
        let terminal = cell.ocv - (y[BRANCH] + y[BRANCH + 1] + y[BRANCH + 2]) - current * cell.r0;
        (terminal - current * (self.second_at(terminal, y) + self.circuit.ahead), terminal)
    }

    fn second_at(&self, supply: f64, y: &[f64; STATES]) -> f64 {
        match (&self.circuit.second, &self.setup.second_protector) {
            (Some(s), Some(board)) => s.factor(y[SECOND_T]) * board.on_resistance.at(supply) + s.shunt,
            _ => 0.0,
        }
    }

    /// A rest of `length` seconds from the state `y`, which it carries on.
    fn rest(&mut self, y: &mut [f64; STATES], length: f64) -> Rest {
        let standby = self.setup.usage.standby.0;
        let mut rest = Rest {
            length: 0.0,
            source: 0.0,
            ohmic: 0.0,
            polar: 0.0,
            second: 0.0,
            ahead: 0.0,
            standby: 0.0,
            end: RestEnd::Over,
        };
        if length <= 0.0 {
            return rest;
        }
        let pieces = (standby * length / self.circuit.charge_as / REST_PIECE).ceil().clamp(1.0, REST_PIECES);
        let h = length / pieces;
        let mut left = length;
        while left > 0.0 {
            let mut h = if left < 1.5 * h { left } else { h };
            let use_up = standby * h / self.circuit.charge_as;
            let mut end = RestEnd::Over;
            if use_up >= y[Z] {
                h = y[Z] * self.circuit.charge_as / standby;
                end = RestEnd::Empty;
            }
            if let Some((at, limit)) = self.opens_in_rest(y, rest.length, h) {
                h = at;
                end = RestEnd::Opened(limit);
            }
            self.rest_piece(y, h, &mut rest);
            rest.length += h;
            left -= h;
            if !matches!(end, RestEnd::Over) {
                if matches!(end, RestEnd::Empty) {
                    y[Z] = 0.0;
                }
                rest.end = end;
                return rest;
            }
        }
        // What still runs is told from the beginning of the press that follows.
        for (_, _, _, since) in self.over_discharge() {
            if let Some(since) = since {
                *since -= rest.length;
            }
        }
        rest
    }

    /// The state a time `h` into a rest; the current is the standby draw.
    fn rested(&self, y: &[f64; STATES], h: f64) -> [f64; STATES] {
        let c = &self.circuit;
        let cell = &self.setup.cell;
        let usage = &self.setup.usage;
        let (standby, ambient) = (usage.standby.0, usage.ambient.0);
        let now = c.cell_now(y[Z], y[CELL_T]);
        let mut to = *y;
        to[Z] = y[Z] - standby * h / c.charge_as;
        let mut polar = 0.0;
        for k in 0..c.branch_count {
            let settled = standby * c.branch_ohm[k] * now.branch_factor;
            let decay = exp(-h * c.branch_rate[k]);
            to[BRANCH + k] = settled + (y[BRANCH + k] - settled) * decay;
            polar += 0.5 * (y[BRANCH + k] + to[BRANCH + k]);
        }
        let heat = standby * (polar + standby * now.r0) - standby * Celsius(y[CELL_T]).kelvin() * now.entropy;
        to[CELL_T] = if cell.cooling_w_per_k > 0.0 {
            let settled = ambient + heat / cell.cooling_w_per_k;
            settled + (y[CELL_T] - settled) * exp(-h * cell.cooling_w_per_k / cell.heat_capacity_j_per_k)
        } else {
            y[CELL_T] + heat * h / cell.heat_capacity_j_per_k
        };
        if let Some(s) = &c.board {
            to[SWITCH_T] = ambient + (y[SWITCH_T] - ambient) * exp(-h / s.thermal_time_s);
        }
        if let Some(s) = &c.second {
            to[SECOND_T] = ambient + (y[SECOND_T] - ambient) * exp(-h / s.thermal_time_s);
        }
        to
    }

    fn rest_piece(&self, y: &mut [f64; STATES], h: f64, rest: &mut Rest) {
        let standby = self.setup.usage.standby.0;
        let to = self.rested(y, h);
        let c = &self.circuit;
        if standby > 0.0 {
            let (from_cell, to_cell) = (c.cell_now(y[Z], y[CELL_T]), c.cell_now(to[Z], to[CELL_T]));
            let mut polar = 0.0;
            for k in 0..MAX_BRANCHES.min(c.branch_count) {
                // ∫v dt of an exponential: τ·(v₀ − v) + v_settled·h
                let settled = standby * c.branch_ohm[k] * from_cell.branch_factor;
                polar += (y[BRANCH + k] - to[BRANCH + k]) / c.branch_rate[k] + settled * h;
            }
            let ocv = 0.5 * (from_cell.ocv + to_cell.ocv) * h;
            let ohmic = standby * 0.5 * (from_cell.r0 + to_cell.r0) * h;
            let second = standby * self.second_at(to_cell.ocv, &to) * h;
            let ahead = standby * c.ahead * h;
            rest.source += standby * ocv;
            rest.polar += standby * polar;
            rest.ohmic += standby * ohmic;
            rest.second += standby * second;
            rest.ahead += standby * ahead;
            rest.standby += standby * (ocv - polar - ohmic - second - ahead);
        }
        *y = to;
    }

    /// Whether an over-discharge limit opens within `h` from the state `y`, and when.
    ///
    /// The supply rises while the branches relax and falls with the charge: it is concave, so it is
    /// lowest at an end, and a limit that both ends keep is kept in between.
    fn opens_in_rest(&mut self, y: &[f64; STATES], begun: f64, h: f64) -> Option<(f64, Limit)> {
        let ends = (self.supplies(y), self.supplies(&self.rested(y, h)));
        let mut first: Option<(f64, Limit)> = None;
        let mut changes = Vec::new();
        for (index, (limit, threshold, delay, since)) in self.over_discharge().enumerate() {
            let second = matches!(limit, Limit::OverDischarge(crate::report::Protector::Second));
            let of = |pair: (f64, f64)| if second { pair.1 } else { pair.0 };
            let (from, to) = (of(ends.0), of(ends.1));
            changes.push((index, *limit, second, threshold, delay, *since, from < threshold, to < threshold));
        }
        for (index, limit, second, threshold, delay, since, low_now, low_then) in changes {
            // Time at which the supply passes the threshold, by bisection.
            let passes = |simulator: &Self| {
                let (mut a, mut b) = (0.0, h);
                for _ in 0..60 {
                    let m = 0.5 * (a + b);
                    let supplies = simulator.supplies(&simulator.rested(y, m));
                    let low = (if second { supplies.1 } else { supplies.0 }) < threshold;
                    if low == low_now {
                        a = m;
                    } else {
                        b = m;
                    }
                }
                b
            };
            let (running, until) = match (low_now, low_then) {
                (false, false) => (None, 0.0),
                (true, true) => (Some(since.unwrap_or(begun)), h),
                (true, false) => (Some(since.unwrap_or(begun)), passes(self)),
                (false, true) => (Some(begun + passes(self)), h),
            };
            if let Some(since) = running {
                let due = (since + delay - begun).max(0.0);
                if due <= until && first.is_none_or(|(at, _)| due < at) {
                    first = Some((due, limit));
                }
            }
            let keeps = if low_then { running } else { None };
            if let Some((_, _, _, stored)) = self.over_discharge().nth(index) {
                *stored = keeps;
            }
        }
        first
    }
}
