//! The time–current diagram: what opens when, and what is harmed when, over the current.
//!
//! The current is what the stages see: the path's, and while the load runs its ripple's peaks. A stage that compares a
//! sense voltage has no trip current of its own; it is computed here at the two ends of what the design meets:
//! the earliest board with an empty cell and warm switch, the latest with a full cell and cool switch.

use crate::circuit::Circuit;
use crate::margins::{self, Corners, Place};
use crate::math::exp;
use crate::press::{self, PressOptions, PressStart};
use crate::ratings::{Band, CellRatings, Fuse, FuseKind, LeadRating, Ratings};
use crate::report::{Event, EventKind, Limit, Mode, PressEnd, PressReport, Protector};
use crate::setup::Setup;
use crate::units::{Amps, Celsius, Ohms, Seconds, Volts};
use crate::wiring;

/// What can open the path.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Opener {
    /// A current stage.
    Stage(Limit),
    /// The fuse, or the PTC.
    Fuse,
}

/// One stage on the diagram.
#[derive(Debug, Clone, PartialEq)]
pub struct StageBand {
    /// Which.
    pub limit: Limit,
    /// Current of the earliest board at whatever charge is worst, with a warm switch; `None`: never met.
    pub low: Option<Amps>,
    /// As entered, half charge, at the end of a press.
    pub typical: Option<Amps>,
    /// Current of the latest board, full cell and cool switch.
    pub high: Option<Amps>,
    /// Shortest, typical and longest delay, in s.
    pub delay: Band,
}

/// The largest current into a dead short at the load's terminals, from a rested cell with a cool switch.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Prospective {
    /// State of charge.
    pub soc: f64,
    /// The current.
    pub current: Amps,
    /// Supply of the board at it: what is left of its gate voltage.
    pub board: Volts,
    /// Everything in series.
    pub total: Ohms,
}

/// Everything the diagram shows.
#[derive(Debug, Clone, PartialEq)]
pub struct Diagram {
    /// Stages of the protectors in the load's path.
    pub stages: Vec<StageBand>,
    /// The fuse, where there is one.
    pub fuse: Option<Fuse>,
    /// For each current the longest time the load's own press stays above it, by rising current.
    pub envelope: Vec<(Amps, Seconds)>,
    /// What the load draws at the end of the press, with ripple.
    pub draw: Amps,
    /// Prospective short-circuit current with a full cell and with a nearly empty one.
    pub prospective: [Prospective; 2],
    /// The leads: `t = k²S²/I²` each.
    pub leads: Vec<LeadRating>,
    /// All cells together: continuous current, and pulse current with its time.
    pub continuous: Option<Amps>,
    /// The pulse current.
    pub pulse: Option<(Amps, Seconds)>,
}

/// The law of a lead's damage line holds up to this time: beyond it the lead gives heat away.
///
/// Source: IEC 60364-4-43, 434.5.2.
pub const ADIABATIC_UP_TO: Seconds = Seconds(5.0);

/// State of charge that stands for a nearly empty cell in the diagram.
pub const NEARLY_EMPTY: f64 = 0.05;

/// The diagram of a design.
///
/// - `press`: the load's own press, with the samples of [`press::sample_times`].
pub fn diagram(corners: Corners<'_>, ratings: &Ratings, press: &PressReport) -> Diagram {
    let setup = corners.typical;
    let ambient = setup.usage.ambient;
    let stages = margins::limits(setup)
        .map(|limit| {
            let at_end = |setup: &Setup, soc: f64| {
                let (place, _) = margins::end_of_press(setup, soc, ambient);
                margins::trip_seen(setup, &place, limit, 1.0)
            };
            let delay = |setup: &Setup| stage_delay(setup, limit);
            // An empty cell may be too weak for a threshold that a fuller one reaches.
            let lowest = |setup: &Setup| {
                let ends = [NEARLY_EMPTY, 0.5, 1.0].map(|soc| at_end(setup, soc));
                let rested = margins::trip_seen(setup, &Place::rested(1.0, ambient), limit, 1.0);
                ends.into_iter().chain([rested]).flatten().map(|i| i.0).reduce(f64::min).map(Amps)
            };
            StageBand {
                limit,
                low: lowest(corners.low),
                typical: at_end(setup, 0.5).or_else(|| lowest(setup)),
                high: margins::trip_seen(corners.high, &Place::rested(1.0, ambient), limit, 1.0),
                delay: Band { low: delay(corners.low), typical: delay(setup), high: delay(corners.high) },
            }
        })
        .collect();
    let cells = f64::from(setup.cell.parallel);
    let CellRatings { continuous, pulse, pulse_time, .. } = ratings.cell;
    let last = &press.summary;
    Diagram {
        stages,
        fuse: ratings.fuse.clone(),
        envelope: envelope(setup, press),
        draw: Amps(last.current_end.0 * setup.load.peak_factor),
        prospective: [prospective(setup, 1.0), prospective(setup, NEARLY_EMPTY)],
        leads: ratings.leads.clone(),
        continuous: continuous.map(|i| Amps(i.0 * cells)),
        pulse: pulse.map(|i| (Amps(i.0 * cells), pulse_time)),
    }
}

fn stage_delay(setup: &Setup, limit: Limit) -> f64 {
    let board = match limit {
        Limit::Stage(Protector::Board, _) | Limit::OverDischarge(Protector::Board) => setup.board_in_path(),
        Limit::Stage(Protector::Second, _) | Limit::OverDischarge(Protector::Second) => {
            setup.second_protector.as_ref()
        }
    };
    match (board, limit) {
        (Some(board), Limit::Stage(_, k)) => board.stages.get(k).map_or(0.0, |s| s.delay.0),
        _ => 0.0,
    }
}

/// Current into a dead short at the load's terminals.
pub fn prospective(setup: &Setup, soc: f64) -> Prospective {
    into(setup, soc, Ohms(0.0))
}

/// Current into a resistance at the load's terminals, from a rested cell, everything at ambient temperature.
pub fn into(setup: &Setup, soc: f64, resistance: Ohms) -> Prospective {
    let mut faulty = setup.clone();
    faulty.path.after = faulty.path.after + resistance;
    let circuit = Circuit::new(&faulty);
    let t = setup.usage.ambient.0;
    let cell = circuit.cell_now(soc, t);
    let factors = (
        circuit.board.as_ref().map_or(0.0, |s| s.factor(t)),
        circuit.second.as_ref().map_or(0.0, |s| s.factor(t)),
    );
    let path = circuit.path(cell.ocv, cell.r0, factors, 0.0);
    Prospective {
        soc,
        current: Amps(path.current),
        board: Volts(path.board),
        total: Ohms(cell.ocv / path.current),
    }
}

/// A point of the line that an envelope is drawn from.
#[derive(Clone, Copy)]
struct Seen {
    time: f64,
    /// What the stages see.
    current: f64,
    /// Something happened here: what rises after it rises at once, and not as slowly as the samples are apart.
    event: bool,
}

/// For each current the longest time without a break that a press stays at or above it; the currents are those of its
/// samples and events, every one that lasts longer than any above it.
fn envelope(setup: &Setup, press: &PressReport) -> Vec<(Amps, Seconds)> {
    let extra = setup.load.peak_factor - 1.0;
    let circuit = Circuit::new(setup);
    let started = press.events.iter().find(|e| e.kind == EventKind::StartReached).map(|e| e.time.0);
    // An event has the path's current, which nothing makes jump, but not the load's, which ripples.
    let ripple = |mode: Mode, e: &Event| match (mode, started) {
        (Mode::Unlit | Mode::Lit, Some(from)) => {
            let load = &setup.load;
            let left = || exp(-(e.time.0 - from) / load.surge_time.0);
            let surge = if load.surge.0 > 0.0 { load.surge.0 * left() } else { 0.0 };
            extra * (circuit.draw(mode, e.load.0).0 + surge)
        }
        _ => 0.0,
    };
    let mut line: Vec<Seen> = press
        .trace
        .iter()
        .map(|s| {
            let runs = matches!(s.mode, Mode::Unlit | Mode::Lit);
            let ripple = if runs { extra * s.load_current.0 } else { 0.0 };
            Seen { time: s.time.0, current: s.current.0 + ripple, event: false }
        })
        .collect();
    let mut mode = Mode::Stalled;
    for e in &press.events {
        for mode in [mode, e.mode] {
            line.push(Seen { time: e.time.0, current: e.current.0 + ripple(mode, e), event: true });
        }
        mode = e.mode;
    }
    line.sort_by(|a, b| a.time.total_cmp(&b.time));
    let mut levels: Vec<f64> = line.iter().map(|p| p.current).filter(|i| *i > 1e-3).collect();
    levels.sort_by(f64::total_cmp);
    // A hundred levels tell the shape.
    let thin = levels.len().div_ceil(100).max(1);
    let top = levels.last().copied();
    let mut chosen: Vec<f64> = levels.into_iter().step_by(thin).collect();
    chosen.extend(top);
    chosen.dedup();
    chosen.into_iter().map(|level| (Amps(level), Seconds(longest_above(&line, level)))).collect()
}

fn longest_above(line: &[Seen], level: f64) -> f64 {
    let (mut longest, mut since) = (0.0_f64, None::<f64>);
    for pair in line.windows(2) {
        let (from, to) = (pair[0], pair[1]);
        let meets = || {
            let share = (level - from.current) / (to.current - from.current);
            from.time + (to.time - from.time) * share
        };
        match (from.current >= level, to.current >= level) {
            (true, true) => {
                since.get_or_insert(from.time);
            }
            (true, false) => {
                let begun = since.take().unwrap_or(from.time);
                longest = longest.max(meets() - begun);
            }
            (false, true) => since = Some(if from.event { from.time } else { meets() }),
            (false, false) => {}
        }
    }
    match (since, line.last()) {
        (Some(begun), Some(last)) => longest.max(last.time - begun),
        _ => longest,
    }
}

/// (multiple of the rated current, shortest, longest pre-arcing time in s); a shortest time of 0 and a longest of ∞ are
/// not promised.
type Gates = [(f64, f64, f64); 5];

/// Quick-acting miniature fuses, 5 × 20 mm, whichever breaking capacity: the wider of sheets 1 and 2.
///
/// Source: IEC 60127-2, standard sheets 1 and 2, as printed in the 216SP and 617 series data sheets.
const QUICK: Gates = [
    (1.5, 3600.0, f64::INFINITY),
    (2.1, 0.0, 1800.0),
    (2.75, 0.01, 3.0),
    (4.0, 0.003, 0.4),
    (10.0, 0.0, 0.04),
];
/// Time-lag miniature fuses: the wider of sheets 3 and 5.
///
/// Source: IEC 60127-2, standard sheets 3 and 5, as printed in the 213, 215, 5HT and SMD-SPT series data sheets; they
/// disagree on ten times the rated current (10 or 20 ms, 100 to 300 ms).
const TIME_LAG: Gates = [
    (1.5, 3600.0, f64::INFINITY),
    (2.1, 0.0, 1800.0),
    (2.75, 0.6, 80.0),
    (4.0, 0.095, 5.0),
    (10.0, 0.01, 0.3),
];
/// A melting I²t is a promise for times up to this; slower heating loses heat on the way.
const MELTING_UP_TO: f64 = 0.01;
/// The earliest a PTC trips, as a part of its longest time. Common practice, no source: sheets give the longest only, and
/// two of the same rating differ by 1.8.
const PTC_EARLIEST: f64 = 0.1;

/// Earliest and latest time at which a fuse opens a current; `None` in the first: it never does; in the second: no
/// promise that it does.
///
/// Between two gates times go as straight lines on the double logarithmic sheet; beyond the last one at constant I²t.
/// A PTC warms as one body, `t = t₀·ln[1 − (I_t/I)²]⁻¹/ln[1 − (I_t/I₀)²]⁻¹`, with its hold current for the earliest.
pub fn fuse_times(fuse: &Fuse, current: Amps) -> (Option<Seconds>, Option<Seconds>) {
    let i = current.0;
    let rated = fuse.rating.0;
    match &fuse.kind {
        FuseKind::Quick => gate_times(&QUICK, i / rated),
        FuseKind::TimeLag => gate_times(&TIME_LAG, i / rated),
        FuseKind::MeltingI2t(band) => {
            if i <= rated {
                return (None, None);
            }
            let latest = band.high / (i * i);
            (Some(Seconds(band.low / (i * i))), (latest <= MELTING_UP_TO).then_some(Seconds(latest)))
        }
        FuseKind::Ptc { trip, time, at } => {
            if i <= rated {
                return (None, None);
            }
            // It warms as one body: it takes for ever at a current that it only just settles hot at.
            let warming = |settles: f64, i: f64| -crate::math::ln(1.0 - (settles / i) * (settles / i));
            let longest = |settles: f64| time.0 * warming(settles, i) / warming(settles, at.0);
            let latest = (i > trip.0 && at.0 > trip.0).then(|| Seconds(longest(trip.0)));
            // A time given at no more than the hold current says nothing of how soon it may be.
            let earliest = if at.0 > rated { PTC_EARLIEST * longest(rated) } else { 0.0 };
            (Some(Seconds(earliest)), latest)
        }
    }
}

fn gate_times(gates: &Gates, multiple: f64) -> (Option<Seconds>, Option<Seconds>) {
    if multiple < gates[0].0 {
        return (None, None);
    }
    let along = |pick: &dyn Fn(&(f64, f64, f64)) -> f64| {
        let known: Vec<(f64, f64)> =
            gates.iter().map(|g| (g.0, pick(g))).filter(|(_, t)| *t > 0.0 && t.is_finite()).collect();
        let last = known.last()?;
        if multiple >= last.0 {
            return Some(last.1 * (last.0 / multiple) * (last.0 / multiple));
        }
        let k = known.iter().position(|(m, _)| *m > multiple)?;
        let ((m0, t0), (m1, t1)) = (known.get(k.checked_sub(1)?)?, known.get(k)?);
        let share = crate::math::ln(multiple / m0) / crate::math::ln(m1 / m0);
        Some(t0 * crate::math::powf(t1 / t0, share))
    };
    (along(&|g| g.1).map(Seconds), along(&|g| g.2).map(Seconds))
}

/// One thing that opens at a current.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Opening {
    /// What.
    pub what: Opener,
    /// Earliest, over the tolerances.
    pub earliest: Seconds,
    /// Latest; `None`: with some parts, or at some charge, it does not open at all.
    pub latest: Option<Seconds>,
}

/// What happens at one current, if it flows on.
#[derive(Debug, Clone, PartialEq)]
pub struct AtCurrent {
    /// The current.
    pub current: Amps,
    /// What opens, the earliest promise first: by latest time, then by earliest.
    pub openings: Vec<Opening>,
    /// What never opens at this current.
    pub never: Vec<Opener>,
    /// For each lead the time to its limit, up to [`ADIABATIC_UP_TO`]; `None`: longer than that.
    pub leads: Vec<Option<Seconds>>,
    /// For each lead whether something is sure to open before its limit; `None`: its limit is beyond
    /// [`ADIABATIC_UP_TO`] and nothing is sure to open until then, so the line does not tell.
    pub leads_safe: Vec<Option<bool>>,
    /// Whether the cell is within its own limits until something is sure to open; `None`: it has none entered.
    pub cell_safe: Option<bool>,
}

impl Diagram {
    /// What opens at `current`, and what is harmed until then.
    pub fn at(&self, current: Amps) -> AtCurrent {
        let mut openings = Vec::new();
        let mut never = Vec::new();
        for stage in &self.stages {
            let what = Opener::Stage(stage.limit);
            if stage.low.is_some_and(|low| current.0 > low.0) {
                let sure = stage.high.is_some_and(|high| current.0 > high.0);
                openings.push(Opening {
                    what,
                    earliest: Seconds(stage.delay.low),
                    latest: sure.then_some(Seconds(stage.delay.high)),
                });
            } else {
                never.push(what);
            }
        }
        if let Some(fuse) = &self.fuse {
            match fuse_times(fuse, current) {
                (Some(earliest), latest) => openings.push(Opening { what: Opener::Fuse, earliest, latest }),
                (None, _) => never.push(Opener::Fuse),
            }
        }
        let sure = |o: &Opening| o.latest.map_or(f64::INFINITY, |t| t.0);
        openings.sort_by(|a, b| sure(a).total_cmp(&sure(b)).then(a.earliest.0.total_cmp(&b.earliest.0)));
        let cleared = openings.iter().map(sure).fold(f64::INFINITY, f64::min);
        let leads: Vec<Option<Seconds>> = self
            .leads
            .iter()
            .map(|lead| {
                let k = wiring::adiabatic_k(lead.initial, lead.last);
                let time = wiring::time_to_limit(k, lead.area_mm2, current);
                (time.0 <= ADIABATIC_UP_TO.0).then_some(time)
            })
            .collect();
        let leads_safe = leads
            .iter()
            .map(|limit| match limit {
                Some(t) => Some(cleared < t.0),
                None => (cleared <= ADIABATIC_UP_TO.0).then_some(true),
            })
            .collect();
        let cell_safe = match (self.pulse, self.continuous) {
            (None, None) => None,
            (pulse, continuous) => {
                let for_good = continuous.is_some_and(|i| current.0 <= i.0);
                let for_a_while = pulse.is_some_and(|(i, t)| current.0 <= i.0 && cleared <= t.0);
                Some(for_good || for_a_while)
            }
        };
        AtCurrent { current, openings, never, leads, leads_safe, cell_safe }
    }
}

/// What a fault does in simulation, with the values as entered.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Fault {
    /// What opened first, if anything did.
    pub opened: Option<Limit>,
    /// When, or the length that was followed.
    pub time: Seconds,
    /// Current just after closing.
    pub current: Amps,
    /// Temperature of the board's pair at the end.
    pub switch_temperature: Celsius,
}

/// Simulates a fault: the load's terminals joined by `resistance`, from a rested cell at `soc`.
///
/// - `length`: how long it is followed.
pub fn fault(setup: &Setup, soc: f64, resistance: Ohms, length: Seconds) -> Fault {
    let mut faulty = setup.clone();
    // A load that never starts draws through its stall resistance, without ripple.
    faulty.load.stall = Some(Ohms(resistance.0.max(1e-6)));
    faulty.load.start = Volts(1e3);
    faulty.load.hold = Volts(2e3);
    faulty.load.strike = Volts(3e3);
    faulty.load.capacitance = crate::units::Farads(1e-6);
    faulty.load.esr = Ohms(0.0);
    faulty.load.surge = Amps(0.0);
    faulty.usage.press = length;
    let start = PressStart::relaxed(&faulty, soc, setup.usage.ambient);
    let report = press::run(&faulty, &start, &PressOptions::default());
    let opened = match report.summary.end {
        PressEnd::Opened(limit) => Some(limit),
        PressEnd::Released | PressEnd::CellEmpty | PressEnd::EventLimit => None,
    };
    let first = report.events.iter().find(|e| e.kind == EventKind::Closed);
    Fault {
        opened,
        time: report.summary.end_time,
        current: first.map_or(Amps(0.0), |e| e.current),
        switch_temperature: report.summary.switch_temperature_end,
    }
}
