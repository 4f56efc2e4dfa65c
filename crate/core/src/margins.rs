//! How far a design is from each of its limits, over the charge and over temperature.
//!
//! Two moments of a press decide: the **start**, when the load runs without an arc and has to reach its strike voltage
//! from a rested cell, and the **end**, when the branches have given way and the switch is warm, and the arc has to
//! hold and the board to stay closed. The end is computed in closed form for a press that draws throughout what it
//! draws at its end; the map beside it simulates real presses.

use crate::board::{Board, SensePoint, Threshold};
use crate::cell::MAX_BRANCHES;
use crate::circuit::{CellNow, Circuit, PathNow, Switch};
use crate::math::exp;
use crate::press::{self, PressOptions, PressStart};
use crate::report::{Limit, Mode, NotFull, Protector};
use crate::setup::Setup;
use crate::units::{Amps, Celsius, Ohms, Seconds, Volts};

/// What flows and stands when path and load agree.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Steady {
    /// Current in the path.
    pub current: Amps,
    /// Voltage at the load.
    pub load: Volts,
    /// Supply of the board: nearly its switches' gate voltage.
    pub board: Volts,
    /// Voltage at the cell.
    pub cell: Volts,
    /// Resistance of the board's pair; 0 where there is none in the path.
    pub pair: Ohms,
    /// Temperature of the board's pair.
    pub switch_temperature: Celsius,
    /// Everything in series, cell included.
    pub total: Ohms,
}

/// The current at which one stage's threshold is just met, with its tolerance.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Trip {
    /// Which stage.
    pub limit: Limit,
    /// Earliest: lowest threshold, highest resistance. `None`: not met by any current of this cell.
    pub low: Option<Amps>,
    /// With the values as entered.
    pub typical: Option<Amps>,
    /// Latest.
    pub high: Option<Amps>,
}

/// Everything at one state of charge.
#[derive(Debug, Clone, PartialEq)]
pub struct Row {
    /// State of charge when the press begins, 0 to 1; the cell is rested.
    pub soc: f64,
    /// Rested open-circuit voltage.
    pub open_circuit: Volts,
    /// At the start of a press: running, not lit. `None`: path and load do not meet.
    pub unlit: Option<Steady>,
    /// At its end, lit.
    pub lit: Option<Steady>,
    /// Draw at that end with the board that trips earliest and with the one that trips latest: a draw of constant power
    /// is larger through a pair of higher resistance.
    pub corner_draws: [Option<Amps>; 2],
    /// Trip currents of every stage at that end; in the order of the stages, board first.
    pub trips: Vec<Trip>,
    /// Largest total resistance, cell included, with which the start still reaches the strike voltage.
    pub strikes_up_to: Ohms,
    /// The same for the hold voltage at the end of the press, over the ohmic part of the cell and the path.
    pub holds_up_to: Ohms,
}

/// What is crossed on the way from full to empty: the first time each, if it is crossed more than once.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Edge {
    /// The start no longer reaches the strike voltage.
    Strike,
    /// The end of the press no longer keeps the hold voltage, or the load no longer meets the path.
    Hold,
    /// The draw enters this stage's band: the earliest of boards trips.
    TripEarliest(Limit),
    /// The draw reaches this stage's typical threshold.
    TripTypical(Limit),
    /// The latest of boards trips.
    TripLatest(Limit),
    /// The supply falls below this protector's over-discharge threshold at the end of the press.
    OverDischarge(Protector),
}

/// Where an edge lies.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Crossing {
    /// What is crossed.
    pub edge: Edge,
    /// At which state of charge, to 1e-4; 1 if it is past already when full.
    pub soc: f64,
}

/// The margins at one temperature.
#[derive(Debug, Clone, PartialEq)]
pub struct Margins {
    /// Ambient and cell temperature.
    pub temperature: Celsius,
    /// From full to empty.
    pub rows: Vec<Row>,
    /// What is crossed, from full to empty.
    pub crossings: Vec<Crossing>,
    /// Whether and how the load can stay stalled, with a full and with a nearly empty cell.
    pub start_up: [StartUp; 2],
}

/// What switching on leads to while the load does not run yet.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StartUp {
    /// State of charge.
    pub soc: f64,
    /// Where the stall draw settles if it could not start: voltage at the load and current.
    pub stalled: (Volts, Amps),
    /// The source is too soft: the stall draw holds the load below its start voltage for good.
    pub latches: bool,
    /// At the start voltage the path gives less than the unlit draw with its surge: the load is held there, or falls
    /// back, until the surge has decayed.
    pub held_by_surge: bool,
}

/// The three boards a design may have, everything else as entered.
#[derive(Debug, Clone, Copy)]
pub struct Corners<'a> {
    /// Trips earliest: lowest thresholds, highest resistance of the pair.
    pub low: &'a Setup,
    /// As entered.
    pub typical: &'a Setup,
    /// Trips latest.
    pub high: &'a Setup,
}

/// The place in charge, voltages and temperatures at which something is asked.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Place {
    /// State of charge.
    pub soc: f64,
    /// Temperature of the cell.
    pub cell: Celsius,
    /// Of the board's pair.
    pub switch: Celsius,
    /// Of the second protector's pair.
    pub second: Celsius,
    /// Sum of the branches' voltages.
    pub polarisation: Volts,
}

impl Place {
    /// Rested, everything at `t`.
    pub fn rested(soc: f64, t: Celsius) -> Self {
        Self { soc, cell: t, switch: t, second: t, polarisation: Volts(0.0) }
    }
}

/// The steady draw at which a stage's threshold is just met, by ripple's peaks too; `None` if no current that leaves the
/// protector a supply reaches it.
///
/// - `limit`: a current stage that the setup has in the load's path; anything else gives `None`.
pub fn trip_current(setup: &Setup, at: &Place, limit: Limit) -> Option<Amps> {
    trip_seen(setup, at, limit, setup.load.peak_factor)
}

/// The same where the stages see `peak` times the mean: 1 for a fault, in which nothing ripples.
pub(crate) fn trip_seen(setup: &Setup, at: &Place, limit: Limit, peak: f64) -> Option<Amps> {
    let circuit = Circuit::new(setup);
    let cell = circuit.cell_now(at.soc, at.cell.0);
    trip_in(setup, &circuit, &cell, at, limit, peak)
}

/// The place and the draw at the end of a press that begins rested at `soc` and draws throughout what it draws there.
///
/// - `t`: ambient and cell temperature.
pub fn end_of_press(setup: &Setup, soc: f64, t: Celsius) -> (Place, Option<Steady>) {
    View::new(setup, t).end_of_press(soc)
}

fn trip_in(
    setup: &Setup,
    circuit: &Circuit<'_>,
    cell: &CellNow,
    at: &Place,
    limit: Limit,
    peak: f64,
) -> Option<Amps> {
    let Limit::Stage(protector, index) = limit else { return None };
    let second = setup.second_protector.as_ref();
    let (board, temperature) = match protector {
        Protector::Board => (setup.board_in_path()?, at.switch),
        Protector::Second => (second?, at.second),
    };
    let threshold = match board.stages.get(index)?.threshold {
        Threshold::Current(i) => return Some(Amps(i.0 / peak)),
        Threshold::Sense(v) => v.0,
    };
    if board.sense == SensePoint::Shunt {
        return (board.shunt.0 > 0.0).then(|| Amps(threshold / (peak * board.shunt.0)));
    }
    let e = cell.ocv - at.polarisation.0;
    let pair = |board: &Board, t: Celsius, supply: f64| {
        board.on_resistance.at(supply) * (1.0 + board.alpha_per_k * (t.0 - 25.0)) / f64::from(board.pairs)
    };
    // The supply falls with the current and the resistance rises as it falls, so the sense voltage rises throughout.
    let supply = |i: f64| match (protector, second) {
        (Protector::Second, _) | (Protector::Board, None) => {
            let ahead = if protector == Protector::Board { circuit.ahead } else { 0.0 };
            e - i * (cell.r0 + ahead)
        }
        (Protector::Board, Some(s)) => {
            let terminal = e - i * cell.r0;
            terminal - i * (pair(s, at.second, terminal) + s.shunt.0 + circuit.ahead)
        }
    };
    let excess = |i: f64| peak * i * pair(board, temperature, supply(i)) - threshold;
    let mut high = e.max(0.0) / (cell.r0 + 1e-9);
    if protector == Protector::Board {
        high = e.max(0.0) / (cell.r0 + circuit.ahead + 1e-9);
    }
    if excess(high) <= 0.0 {
        return None;
    }
    let (mut low, mut at_low, mut at_high) = (0.0, -threshold, excess(high));
    let mut side = 0;
    for _ in 0..60 {
        let secant = low - at_low * (high - low) / (at_high - at_low);
        let i = if secant > low && secant < high { secant } else { 0.5 * (low + high) };
        let value = excess(i);
        if value.abs() < 1e-12 || high - low < 1e-10 * high {
            return Some(Amps(i));
        }
        if value > 0.0 {
            (high, at_high) = (i, value);
            if side == 1 {
                at_low *= 0.5;
            }
            side = 1;
        } else {
            (low, at_low) = (i, value);
            if side == -1 {
                at_high *= 0.5;
            }
            side = -1;
        }
    }
    Some(Amps(0.5 * (low + high)))
}

/// Looks at one setup at one temperature.
struct View<'a> {
    setup: &'a Setup,
    circuit: Circuit<'a>,
    t: f64,
}

impl<'a> View<'a> {
    fn new(setup: &'a Setup, t: Celsius) -> Self {
        Self { setup, circuit: Circuit::new(setup), t: t.0 }
    }

    fn factors(&self, at: &Place) -> (f64, f64) {
        (
            self.circuit.board.as_ref().map_or(0.0, |s| s.factor(at.switch.0)),
            self.circuit.second.as_ref().map_or(0.0, |s| s.factor(at.second.0)),
        )
    }

    /// The operating point that a load running at a higher voltage comes down to.
    fn meet(&self, cell: &CellNow, at: &Place, mode: Mode) -> Option<(PathNow, f64)> {
        const PLACES: u32 = 48;
        let e = cell.ocv - at.polarisation.0;
        let factors = self.factors(at);
        let look = |v: f64| {
            let path = self.circuit.path(e, cell.r0, factors, v);
            let (draw, slope) = self.circuit.draw(mode, v);
            (path.current - draw, path, slope)
        };
        // Down from the open circuit to the first place where the path gives what the load takes.
        let (mut over, mut under) = (e, None);
        for k in (1..PLACES).rev() {
            let v = e * f64::from(k) / f64::from(PLACES);
            if look(v).0 >= 0.0 {
                under = Some(v);
                break;
            }
            over = v;
        }
        let mut under = under?;
        let mut v = under;
        for _ in 0..60 {
            let (surplus, path, slope) = look(v);
            if surplus >= 0.0 {
                under = v;
            } else {
                over = v;
            }
            let by = surplus / (path.conductance + slope);
            if by.abs() < 1e-9 {
                return Some((path, v));
            }
            let next = v + by;
            v = if next > under && next < over { next } else { 0.5 * (under + over) };
        }
        Some((look(v).1, v))
    }

    fn steady(&self, cell: &CellNow, at: &Place, mode: Mode) -> Option<Steady> {
        let (path, v) = self.meet(cell, at, mode)?;
        Some(Self::steady_at(cell, at, path, v))
    }

    fn steady_at(cell: &CellNow, at: &Place, path: PathNow, v: f64) -> Steady {
        let e = cell.ocv - at.polarisation.0;
        let current = path.current.max(f64::MIN_POSITIVE);
        Steady {
            current: Amps(path.current),
            load: Volts(v),
            board: Volts(path.board),
            cell: Volts(path.cell),
            pair: Ohms(path.pair),
            switch_temperature: at.switch,
            total: Ohms((e - v) / current),
        }
    }

    /// The end of a press that draws throughout what it draws there.
    fn end_of_press(&self, soc: f64) -> (Place, Option<Steady>) {
        let t = Celsius(self.t);
        let length = self.setup.usage.press.0;
        let c = &self.circuit;
        let settled: [f64; MAX_BRANCHES] = core::array::from_fn(|k| {
            if c.branch_rate[k] > 0.0 { 1.0 - exp(-length * c.branch_rate[k]) } else { 0.0 }
        });
        let ambient = self.t;
        let warmed = |switch: &Option<Switch>, at: Celsius, ohms: f64, i: f64| {
            let rise = switch.as_ref().map_or(0.0, |s| s.rise(ambient, at.0, ohms, i, length));
            // A thermal runaway of the switch is cut off where its law ends.
            Celsius((ambient + rise).min(400.0))
        };
        let mut at = Place::rested(soc, t);
        let mut steady = None;
        let mut before = f64::NAN;
        for _ in 0..30 {
            let cell = c.cell_now(at.soc, self.t);
            let Some((path, v)) = self.meet(&cell, &at, Mode::Lit) else { return (at, None) };
            steady = Some(Self::steady_at(&cell, &at, path, v));
            let i = path.current;
            let was = at;
            at.soc = (soc - i * length / c.charge_as).max(0.0);
            let factor = c.cell_now(at.soc, self.t).branch_factor;
            at.polarisation =
                Volts((0..MAX_BRANCHES).map(|k| i * c.branch_ohm[k] * factor * settled[k]).sum());
            at.switch = warmed(&c.board, was.switch, path.pair, i);
            at.second = warmed(&c.second, was.second, path.second, i);
            // The current alone does not tell: a constant one repeats at once, while the switch is still cold.
            let moved = (at.switch.0 - was.switch.0).abs() + (at.second.0 - was.second.0).abs();
            if (i - before).abs() <= 1e-9 * i.abs() && moved <= 1e-6 {
                break;
            }
            before = i;
        }
        (at, steady)
    }

    fn row(&self, corners: &[View<'_>; 2], soc: f64) -> Row {
        let t = Celsius(self.t);
        let cell = self.circuit.cell_now(soc, self.t);
        let start = Place::rested(soc, t);
        let load = &self.setup.load;
        let unlit = self.steady(&cell, &start, Mode::Unlit);
        let (end, lit) = self.end_of_press(soc);
        let cell_end = self.circuit.cell_now(end.soc, self.t);
        let peak = load.peak_factor;
        let ends = corners.each_ref().map(|view| (view, view.end_of_press(soc)));
        let at_corner = |(view, (end, _)): &(&View<'_>, (Place, Option<Steady>)), limit| {
            let cell = view.circuit.cell_now(end.soc, view.t);
            trip_in(view.setup, &view.circuit, &cell, end, limit, peak)
        };
        let trips = limits(self.setup)
            .map(|limit| Trip {
                limit,
                low: at_corner(&ends[0], limit),
                typical: trip_in(self.setup, &self.circuit, &cell_end, &end, limit, peak),
                high: at_corner(&ends[1], limit),
            })
            .collect();
        let hold_draw = self.circuit.lit_draw(load.hold.0).0;
        Row {
            soc,
            open_circuit: Volts(cell.ocv),
            unlit,
            lit,
            corner_draws: ends.map(|(_, (_, steady))| steady.map(|s| s.current)),
            trips,
            strikes_up_to: Ohms((cell.ocv - load.strike.0) * load.unlit.0 / load.strike.0),
            holds_up_to: Ohms((cell_end.ocv - end.polarisation.0 - load.hold.0) / hold_draw),
        }
    }

    fn start_up(&self, soc: f64) -> StartUp {
        let load = &self.setup.load;
        let cell = self.circuit.cell_now(soc, self.t);
        let at = Place::rested(soc, Celsius(self.t));
        let (stalled, latches) = match self.meet(&cell, &at, Mode::Stalled) {
            Some((path, v)) => ((Volts(v), Amps(path.current)), v < load.start.0),
            None => ((Volts(0.0), Amps(0.0)), true),
        };
        let given = self.circuit.path(cell.ocv, cell.r0, self.factors(&at), load.start.0).current;
        let asked = load.start.0 / load.unlit.0 + load.surge.0;
        StartUp { soc, stalled, latches, held_by_surge: !latches && given < asked }
    }
}

/// The current stages in the load's path, board first.
pub fn limits(setup: &Setup) -> impl Iterator<Item = Limit> + use<> {
    let of = |protector, board: Option<&Board>| {
        (0..board.map_or(0, |b| b.stages.len())).map(move |k| Limit::Stage(protector, k))
    };
    of(Protector::Board, setup.board_in_path()).chain(of(Protector::Second, setup.second_protector.as_ref()))
}

/// How far past an edge a row is; positive when past.
fn past(setup: &Setup, row: &Row, edge: Edge) -> f64 {
    let draw = row.lit.map(|lit| lit.current.0);
    let [low_draw, high_draw] = row.corner_draws.map(|draw| draw.map(|i| i.0));
    let beyond = |draw: Option<f64>, trip: Option<Option<Amps>>| match (draw, trip) {
        (Some(draw), Some(Some(trip))) => draw - trip.0,
        _ => -1.0,
    };
    let find = |limit: Limit| row.trips.iter().find(|trip| trip.limit == limit);
    match edge {
        Edge::Strike => setup.load.strike.0 - row.unlit.map_or(0.0, |s| s.load.0),
        Edge::Hold => setup.load.hold.0 - row.lit.map_or(0.0, |s| s.load.0),
        Edge::TripEarliest(limit) => beyond(low_draw, find(limit).map(|t| t.low)),
        Edge::TripTypical(limit) => beyond(draw, find(limit).map(|t| t.typical)),
        Edge::TripLatest(limit) => beyond(high_draw, find(limit).map(|t| t.high)),
        Edge::OverDischarge(protector) => {
            let (board, supply) = match protector {
                Protector::Board => (setup.board_in_path(), row.lit.map(|s| s.board)),
                Protector::Second => (setup.second_protector.as_ref(), row.lit.map(|s| s.cell)),
            };
            match (board.and_then(|b| b.over_discharge), supply) {
                (Some(limit), Some(supply)) => limit.threshold.0 - supply.0,
                _ => -1.0,
            }
        }
    }
}

/// The margins over the charge at one temperature.
///
/// - `at`: ambient and cell temperature.
/// - `points`: number of rows, 2 or more.
pub fn margins(corners: Corners<'_>, at: Celsius, points: usize) -> Margins {
    let view = View::new(corners.typical, at);
    let others = [View::new(corners.low, at), View::new(corners.high, at)];
    let points = points.max(2);
    let rows: Vec<Row> =
        (0..points).map(|k| view.row(&others, 1.0 - k as f64 / (points - 1) as f64)).collect();
    let mut edges = vec![Edge::Strike, Edge::Hold];
    for limit in limits(corners.typical) {
        edges.extend([Edge::TripEarliest(limit), Edge::TripTypical(limit), Edge::TripLatest(limit)]);
    }
    edges.extend([Edge::OverDischarge(Protector::Board), Edge::OverDischarge(Protector::Second)]);
    let mut crossings = Vec::new();
    for edge in edges {
        let is_past = |row: &Row| past(corners.typical, row, edge) > 0.0;
        let Some(first) = rows.iter().position(is_past) else { continue };
        if first == 0 {
            crossings.push(Crossing { edge, soc: 1.0 });
            continue;
        }
        let (mut full, mut empty) = (rows[first - 1].soc, rows[first].soc);
        while full - empty > 1e-4 {
            let soc = 0.5 * (full + empty);
            if is_past(&view.row(&others, soc)) { empty = soc } else { full = soc }
        }
        crossings.push(Crossing { edge, soc: 0.5 * (full + empty) });
    }
    crossings.sort_by(|a, b| b.soc.total_cmp(&a.soc));
    Margins { temperature: at, rows, crossings, start_up: [view.start_up(1.0), view.start_up(0.1)] }
}

/// What a press does.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Outcome {
    /// A full press.
    Holds,
    /// Lit, then below the hold voltage.
    SagsOut,
    /// Runs, but the strike voltage is not reached or not kept.
    DoesNotStrike,
    /// A protector opens.
    Trips(Limit),
    /// The load does not start.
    Stalls,
    /// The cell is empty before the press ends.
    Empty,
    /// Not followed to its end.
    WorkLimit,
}

impl From<Option<NotFull>> for Outcome {
    fn from(not_full: Option<NotFull>) -> Self {
        match not_full {
            None => Self::Holds,
            Some(NotFull::SagBelowHold | NotFull::NoOperatingPoint) => Self::SagsOut,
            Some(NotFull::StrikeVoltageNotReached | NotFull::StrikeTimeNotCompleted) => Self::DoesNotStrike,
            Some(NotFull::NotStarted) => Self::Stalls,
            Some(NotFull::Opened(limit)) => Self::Trips(limit),
            Some(NotFull::CellEmpty) => Self::Empty,
            Some(NotFull::EventLimit) => Self::WorkLimit,
        }
    }
}

/// What a press does over state of charge and temperature; every place is a simulated press from a rested cell, the
/// surroundings as warm as the cell.
#[derive(Debug, Clone, PartialEq)]
pub struct Map {
    /// States of charge.
    pub socs: Vec<f64>,
    /// Temperatures.
    pub temperatures: Vec<Celsius>,
    /// Outcomes: for each temperature all states of charge.
    pub outcomes: Vec<Vec<Outcome>>,
}

/// Bound on the events of one press of the map: an arc that never lights may be on the edge of it for long.
const MAP_EVENTS: u32 = 40;

/// The map of outcomes.
pub fn map(setup: &Setup, socs: &[f64], temperatures: &[Celsius]) -> Map {
    let mut there = setup.clone();
    let outcomes = temperatures
        .iter()
        .map(|t| {
            there.usage.ambient = *t;
            socs.iter().map(|soc| outcome(&there, *soc)).collect()
        })
        .collect();
    Map { socs: socs.to_vec(), temperatures: temperatures.to_vec(), outcomes }
}

/// What one press does from a rested cell at the setup's own ambient temperature. A press that flickers counts as one
/// that sags.
pub fn outcome(setup: &Setup, soc: f64) -> Outcome {
    let options = PressOptions { max_events: MAP_EVENTS, until_drop: true, ..PressOptions::default() };
    let start = PressStart::relaxed(setup, soc, setup.usage.ambient);
    let summary = press::run(setup, &start, &options).summary;
    match summary.not_full {
        Some(NotFull::EventLimit) if summary.drops > 0 => Outcome::SagsOut,
        Some(NotFull::EventLimit) if summary.start.is_some() => Outcome::DoesNotStrike,
        not_full => Outcome::from(not_full),
    }
}

/// Length of a press that is long enough for every stage of a setup to open, and no shorter than `least`.
pub fn longest_delay(setup: &Setup, least: Seconds) -> Seconds {
    let boards = [setup.board_in_path(), setup.second_protector.as_ref()];
    let delays = boards.into_iter().flatten().flat_map(|b| b.stages.iter().map(|s| s.delay.0));
    Seconds(delays.fold(least.0, f64::max))
}
