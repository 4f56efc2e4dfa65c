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
mod crossing;
mod equations;
mod instant;
mod layer;

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

/// What one step may be wrong by, per state: ten microvolts and what makes as much; for the switches a
/// millikelvin, since a short thermal time constant keeps the error of a long press at what one step may have; for the
/// capacitor, whose energy stands in the ledger of a press that ends in the inrush, half a microvolt.
const TOLERANCE: Y = [1e-6, 1e-5, 1e-5, 1e-5, 2e-3, 1e-3, 1e-3, 5e-7];
/// The capacitor is slaved once it is this close to the operating point, in V.
const SLAVED_WITHIN: f64 = 1e-6;
/// How far the charge of a slaved capacitor may part from its integrated current in a step, in A·s.
const CHARGE_WITHIN: f64 = 5e-9;
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
    /// It is followed to the first drop of the arc only; the end is then that of the bound on events.
    pub until_drop: bool,
}

impl Default for PressOptions {
    /// No samples, 100 000 events.
    fn default() -> Self {
        Self { samples: Vec::new(), max_events: 100_000, until_drop: false }
    }
}

/// Follows one press from `start`.
///
/// While samples are wanted in a fast stretch it is followed by steps instead of a quadrature: the summary is
/// the same within what the solver allows, not to the last bit.
pub fn run(setup: &Setup, start: &PressStart, options: &PressOptions) -> PressReport {
    let mut simulator = Simulator::new(setup, options.max_events);
    simulator.until_drop = options.until_drop;
    let mut recorder = Recorder { events: Vec::new(), trace: Vec::new(), wanted: &options.samples };
    let summary = simulator.press(&mut start.state(), Some(&mut recorder), u64::MAX);
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

/// Path and load at one voltage at the load.
#[derive(Clone, Copy, Default)]
struct Held {
    path: PathNow,
    v: f64,
    /// Into the load, surge included.
    draw: f64,
    /// Slope of the draw over the voltage.
    draw_slope: f64,
    /// Into the capacitor.
    charging: f64,
}

/// Everything at one instant.
#[derive(Clone, Copy)]
struct Point {
    rate: Y,
    cell: CellNow,
    /// Sum of the branch voltages.
    polar: f64,
    at: Held,
    /// `dV/dt` of the operating point, if the capacitor is slaved.
    drift: f64,
}

impl Point {
    /// What the sums grow by per second, with the load at `held`.
    fn flow_at(&self, held: &Held) -> [f64; SUMS] {
        let i = held.path.current;
        let i2 = i * i;
        let mut flow = [0.0; SUMS];
        flow[CHARGE] = i;
        flow[I2] = i2;
        flow[SOURCE] = i * self.cell.ocv;
        flow[OHMIC] = i2 * self.cell.r0;
        flow[POLAR] = i * self.polar;
        flow[SECOND] = i2 * held.path.second;
        flow[PAIR] = i2 * held.path.pair;
        flow[ESR] = held.charging * held.charging;
        flow[LOAD] = held.v * held.draw;
        flow
    }
}

impl Rates<STATES, SUMS> for Point {
    fn rate(&self) -> &Y {
        &self.rate
    }

    fn flow(&self) -> [f64; SUMS] {
        self.flow_at(&self.at)
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

/// A press under way.
struct Moment<'r, 'o> {
    recorder: Option<&'r mut Recorder<'o>>,
    tally: Tally,
    t: f64,
    y: Y,
    point: Point,
    /// Of the point only path and load are those of now: rates and curves are of a moment ago.
    stale: bool,
    next_sample: usize,
}

/// What a press has come to so far.
#[derive(Default)]
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
    /// No step is short enough to go on; the press is not followed further, and says so.
    lost: bool,
    steps: u32,
    events: u32,
}

impl Tally {
    /// Keeps the largest current and the highest temperatures.
    fn reach(&mut self, y: &Y, current: f64) {
        self.peak = self.peak.max(current);
        for (k, hottest) in self.hottest.iter_mut().enumerate() {
            *hottest = hottest.max(y[CELL_T + k]);
        }
    }
}

/// The presses of one setup, one after the other.
pub(crate) struct Simulator<'a> {
    pub(crate) setup: &'a Setup,
    pub(crate) circuit: Circuit<'a>,
    pub(crate) watches: Vec<Watch>,
    max_events: u32,
    until_drop: bool,
    /// Step sizes that suited the slaved phases of the press before: unlit and lit.
    hints: [f64; 2],
    /// How far a slaved voltage may part from its integrated drift in a step, in V.
    drift_within: f64,
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
            until_drop: false,
            hints: [1e-3, 0.05],
            drift_within: (CHARGE_WITHIN / setup.load.capacitance.0).clamp(1e-6, 5e-5),
            mode: Mode::Stalled,
            slaved: false,
            surge_from: None,
            strike_since: None,
            guess: 0.0,
        }
    }

    /// One press from the state `y`, which it carries on; the capacitor starts and is left empty.
    ///
    /// - `max_steps`: a bound beside that on events.
    pub(crate) fn press(
        &mut self,
        y: &mut Y,
        recorder: Option<&mut Recorder<'_>>,
        max_steps: u64,
    ) -> PressSummary {
        self.begin();
        let soc_start = y[Z];
        let mut now = Moment {
            recorder,
            tally: Tally { hottest: [y[CELL_T], y[SWITCH_T], y[SECOND_T]], ..Tally::default() },
            t: 0.0,
            y: *y,
            point: self.point(y, 0.0),
            stale: false,
            next_sample: 0,
        };
        self.log(&mut now, EventKind::Closed);
        self.review_limits(&mut now);
        self.first_sample(&mut now);
        now.tally.peak = now.point.at.path.current;
        if now.point.at.v >= self.setup.load.start.0 {
            self.cross(Crossing::Start, &mut now);
        }
        let end = self.follow(&mut now, max_steps);
        if end == PressEnd::EventLimit {
            self.log(&mut now, EventKind::EventLimit);
        }
        // What still runs in the rest is told from the rest's own beginning.
        for since in self.watches.iter_mut().filter_map(|w| w.since.as_mut()) {
            *since -= now.t;
        }
        let capacitor = self.capacitor(&now.y, &now.point);
        *y = now.y;
        y[CAP] = 0.0;
        self.summary(&now, end, soc_start, capacitor)
    }

    fn begin(&mut self) {
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
    }

    /// From the first instant to the end of the press.
    fn follow(&mut self, now: &mut Moment<'_, '_>, max_steps: u64) -> PressEnd {
        let press = self.setup.usage.press.0;
        let bound = u64::from(self.max_events).saturating_mul(STEPS_PER_EVENT).max(100_000).min(max_steps);
        let mut h = self.first_step(&now.point);
        let mut fresh = true;
        loop {
            if now.tally.lost || now.tally.events >= self.max_events || u64::from(now.tally.steps) >= bound {
                return PressEnd::EventLimit;
            }
            let (stop, what) = self.next_deadline(press);
            if now.t >= stop {
                match what {
                    Deadline::Opening(k) => {
                        let limit = self.watches[k].limit;
                        self.log(now, EventKind::Opened(limit));
                        return PressEnd::Opened(limit);
                    }
                    Deadline::Lighting => self.light(now),
                    Deadline::Release => {
                        self.log(now, EventKind::Released);
                        return PressEnd::Released;
                    }
                }
                h = self.first_step(&now.point);
                fresh = true;
                continue;
            }
            if fresh {
                fresh = false;
                if self.layer(now, stop) {
                    h = self.first_step(&now.point);
                    // It may have ended on a limit's threshold, with more of the same ahead.
                    fresh = !self.slaved;
                    continue;
                }
            }
            if now.stale {
                now.point = self.point(&now.y, now.t);
                now.stale = false;
            }
            let (taken, crossing) = self.advance(now, stop, &mut h);
            if !taken {
                continue;
            }
            match crossing {
                Some(Crossing::Empty) => {
                    now.y[Z] = 0.0;
                    self.log(now, EventKind::CellEmpty);
                    return PressEnd::CellEmpty;
                }
                Some(crossing) => {
                    let before = (self.mode, self.slaved);
                    self.cross(crossing, now);
                    if (self.mode, self.slaved) != before {
                        h = self.first_step(&now.point);
                        fresh = true;
                    }
                }
                None if now.t < stop && self.change_regime(now) => {
                    now.point = self.point(&now.y, now.t);
                    h = self.first_step(&now.point);
                }
                None => {}
            }
        }
    }

    /// One step towards `stop` with the step size `h`, which it adapts: whether it was taken, and
    /// what it ran into.
    fn advance(&mut self, now: &mut Moment<'_, '_>, stop: f64, h: &mut f64) -> (bool, Option<Crossing>) {
        let left = stop - now.t;
        if self.slaved && self.surge_now(&now.point) {
            // The slaved voltage is not in the error estimate, so a decaying surge could be stepped over.
            *h = h.min(0.7 * self.setup.load.surge_time.0);
        }
        if self.slaved {
            now.y[CAP] = now.point.at.v;
        }
        let whole = *h >= left;
        let step = self.step(&now.y, now.t, if whole { left } else { *h }, &now.point);
        now.tally.steps += 1;
        let size = error_size(&step, self.slaved.then_some(self.drift_within));
        if !size.is_finite() && step.h <= 1e-12 {
            now.tally.lost = true;
            return (false, None);
        }
        if (size > 1.0 || !size.is_finite()) && step.h > 1e-12 {
            let shrink = if size.is_finite() { (0.9 / size.sqrt().sqrt()).clamp(0.1, 0.8) } else { 0.1 };
            *h = step.h * shrink;
            if self.slaved && step.h <= 20.0 * self.fast_time(&now.point) {
                // The operating point vanishes, or runs away, inside a step that is short for the capacitor already.
                self.free(now);
                now.point = self.point(&now.y, now.t);
                *h = self.first_step(&now.point);
            }
            return (false, None);
        }
        let grown = step.h * (0.9 / size.sqrt().sqrt().max(0.05)).min(5.0);
        let (step, crossing) = match self.find(&now.point, &step, now.t) {
            Some((x, crossing)) => (self.land(&step, x, crossing, now), Some(crossing)),
            None => (step, None),
        };
        let ends = if whole && crossing.is_none() { stop } else { now.t + step.h };
        self.sample_step(now, &step, ends);
        self.book(&mut now.tally, &step.sums, (now.point.at.v, step.last.at.v), ends - now.t);
        now.tally.reach(&step.to, step.last.at.path.current);
        now.y = step.to;
        now.t = ends;
        now.point = step.last;
        self.guess = now.point.at.v;
        if !whole || grown < *h {
            *h = grown;
        }
        if self.slaved && crossing.is_none() && !whole {
            self.hints[usize::from(self.mode == Mode::Lit)] = *h;
        }
        (true, crossing)
    }

    fn first_sample(&self, now: &mut Moment<'_, '_>) {
        let first = self.sample(0.0, &now.y, &now.point);
        if let Some(r) = now.recorder.as_deref_mut()
            && r.wanted.first().is_some_and(|s| s.0 <= 0.0)
        {
            r.trace.push(first);
            now.next_sample = 1;
        }
    }

    /// The samples that are wanted inside a step.
    fn sample_step(&self, now: &mut Moment<'_, '_>, step: &Step, ends: f64) {
        if let Some(r) = now.recorder.as_deref_mut() {
            while let Some(wanted) = r.wanted.get(now.next_sample).filter(|s| s.0 <= ends) {
                let y = step.at(((wanted.0 - now.t) / step.h).clamp(0.0, 1.0));
                let there = self.point(&y, wanted.0);
                r.trace.push(self.sample(wanted.0, &y, &there));
                now.next_sample += 1;
            }
        }
    }

    /// The over-discharge limits: which, threshold, delay, and since when they are exceeded.
    pub(crate) fn over_discharge(&mut self) -> impl Iterator<Item = (&Limit, f64, f64, &mut Option<f64>)> {
        self.watches.iter_mut().filter_map(|w| match w.threshold {
            Trigger::Supply(threshold) => Some((&w.limit, threshold, w.delay, &mut w.since)),
            Trigger::PairSense(_) | Trigger::ShuntSense(_) | Trigger::Current(_) => None,
        })
    }

    fn summary(&self, now: &Moment<'_, '_>, end: PressEnd, soc_start: f64, capacitor: f64) -> PressSummary {
        let Moment { tally, t, y, point, .. } = now;
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
            end_time: Seconds(*t),
            lit: Seconds(tally.lit),
            first_lit: tally.first_lit.map(Seconds),
            drops: tally.drops,
            start: tally.start.map(Seconds),
            end_mode: self.mode,
            load_end: Volts(point.at.v),
            current_end: Amps(point.at.path.current),
            board_end: Volts(point.at.path.board),
            cell_end: Volts(point.at.path.cell),
            pair_end: Ohms(point.at.path.pair),
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

/// Size of a step's error against what is allowed; not finite where a rate is not.
fn error_size(step: &Step, slaved_within: Option<f64>) -> f64 {
    let states = if slaved_within.is_some() { CAP } else { STATES };
    let parts = step.error.iter().zip(&TOLERANCE).take(states).map(|(error, allowed)| error.abs() / allowed);
    // A slaved voltage is solved for; its integrated drift must come to the same.
    let solved = slaved_within.map(|allowed| (step.to[CAP] - step.last.at.v).abs() / allowed);
    parts.chain(solved).fold(
        0.0,
        |size: f64, part| {
            if part.is_nan() || size.is_nan() { f64::NAN } else { size.max(part) }
        },
    )
}

enum Deadline {
    Opening(usize),
    Lighting,
    Release,
}
