//! One press, from switch closing to its end, event by event.
//!
//! Between two events the state follows the differential equation by error-controlled steps. The
//! input capacitor is the fast part: right after a change of the load's state its voltage is a state
//! of its own; once it has settled on the path's operating point (to a microvolt) it is *slaved*: the
//! operating point is solved for, with the capacitor's small current `C·dV/dt` taken from the slow
//! rates. That is what keeps a press short to compute; where the capacitor is too large to be slaved it
//! simply stays a state. An event time is a root in a bracket on the step's interpolant, and the step
//! is then taken again to end there.
//!
//! Of several things at one instant the order is: opening, lighting, release.

use crate::board::{Board, Threshold};
use crate::cell::MAX_BRANCHES;
use crate::circuit::{CellNow, Circuit, PathNow};
use crate::math::dormand_prince::{self, Rates};
use crate::math::exp;
use crate::report::{
    Event, EventKind, Ledger, Limit, Mode, NotFull, PressEnd, PressReport, PressSummary, Protector, Sample,
};
use crate::setup::Setup;
use crate::units::{Amps, Celsius, Joules, Ohms, Seconds, Volts};

// The state: charge, branches, temperatures, capacitor.
pub(crate) const Z: usize = 0;
pub(crate) const BRANCH: usize = 1;
pub(crate) const CELL_T: usize = 4;
pub(crate) const SWITCH_T: usize = 5;
pub(crate) const SECOND_T: usize = 6;
const CAP: usize = 7;
pub(crate) const STATES: usize = 8;

// The sums beside it.
const CHARGE: usize = 0;
const I2: usize = 1;
const SOURCE: usize = 2;
const OHMIC: usize = 3;
const POLAR: usize = 4;
const SECOND: usize = 5;
const PAIR: usize = 6;
const ESR: usize = 7;
const LOAD: usize = 8;
const SUMS: usize = 9;

type Y = [f64; STATES];
type Step = dormand_prince::Step<Point, STATES, SUMS>;

/// What one step may be wrong by, per state: a microvolt and what makes one.
const TOLERANCE: Y = [3e-7, 1e-6, 1e-6, 1e-6, 2e-4, 1e-3, 1e-3, 2e-6];
/// The capacitor is slaved once it is this close to the operating point, in V.
const SLAVED_WITHIN: f64 = 1e-6;
/// How finely an event is placed inside a step, as a fraction of it.
const EVENT_WITHIN: f64 = 1e-8;
/// Bound on steps per press: far more than a press with the largest number of events needs.
const STEPS_PER_EVENT: u64 = 200;

/// Where a press begins.
#[derive(Debug, Clone, PartialEq)]
pub struct PressStart {
    /// State of charge, 0 to 1.
    pub soc: f64,
    /// Temperature of the cell.
    pub cell_temperature: Celsius,
    /// Temperature of the board's switches.
    pub switch_temperature: Celsius,
    /// Temperature of the second protector's switches.
    pub second_temperature: Celsius,
    /// Voltages of the slow branches; 0 when relaxed.
    pub branches: [Volts; MAX_BRANCHES],
}

impl PressStart {
    /// Everything relaxed, the cell at `cell_temperature` and the switches at ambient.
    pub fn relaxed(setup: &Setup, soc: f64, cell_temperature: Celsius) -> Self {
        let ambient = setup.usage.ambient;
        Self {
            soc,
            cell_temperature,
            switch_temperature: ambient,
            second_temperature: ambient,
            branches: [Volts(0.0); MAX_BRANCHES],
        }
    }

    pub(crate) fn from_state(y: &Y) -> Self {
        let mut branches = [Volts(0.0); MAX_BRANCHES];
        for (k, v) in branches.iter_mut().enumerate() {
            *v = Volts(y[BRANCH + k]);
        }
        Self {
            soc: y[Z],
            cell_temperature: Celsius(y[CELL_T]),
            switch_temperature: Celsius(y[SWITCH_T]),
            second_temperature: Celsius(y[SECOND_T]),
            branches,
        }
    }

    pub(crate) fn state(&self) -> Y {
        let mut y = [0.0; STATES];
        y[Z] = self.soc;
        for (k, v) in self.branches.iter().enumerate() {
            y[BRANCH + k] = v.0;
        }
        y[CELL_T] = self.cell_temperature.0;
        y[SWITCH_T] = self.switch_temperature.0;
        y[SECOND_T] = self.second_temperature.0;
        y
    }
}

/// What to keep of a press, and how far to follow it.
#[derive(Debug, Clone, PartialEq)]
pub struct PressOptions {
    /// Times at which a sample is wanted, rising, from switch closing.
    pub samples: Vec<Seconds>,
    /// The press is followed for at most this many events.
    pub max_events: u32,
}

impl Default for PressOptions {
    /// No samples, 100 000 events.
    fn default() -> Self {
        Self { samples: Vec::new(), max_events: 100_000 }
    }
}

/// Follows one press from `start`.
///
/// Samples do not change the steps, so the summary is the same to the last bit with and without.
pub fn run(setup: &Setup, start: &PressStart, options: &PressOptions) -> PressReport {
    let mut simulator = Simulator::new(setup, options.max_events);
    let mut recorder = Recorder { events: Vec::new(), trace: Vec::new(), wanted: &options.samples };
    let summary = simulator.press(&mut start.state(), Some(&mut recorder));
    PressReport { events: recorder.events, trace: recorder.trace, summary }
}

/// Sample times that suit a press of length `press`: 0, twelve per decade from 1 µs, and forty
/// evenly spaced.
pub fn sample_times(press: Seconds) -> Vec<Seconds> {
    let mut times = vec![0.0];
    let decades = 12.0;
    for k in 0..200 {
        // To a picosecond, so that a round time is met exactly.
        let t = (1e6 * exp(f64::from(k) / decades * core::f64::consts::LN_10)).round() * 1e-12;
        if t > press.0 {
            break;
        }
        times.push(t);
    }
    times.extend((1..=40).map(|k| press.0 * f64::from(k) / 40.0));
    times.sort_by(f64::total_cmp);
    times.dedup();
    times.into_iter().map(Seconds).collect()
}

/// Everything at one instant.
#[derive(Clone, Copy)]
struct Point {
    rate: Y,
    cell: CellNow,
    path: PathNow,
    /// Sum of the branch voltages.
    polar: f64,
    v: f64,
    /// Into the load, surge included.
    draw: f64,
    /// Slope of the draw over the voltage.
    draw_slope: f64,
    /// Into the capacitor.
    charging: f64,
    /// `dV/dt` of the operating point, if the capacitor is slaved.
    drift: f64,
}

impl Rates<STATES, SUMS> for Point {
    fn rate(&self) -> &Y {
        &self.rate
    }

    fn flow(&self) -> [f64; SUMS] {
        let i = self.path.current;
        let i2 = i * i;
        let mut flow = [0.0; SUMS];
        flow[CHARGE] = i;
        flow[I2] = i2;
        flow[SOURCE] = i * self.cell.ocv;
        flow[OHMIC] = i2 * self.cell.r0;
        flow[POLAR] = i * self.polar;
        flow[SECOND] = i2 * self.path.second;
        flow[PAIR] = i2 * self.path.pair;
        flow[ESR] = self.charging * self.charging;
        flow[LOAD] = self.v * self.draw;
        flow
    }
}

/// A limit with its timer.
pub(crate) struct Watch {
    pub(crate) limit: Limit,
    threshold: Trigger,
    delay: f64,
    /// Since when it is exceeded, in the time of the press.
    since: Option<f64>,
}

enum Trigger {
    PairSense(f64),
    ShuntSense(f64),
    Current(f64),
    Supply(f64),
}

fn watches(protector: Protector, board: &Board) -> impl Iterator<Item = Watch> {
    let shunt = matches!(board.sense, crate::board::SensePoint::Shunt);
    let stages = board.stages.iter().enumerate().map(move |(k, stage)| Watch {
        limit: Limit::Stage(protector, k),
        threshold: match stage.threshold {
            Threshold::Sense(v) if shunt => Trigger::ShuntSense(v.0),
            Threshold::Sense(v) => Trigger::PairSense(v.0),
            Threshold::Current(i) => Trigger::Current(i.0),
        },
        delay: stage.delay.0,
        since: None,
    });
    let low = board.over_discharge.iter().map(move |od| Watch {
        limit: Limit::OverDischarge(protector),
        threshold: Trigger::Supply(od.threshold.0),
        delay: od.delay.0,
        since: None,
    });
    stages.chain(low)
}

/// What a step can run into. Written first wins where two happen at once.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Crossing {
    Limit(usize),
    Start,
    BelowStart,
    PinEndsAbove,
    PinEndsBelow,
    Strike,
    StrikeLost,
    BelowHold,
    Empty,
}

pub(crate) struct Recorder<'o> {
    events: Vec<Event>,
    trace: Vec<Sample>,
    wanted: &'o [Seconds],
}

/// What a press has come to so far.
struct Tally {
    sums: [f64; SUMS],
    load_lit: f64,
    load_unlit: f64,
    load_stalled: f64,
    lit: f64,
    first_lit: Option<f64>,
    drops: u32,
    start: Option<f64>,
    dropped: Option<NotFull>,
    struck: bool,
    peak: f64,
    lowest_lit: Option<f64>,
    hottest: [f64; 3],
    steps: u32,
    events: u32,
}

/// The presses of one setup, one after the other.
pub(crate) struct Simulator<'a> {
    pub(crate) setup: &'a Setup,
    pub(crate) circuit: Circuit<'a>,
    pub(crate) watches: Vec<Watch>,
    max_events: u32,
    /// Step sizes that suited the slaved phases of the press before: unlit and lit.
    hints: [f64; 2],
    // The press under way.
    mode: Mode,
    slaved: bool,
    surge_from: Option<f64>,
    strike_since: Option<f64>,
    guess: f64,
}

impl<'a> Simulator<'a> {
    pub(crate) fn new(setup: &'a Setup, max_events: u32) -> Self {
        let mut list = Vec::new();
        if let Some(board) = setup.board_in_path() {
            list.extend(watches(Protector::Board, board));
        }
        if let Some(second) = &setup.second_protector {
            list.extend(watches(Protector::Second, second));
        }
        Self {
            setup,
            circuit: Circuit::new(setup),
            watches: list,
            max_events,
            hints: [1e-3, 0.05],
            mode: Mode::Stalled,
            slaved: false,
            surge_from: None,
            strike_since: None,
            guess: 0.0,
        }
    }

    /// One press from the state `y`, which it carries on; the capacitor starts and is left empty.
    pub(crate) fn press(&mut self, y: &mut Y, mut recorder: Option<&mut Recorder<'_>>) -> PressSummary {
        let press = self.setup.usage.press.0;
        let soc_start = y[Z];
        self.mode = Mode::Stalled;
        self.slaved = false;
        self.surge_from = None;
        self.strike_since = None;
        self.guess = 0.0;
        for watch in &mut self.watches {
            if matches!(watch.limit, Limit::Stage(..)) {
                watch.since = None;
            }
        }
        y[CAP] = 0.0;
        let mut tally = Tally {
            sums: [0.0; SUMS],
            load_lit: 0.0,
            load_unlit: 0.0,
            load_stalled: 0.0,
            lit: 0.0,
            first_lit: None,
            drops: 0,
            start: None,
            dropped: None,
            struck: false,
            peak: 0.0,
            lowest_lit: None,
            hottest: [y[CELL_T], y[SWITCH_T], y[SECOND_T]],
            steps: 0,
            events: 0,
        };
        let mut t = 0.0;
        let mut point = self.point(y, t);
        let mut next_sample = 0;
        self.log(&mut recorder, &mut tally, t, y, &point, EventKind::Closed);
        self.review_limits(&mut recorder, &mut tally, t, y, &point);
        if let Some(r) = recorder.as_deref_mut()
            && r.wanted.first().is_some_and(|s| s.0 <= 0.0)
        {
            r.trace.push(self.sample(0.0, y, &point));
            next_sample = 1;
        }
        tally.peak = point.path.current;
        if point.v >= self.setup.load.start.0 {
            self.cross(Crossing::Start, &mut recorder, &mut tally, t, y, &mut point);
        }
        let mut h = self.first_step(&point);
        let bound = u64::from(self.max_events).saturating_mul(STEPS_PER_EVENT).max(100_000);
        let end = loop {
            if tally.events >= self.max_events || u64::from(tally.steps) >= bound {
                break PressEnd::EventLimit;
            }
            let (stop, what) = self.next_deadline(press);
            let left = stop - t;
            if left > 0.0 {
                let whole = h >= left;
                let step = self.step(y, t, if whole { left } else { h }, &point);
                tally.steps += 1;
                let size = error_size(&step, self.slaved);
                if !(size <= 1.0) && step.h > 1e-12 {
                    h = step.h
                        * if size.is_finite() { (0.9 / size.sqrt().sqrt()).clamp(0.1, 0.8) } else { 0.1 };
                    if self.slaved && (!size.is_finite() || !step.last.v.is_finite()) {
                        self.free(y, &point);
                        point = self.point(y, t);
                        h = self.first_step(&point);
                    }
                    continue;
                }
                let grown = step.h * (0.9 / (size.sqrt().sqrt()).max(0.05)).min(5.0);
                let found = self.find(&point, &step, t);
                let (step, crossing) = match found {
                    Some((x, crossing)) => {
                        let shorter = self.land(&step, t, x, crossing, &point, &mut tally);
                        (shorter, Some(crossing))
                    }
                    None => (step, None),
                };
                let t1 = if whole && crossing.is_none() { stop } else { t + step.h };
                if let Some(r) = recorder.as_deref_mut() {
                    while next_sample < r.wanted.len() && r.wanted[next_sample].0 <= t1 {
                        let at = r.wanted[next_sample].0;
                        let state = step.at(((at - t) / step.h).clamp(0.0, 1.0));
                        let there = self.point(&state, at);
                        r.trace.push(self.sample(at, &state, &there));
                        next_sample += 1;
                    }
                }
                self.book(&mut tally, &step, &point, t1 - t);
                *y = step.to;
                t = t1;
                point = step.last;
                self.guess = point.v;
                if !whole || grown < h {
                    h = grown;
                }
                if self.slaved && crossing.is_none() && !whole {
                    self.hints[usize::from(self.mode == Mode::Lit)] = h;
                }
                if let Some(crossing) = crossing {
                    if crossing == Crossing::Empty {
                        y[Z] = 0.0;
                        self.log(&mut recorder, &mut tally, t, y, &point, EventKind::CellEmpty);
                        break PressEnd::CellEmpty;
                    }
                    let free_before = !self.slaved;
                    let mode_before = self.mode;
                    self.cross(crossing, &mut recorder, &mut tally, t, y, &mut point);
                    if self.mode != mode_before || free_before == self.slaved {
                        h = self.first_step(&point);
                    }
                    continue;
                }
                if t < stop {
                    if self.change_regime(y, &point) {
                        point = self.point(y, t);
                        h = self.first_step(&point);
                    }
                    continue;
                }
            }
            match what {
                Deadline::Opening(k) => {
                    let limit = self.watches[k].limit;
                    self.log(&mut recorder, &mut tally, t, y, &point, EventKind::Opened(limit));
                    break PressEnd::Opened(limit);
                }
                Deadline::Lighting => {
                    self.light(&mut recorder, &mut tally, t, y, &mut point);
                    h = self.first_step(&point);
                }
                Deadline::Release => {
                    self.log(&mut recorder, &mut tally, t, y, &point, EventKind::Released);
                    break PressEnd::Released;
                }
            }
        };
        if end == PressEnd::EventLimit {
            self.log(&mut recorder, &mut tally, t, y, &point, EventKind::EventLimit);
        }
        let capacitor = self.capacitor(y, &point);
        for watch in &mut self.watches {
            // What still runs in the rest is told from the rest's own beginning.
            if let Some(since) = &mut watch.since {
                *since -= t;
            }
        }
        y[CAP] = 0.0;
        self.summary(&tally, end, t, soc_start, y, &point, capacitor)
    }

    /// The over-discharge limits: which, threshold, delay, and since when they are exceeded.
    pub(crate) fn over_discharge(&mut self) -> impl Iterator<Item = (&Limit, f64, f64, &mut Option<f64>)> {
        self.watches.iter_mut().filter_map(|w| match w.threshold {
            Trigger::Supply(threshold) => Some((&w.limit, threshold, w.delay, &mut w.since)),
            Trigger::PairSense(_) | Trigger::ShuntSense(_) | Trigger::Current(_) => None,
        })
    }

    fn summary(
        &self,
        tally: &Tally,
        end: PressEnd,
        t: f64,
        soc_start: f64,
        y: &Y,
        point: &Point,
        capacitor: f64,
    ) -> PressSummary {
        let c = &self.circuit;
        let s = &tally.sums;
        let second_shunt = c.second.as_ref().map_or(0.0, |x| x.shunt);
        let ledger = Ledger {
            source: Joules(s[SOURCE]),
            cell_ohmic: Joules(s[OHMIC]),
            cell_polarisation: Joules(s[POLAR]),
            second_protector: Joules(s[SECOND] + s[I2] * second_shunt),
            ahead: Joules(s[I2] * c.ahead),
            pair: Joules(s[PAIR]),
            shunt: Joules(s[I2] * c.board.as_ref().map_or(0.0, |x| x.shunt)),
            after: Joules(s[I2] * c.after),
            esr: Joules(s[ESR] * c.load.esr.0),
            capacitor_left: Joules(0.5 * c.load.capacitance.0 * capacitor * capacitor),
            load_lit: Joules(tally.load_lit),
            load_unlit: Joules(tally.load_unlit),
            load_stalled: Joules(tally.load_stalled),
            standby: Joules(0.0),
        };
        let not_full = match end {
            PressEnd::Opened(limit) => Some(NotFull::Opened(limit)),
            PressEnd::CellEmpty => Some(NotFull::CellEmpty),
            PressEnd::EventLimit => Some(NotFull::EventLimit),
            PressEnd::Released if tally.dropped.is_some() => tally.dropped,
            PressEnd::Released if tally.start.is_none() => Some(NotFull::NotStarted),
            PressEnd::Released if !tally.struck => Some(NotFull::StrikeVoltageNotReached),
            PressEnd::Released if tally.first_lit.is_none() => Some(NotFull::StrikeTimeNotCompleted),
            PressEnd::Released => None,
        };
        let mut branches_end = [Volts(0.0); MAX_BRANCHES];
        for (k, v) in branches_end.iter_mut().enumerate() {
            *v = Volts(y[BRANCH + k]);
        }
        PressSummary {
            not_full,
            end,
            end_time: Seconds(t),
            lit: Seconds(tally.lit),
            first_lit: tally.first_lit.map(Seconds),
            drops: tally.drops,
            start: tally.start.map(Seconds),
            end_mode: self.mode,
            load_end: Volts(point.v),
            current_end: Amps(point.path.current),
            board_end: Volts(point.path.board),
            cell_end: Volts(point.path.cell),
            pair_end: Ohms(point.path.pair),
            peak_current: Amps(tally.peak),
            lowest_lit: tally.lowest_lit.map(Volts),
            soc_start,
            soc_end: y[Z],
            branches_end,
            cell_temperature_end: Celsius(y[CELL_T]),
            cell_temperature_max: Celsius(tally.hottest[0]),
            switch_temperature_end: Celsius(y[SWITCH_T]),
            switch_temperature_max: Celsius(tally.hottest[1]),
            second_temperature_end: Celsius(y[SECOND_T]),
            second_temperature_max: Celsius(tally.hottest[2]),
            ledger,
            charge_as: s[CHARGE],
            i2t_a2s: s[I2],
            steps: tally.steps,
        }
    }
}

/// Size of a step's error against what is allowed.
fn error_size(step: &Step, slaved: bool) -> f64 {
    let states = if slaved { CAP } else { STATES };
    let mut size: f64 = 0.0;
    for n in 0..states {
        let part = step.error[n].abs() / TOLERANCE[n];
        // A comparison that keeps a NaN.
        if !(part <= size) {
            size = part;
        }
    }
    size
}

enum Deadline {
    Opening(usize),
    Lighting,
    Release,
}

// What happens at an instant.
impl Simulator<'_> {
    /// The next thing that happens by the clock alone; at one instant opening, lighting, release.
    fn next_deadline(&self, press: f64) -> (f64, Deadline) {
        let (mut stop, mut what) = (press, Deadline::Release);
        if let Some(since) = self.strike_since {
            let due = since + self.setup.load.strike_time.0;
            if due <= stop {
                (stop, what) = (due, Deadline::Lighting);
            }
        }
        // Backwards, so that of two the one listed first is named.
        for (k, watch) in self.watches.iter().enumerate().rev() {
            if let Some(since) = watch.since {
                let due = since + watch.delay;
                if due <= stop {
                    (stop, what) = (due, Deadline::Opening(k));
                }
            }
        }
        (stop, what)
    }

    /// By how much a limit is exceeded, in its own unit; not exceeded at 0.
    fn excess(&self, watch: &Watch, point: &Point) -> f64 {
        let peak = match self.mode {
            Mode::Unlit | Mode::Lit => (self.setup.load.peak_factor - 1.0) * point.draw,
            Mode::Stalled | Mode::Pinned => 0.0,
        };
        let seen = point.path.current + peak;
        let c = &self.circuit;
        let (pair, switch, supply) = match watch.limit {
            Limit::Stage(Protector::Board, _) | Limit::OverDischarge(Protector::Board) => {
                (point.path.pair, &c.board, point.path.board)
            }
            Limit::Stage(Protector::Second, _) | Limit::OverDischarge(Protector::Second) => {
                (point.path.second, &c.second, point.path.cell)
            }
        };
        match watch.threshold {
            Trigger::PairSense(v) => seen * pair - v,
            Trigger::ShuntSense(v) => seen * switch.as_ref().map_or(0.0, |s| s.shunt) - v,
            Trigger::Current(i) => seen - i,
            Trigger::Supply(v) => v - supply,
        }
    }

    /// After a jump: limits that are exceeded now and were not, or the other way round.
    fn review_limits(
        &mut self,
        recorder: &mut Option<&mut Recorder<'_>>,
        tally: &mut Tally,
        t: f64,
        y: &Y,
        point: &Point,
    ) {
        for k in 0..self.watches.len() {
            let excess = self.excess(&self.watches[k], point);
            let over = self.watches[k].since.is_some();
            // A limit just crossed stands at 0 to rounding: that is not a jump.
            if over && excess < -1e-9 {
                self.set_limit(k, None, recorder, tally, t, y, point);
            } else if !over && excess > 0.0 {
                self.set_limit(k, Some(t), recorder, tally, t, y, point);
            }
        }
    }

    fn set_limit(
        &mut self,
        k: usize,
        since: Option<f64>,
        recorder: &mut Option<&mut Recorder<'_>>,
        tally: &mut Tally,
        t: f64,
        y: &Y,
        point: &Point,
    ) {
        self.watches[k].since = since;
        let limit = self.watches[k].limit;
        let kind = if since.is_some() { EventKind::Over(limit) } else { EventKind::Under(limit) };
        self.log(recorder, tally, t, y, point, kind);
    }

    fn light(
        &mut self,
        recorder: &mut Option<&mut Recorder<'_>>,
        tally: &mut Tally,
        t: f64,
        y: &mut Y,
        point: &mut Point,
    ) {
        self.strike_since = None;
        tally.first_lit.get_or_insert(t);
        self.enter(Mode::Lit, EventKind::Lit, recorder, tally, t, y, point);
        self.settle(recorder, tally, t, y, point);
    }

    /// Applies what a step ran into.
    fn cross(
        &mut self,
        crossing: Crossing,
        recorder: &mut Option<&mut Recorder<'_>>,
        tally: &mut Tally,
        t: f64,
        y: &mut Y,
        point: &mut Point,
    ) {
        match crossing {
            Crossing::Limit(k) => {
                let since = if self.watches[k].since.is_some() { None } else { Some(t) };
                self.set_limit(k, since, recorder, tally, t, y, point);
                return;
            }
            Crossing::Start => {
                if tally.start.is_none() {
                    tally.start = Some(t);
                    self.surge_from = Some(t);
                    self.log(recorder, tally, t, y, point, EventKind::StartReached);
                }
                self.leave_start(true, recorder, tally, t, y, point);
            }
            Crossing::BelowStart => {
                if self.strike_since.take().is_some() {
                    self.log(recorder, tally, t, y, point, EventKind::StrikeLost);
                }
                self.leave_start(false, recorder, tally, t, y, point);
            }
            Crossing::PinEndsAbove => {
                self.enter(Mode::Unlit, EventKind::Runs, recorder, tally, t, y, point);
            }
            Crossing::PinEndsBelow => {
                self.enter(Mode::Stalled, EventKind::Stalls, recorder, tally, t, y, point);
            }
            Crossing::Strike => {
                self.strike_since = Some(t);
                tally.struck = true;
                self.log(recorder, tally, t, y, point, EventKind::StrikeReached);
                return;
            }
            Crossing::StrikeLost => {
                self.strike_since = None;
                self.log(recorder, tally, t, y, point, EventKind::StrikeLost);
                return;
            }
            Crossing::BelowHold => self.drop_arc(recorder, tally, t, y, point),
            Crossing::Empty => return,
        }
        self.settle(recorder, tally, t, y, point);
    }

    /// At the start voltage: runs, is held there, or stalls.
    ///
    /// - `rising`: V comes from below (the stall draw holds until now), else from above.
    fn leave_start(
        &mut self,
        rising: bool,
        recorder: &mut Option<&mut Recorder<'_>>,
        tally: &mut Tally,
        t: f64,
        y: &mut Y,
        point: &mut Point,
    ) {
        let start = self.setup.load.start.0;
        let stall = start / self.circuit.stall_ohm;
        let run = start / self.setup.load.unlit.0 + self.surge(t, Mode::Unlit);
        // With a series resistance the capacitor takes up the difference, so V arrives with the
        // draw it had; without, the load is given what the path gives.
        let given = if self.setup.load.esr.0 == 0.0 {
            point.path.current
        } else if rising {
            stall
        } else {
            run
        };
        let (mode, kind) = if rising && given >= run {
            (Mode::Unlit, EventKind::Runs)
        } else if !rising && given <= stall {
            (Mode::Stalled, EventKind::Stalls)
        } else {
            (Mode::Pinned, EventKind::PinnedAtStart)
        };
        self.enter(mode, kind, recorder, tally, t, y, point);
    }

    fn drop_arc(
        &mut self,
        recorder: &mut Option<&mut Recorder<'_>>,
        tally: &mut Tally,
        t: f64,
        y: &mut Y,
        point: &mut Point,
    ) {
        tally.drops += 1;
        if tally.dropped.is_none() {
            let surge = self.surge(t, Mode::Lit);
            tally.dropped = Some(if self.has_operating_point(y, surge) {
                NotFull::SagBelowHold
            } else {
                NotFull::NoOperatingPoint
            });
        }
        self.enter(Mode::Unlit, EventKind::Drop, recorder, tally, t, y, point);
    }

    /// Whether path and lit load meet at any voltage.
    fn has_operating_point(&self, y: &Y, surge: f64) -> bool {
        const PLACES: u32 = 400;
        let cell = self.circuit.cell_now(y[Z], y[CELL_T]);
        let e = cell.ocv - (y[BRANCH] + y[BRANCH + 1] + y[BRANCH + 2]);
        let factors = self.factors(y);
        (1..=PLACES).any(|k| {
            let v = e * f64::from(k) / f64::from(PLACES);
            self.circuit.path(e, cell.r0, factors, v).current >= self.circuit.lit_draw(v).0 + surge
        })
    }

    /// The load takes another state; the capacitor becomes a state of its own.
    fn enter(
        &mut self,
        mode: Mode,
        kind: EventKind,
        recorder: &mut Option<&mut Recorder<'_>>,
        tally: &mut Tally,
        t: f64,
        y: &mut Y,
        point: &mut Point,
    ) {
        self.free(y, point);
        self.mode = mode;
        if mode != Mode::Unlit {
            self.strike_since = None;
        }
        *point = self.point(y, t);
        self.guess = point.v;
        tally.peak = tally.peak.max(point.path.current);
        self.log(recorder, tally, t, y, point, kind);
    }

    /// With a series resistance the voltage jumps when the draw jumps: what follows at once.
    fn settle(
        &mut self,
        recorder: &mut Option<&mut Recorder<'_>>,
        tally: &mut Tally,
        t: f64,
        y: &mut Y,
        point: &mut Point,
    ) {
        // A mode leads to another at most until the load stalls, is held or runs.
        for _ in 0..8 {
            let load = &self.setup.load;
            // A crossing lands on its threshold to a nanovolt; a jump is more than that.
            let jump = 1e-6;
            match self.mode {
                Mode::Lit if point.v < load.hold.0 => self.drop_arc(recorder, tally, t, y, point),
                Mode::Unlit if point.v < load.start.0 - jump => {
                    if self.strike_since.take().is_some() {
                        self.log(recorder, tally, t, y, point, EventKind::StrikeLost);
                    }
                    // It jumped past the start voltage: is there a place at it, or is it below?
                    let given = self.given_at_start(y);
                    let stall = load.start.0 / self.circuit.stall_ohm;
                    let (mode, kind) = if given <= stall {
                        (Mode::Stalled, EventKind::Stalls)
                    } else {
                        (Mode::Pinned, EventKind::PinnedAtStart)
                    };
                    self.enter(mode, kind, recorder, tally, t, y, point);
                }
                Mode::Unlit if point.v >= load.strike.0 && self.strike_since.is_none() => {
                    self.cross(Crossing::Strike, recorder, tally, t, y, point);
                }
                Mode::Unlit if point.v < load.strike.0 - jump && self.strike_since.is_some() => {
                    self.cross(Crossing::StrikeLost, recorder, tally, t, y, point);
                }
                Mode::Stalled | Mode::Pinned | Mode::Unlit | Mode::Lit => break,
            }
        }
        self.review_limits(recorder, tally, t, y, point);
    }

    /// What the load would be given if its terminals were held at the start voltage.
    fn given_at_start(&self, y: &Y) -> f64 {
        let load = &self.setup.load;
        let cell = self.circuit.cell_now(y[Z], y[CELL_T]);
        let e = cell.ocv - (y[BRANCH] + y[BRANCH + 1] + y[BRANCH + 2]);
        let path = self.circuit.path(e, cell.r0, self.factors(y), load.start.0);
        let charging = if load.esr.0 == 0.0 { 0.0 } else { (load.start.0 - y[CAP]) / load.esr.0 };
        path.current - charging
    }

    fn log(
        &self,
        recorder: &mut Option<&mut Recorder<'_>>,
        tally: &mut Tally,
        t: f64,
        y: &Y,
        point: &Point,
        kind: EventKind,
    ) {
        tally.events += 1;
        if let Some(r) = recorder.as_deref_mut() {
            r.events.push(Event {
                time: Seconds(t),
                kind,
                mode: self.mode,
                load: Volts(point.v),
                current: Amps(point.path.current),
                board: Volts(point.path.board),
                cell: Volts(point.path.cell),
                soc: y[Z],
            });
        }
    }

    fn sample(&self, t: f64, y: &Y, point: &Point) -> Sample {
        let sense = self
            .watches
            .iter()
            .filter(|w| matches!(w.limit, Limit::Stage(Protector::Board, _)))
            .map(|w| {
                let threshold = match w.threshold {
                    Trigger::PairSense(x)
                    | Trigger::ShuntSense(x)
                    | Trigger::Current(x)
                    | Trigger::Supply(x) => x,
                };
                self.excess(w, point) + threshold
            })
            .collect();
        Sample {
            time: Seconds(t),
            mode: self.mode,
            load: Volts(point.v),
            board: Volts(point.path.board),
            cell: Volts(point.path.cell),
            current: Amps(point.path.current),
            load_current: Amps(point.draw),
            capacitor: Volts(self.capacitor(y, point)),
            soc: y[Z],
            branches: (0..self.circuit.branch_count).map(|k| Volts(y[BRANCH + k])).collect(),
            cell_temperature: Celsius(y[CELL_T]),
            switch_temperature: Celsius(y[SWITCH_T]),
            pair: Ohms(point.path.pair),
            sense,
        }
    }

    fn book(&self, tally: &mut Tally, step: &Step, before: &Point, h: f64) {
        for (sum, part) in tally.sums.iter_mut().zip(&step.sums) {
            *sum += part;
        }
        let load = step.sums[LOAD];
        match self.mode {
            Mode::Lit => {
                tally.load_lit += load;
                tally.lit += h;
                let low = before.v.min(step.last.v);
                tally.lowest_lit = Some(tally.lowest_lit.map_or(low, |v: f64| v.min(low)));
            }
            Mode::Unlit | Mode::Pinned => tally.load_unlit += load,
            Mode::Stalled => tally.load_stalled += load,
        }
        tally.peak = tally.peak.max(step.last.path.current);
        for (k, hottest) in tally.hottest.iter_mut().enumerate() {
            *hottest = hottest.max(step.to[CELL_T + k]);
        }
    }
}

// The equations.
impl Simulator<'_> {
    fn factors(&self, y: &Y) -> (f64, f64) {
        let c = &self.circuit;
        (
            c.board.as_ref().map_or(0.0, |s| s.factor(y[SWITCH_T])),
            c.second.as_ref().map_or(0.0, |s| s.factor(y[SECOND_T])),
        )
    }

    /// Extra current after the start, in a running load.
    fn surge(&self, t: f64, mode: Mode) -> f64 {
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
    fn capacitor(&self, y: &Y, point: &Point) -> f64 {
        if self.slaved { point.v - self.setup.load.esr.0 * point.charging } else { y[CAP] }
    }

    /// The capacitor becomes a state of its own, from where it is.
    fn free(&mut self, y: &mut Y, point: &Point) {
        if self.slaved {
            y[CAP] = self.capacitor(y, point);
            self.slaved = false;
        }
    }

    fn step(&self, y: &Y, t: f64, h: f64, first: &Point) -> Step {
        dormand_prince::step(y, t, h, first, |y, t| self.point(y, t))
    }

    /// Everything at one instant, from the state.
    fn point(&self, y: &Y, t: f64) -> Point {
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
            (path, draw + surge, slope)
        };
        let mut point = Point {
            rate: [0.0; STATES],
            cell,
            path: PathNow::default(),
            polar,
            v: 0.0,
            draw: 0.0,
            draw_slope: 0.0,
            charging: 0.0,
            drift: 0.0,
        };
        if self.mode == Mode::Pinned {
            point.v = load.start.0;
            point.path = c.path(e, cell.r0, factors, point.v);
            point.charging =
                if load.esr.0 == 0.0 || self.slaved { 0.0 } else { (point.v - y[CAP]) / load.esr.0 };
            point.draw = point.path.current - point.charging;
        } else if self.slaved {
            (point.v, point.path, point.draw, point.draw_slope) = meet(self.guess, &at);
        } else {
            let (v, (path, draw, slope)) =
                if load.esr.0 == 0.0 { (y[CAP], at(y[CAP])) } else { self.behind_esr(y[CAP], e, &at) };
            (point.v, point.path, point.draw, point.draw_slope) = (v, path, draw, slope);
            point.charging = path.current - draw;
        }
        self.fill_rates(&mut point, y, factors, surge);
        if self.slaved && self.mode != Mode::Pinned {
            // i_C = C·dV/dt moves the operating point a little.
            let charging = load.capacitance.0 * point.drift;
            let shift = charging / (point.path.conductance + point.draw_slope);
            point.v -= shift;
            let extra = point.path.conductance * shift;
            point.path.current += extra;
            point.path.cell -= extra * cell.r0;
            let upstream = cell.r0 + c.ahead + point.path.second + c.second.as_ref().map_or(0.0, |s| s.shunt);
            point.path.board -= extra * upstream;
            point.draw -= point.draw_slope * shift;
            point.charging = point.path.current - point.draw;
            self.fill_rates(&mut point, y, factors, surge);
        }
        point
    }

    /// The voltage at the load when the capacitor with its series resistance is at `cap`.
    ///
    /// `V − v_C − ESR·(I(V) − I_load(V))` rises with V above the voltage at which a falling draw is
    /// steeper than 1/ESR; below that there is nothing to find, and the arc has dropped.
    fn behind_esr(
        &self,
        cap: f64,
        e: f64,
        at: &impl Fn(f64) -> (PathNow, f64, f64),
    ) -> (f64, (PathNow, f64, f64)) {
        let esr = self.setup.load.esr.0;
        let mut low = match (&self.mode, &self.setup.load.lit) {
            (Mode::Lit, crate::load::LitDraw::Power(p)) => (esr * p.0).sqrt().max(1e-3),
            _ => 0.0,
        };
        let mut high = e.max(cap);
        let mut v = self.guess.clamp(low, high.max(low));
        let mut now = at(v);
        for _ in 0..100 {
            let miss = v - cap - esr * (now.0.current - now.1);
            if miss > 0.0 {
                high = v;
            } else {
                low = v;
            }
            let mut next = v - miss / (1.0 + esr * (now.0.conductance + now.2));
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
        (v, now)
    }

    fn fill_rates(&self, point: &mut Point, y: &Y, factors: (f64, f64), surge: f64) {
        let c = &self.circuit;
        let cell = &self.setup.cell;
        let ambient = self.setup.usage.ambient.0;
        let i = point.path.current;
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
                (i2 * point.path.pair * s.thermal_k_per_w - (y[SWITCH_T] - ambient)) / s.thermal_time_s;
        }
        if let Some(s) = &c.second {
            rate[SECOND_T] =
                (i2 * point.path.second * s.thermal_k_per_w - (y[SECOND_T] - ambient)) / s.thermal_time_s;
        }
        rate[CAP] = if self.slaved { 0.0 } else { point.charging / self.setup.load.capacitance.0 };
        let e_rate = point.cell.ocv_slope * rate[Z] + point.cell.entropy * rate[CELL_T] - polar_rate;
        let r0_rate = point.cell.r0_slope.0 * rate[Z] + point.cell.r0_slope.1 * rate[CELL_T];
        let drift = c.current_drift(&point.path, e_rate, r0_rate, (rate[SWITCH_T], rate[SECOND_T]), factors);
        let stiffness = point.path.conductance + point.draw_slope;
        // A decaying surge seen through a first-order lag: s·e^(−t/τ)/(1 − τ_fast/τ).
        let surge_drift = if surge > 0.0 {
            let lag = self.fast_time(point) / self.setup.load.surge_time.0;
            surge / self.setup.load.surge_time.0 / (1.0 - lag).max(0.5)
        } else {
            0.0
        };
        point.drift = (drift + surge_drift) / stiffness;
    }

    /// Time constant with which the capacitor follows.
    fn fast_time(&self, point: &Point) -> f64 {
        let load = &self.setup.load;
        if self.mode == Mode::Pinned {
            return load.capacitance.0 * load.esr.0;
        }
        load.capacitance.0 * (1.0 / (point.path.conductance + point.draw_slope) + load.esr.0)
    }

    /// Takes the capacitor out of the state, or puts it back; whether it did.
    fn change_regime(&mut self, y: &mut Y, point: &Point) -> bool {
        let load = &self.setup.load;
        let stiffness = point.path.conductance + point.draw_slope;
        if self.mode == Mode::Pinned {
            let settled = load.esr.0 == 0.0 || (point.v - y[CAP]).abs() < SLAVED_WITHIN;
            if !self.slaved && settled {
                self.slaved = true;
                return true;
            }
            return false;
        }
        let fast = self.fast_time(point);
        // The operating point must move slowly against the capacitor's time constant: what is
        // neglected is τ² times its second derivative, about the drift over the shortest slow time.
        let mut slow_rate = self.circuit.branch_rate.iter().copied().fold(0.0, f64::max);
        if self.surge_now(point) {
            slow_rate = slow_rate.max(1.0 / load.surge_time.0);
        }
        let neglected = fast * fast * point.drift.abs() * slow_rate;
        let follows = stiffness > 0.0 && neglected < SLAVED_WITHIN && fast * slow_rate < 0.05;
        if self.slaved {
            if follows {
                return false;
            }
            self.free(y, point);
            return true;
        }
        let away = (point.charging / load.capacitance.0 - point.drift) * fast;
        if follows && away.abs() < SLAVED_WITHIN && neglected < 0.3 * SLAVED_WITHIN {
            self.slaved = true;
            self.guess = point.v;
            return true;
        }
        false
    }

    fn surge_now(&self, point: &Point) -> bool {
        let (draw, _) = self.circuit.draw(self.mode, point.v);
        point.draw - draw > 1e-9
    }

    /// A first step after a change.
    fn first_step(&self, point: &Point) -> f64 {
        if self.slaved {
            return self.hints[usize::from(self.mode == Mode::Lit)];
        }
        let fast = self.fast_time(point);
        let fast = if fast > 0.0 { fast } else { self.setup.load.capacitance.0 / point.path.conductance };
        (0.4 * fast).max(1e-12)
    }

    /// How far past each thing that could happen a point is, one after the other; positive when it
    /// happened.
    fn each(&self, point: &Point, z: f64, t: f64, mut look: impl FnMut(f64, Crossing)) {
        let load = &self.setup.load;
        match self.mode {
            Mode::Stalled => look(point.v - load.start.0, Crossing::Start),
            Mode::Pinned => {
                let run = load.start.0 / load.unlit.0 + self.surge(t, Mode::Unlit);
                look(point.draw - run, Crossing::PinEndsAbove);
                look(load.start.0 / self.circuit.stall_ohm - point.draw, Crossing::PinEndsBelow);
            }
            Mode::Unlit => {
                look(load.start.0 - point.v, Crossing::BelowStart);
                if self.strike_since.is_none() {
                    look(point.v - load.strike.0, Crossing::Strike);
                } else {
                    look(load.strike.0 - point.v, Crossing::StrikeLost);
                }
            }
            Mode::Lit => look(load.hold.0 - point.v, Crossing::BelowHold),
        }
        for (k, watch) in self.watches.iter().enumerate() {
            let excess = self.excess(watch, point);
            look(if watch.since.is_some() { -excess } else { excess }, Crossing::Limit(k));
        }
        look(-z, Crossing::Empty);
    }

    /// The furthest of them, without those in `skip` (a bit each, in their order).
    fn furthest(&self, point: &Point, z: f64, t: f64, skip: u64) -> (f64, Crossing) {
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
    fn land(
        &self,
        whole: &Step,
        t: f64,
        x: f64,
        crossing: Crossing,
        first: &Point,
        tally: &mut Tally,
    ) -> Step {
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
    fn find(&self, before: &Point, step: &Step, t: f64) -> Option<(f64, Crossing)> {
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
        let (v0, v1) =
            if self.slaved { (before.drift, step.last.drift) } else { (before.charging, step.last.charging) };
        if v0 * v1 < 0.0 {
            let turn = v0 / (v0 - v1);
            let extreme = at(turn);
            if extreme.0 > 0.0 {
                (high, there) = (turn, extreme);
            }
        }
        if !(there.0 > 0.0) {
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

/// The operating point nearest to `guess`: where path and load draw the same.
fn meet(guess: f64, at: &impl Fn(f64) -> (PathNow, f64, f64)) -> (f64, PathNow, f64, f64) {
    let mut v = guess;
    let (mut path, mut draw, mut slope) = at(v);
    for _ in 0..20 {
        let move_by = (path.current - draw) / (path.conductance + slope);
        v += move_by;
        (path, draw, slope) = at(v);
        if move_by.abs() < 1e-11 {
            return (v, path, draw, slope);
        }
    }
    // Not found: the point has vanished, which the caller sees by the number.
    (f64::NAN, path, draw, slope)
}
