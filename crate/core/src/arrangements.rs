//! The four arrangements side by side: what still opens, and what happens where nothing does.
//!
//! For one design and each way to wire its load: the layers against over-current, short circuit, over-discharge,
//! over-charge and charge over-current with their figures; the prospective short-circuit current and what it
//! heats; what a held button does after the last strike; how long the standby draw takes. A comparison of
//! figures, never advice.
//!
//! Left out: what a pair does at a gate voltage below the points of its curve, the inductance of a short, and a
//! charger that feeds it.

use crate::board::{Board, SensePoint, Stage, Threshold};
use crate::cell::MAX_BRANCHES;
use crate::circuit::{Circuit, PathNow};
use crate::margins::Corners;
use crate::math::exp;
use crate::press::PressStart;
use crate::ratings::{Band, Fuse, FuseKind, LeadRating, OverCharge, Ratings};
use crate::report::{ChargeReport, PressSummary, Protector};
use crate::setup::{Arrangement, Setup};
use crate::time_current;
use crate::units::{Amps, Celsius, Seconds, Volts, Watts};
use crate::wiring::{adiabatic_k, copper_factor, time_to_limit};

/// The four arrangements, in the order in which they are shown.
pub const ALL: [Arrangement; 4] =
    [Arrangement::ThroughBoard, Arrangement::LoadAtCell, Arrangement::SwitchBridged, Arrangement::NoBoard];

/// Volumetric heat capacity of copper at 20 °C, in J/(K·mm³).
///
/// Source: IEC 60364-5-54, annex A.
pub const COPPER_HEAT: f64 = 3.45e-3;

/// What the comparison starts from.
#[derive(Debug, Clone, Copy)]
pub struct Given<'a> {
    /// The nominal parts as they are wired, and their protectors at both ends of the tolerances.
    pub corners: Corners<'a>,
    /// The charge of the nominal parts.
    pub charge: &'a ChargeReport,
    /// Ratings and what surrounds the parts.
    pub ratings: &'a Ratings,
}

/// What opens.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum By {
    /// A current stage, by its place in the protector's list.
    Stage(Protector, usize),
    /// Over-discharge detection.
    OverDischarge(Protector),
    /// Over-charge detection.
    OverCharge(Protector),
    /// Charge over-current detection.
    ChargeOverCurrent(Protector),
    /// Fuse or PTC.
    Fuse,
}

/// One layer of protection with its figures for this design.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Layer {
    /// What opens.
    pub by: By,
    /// Its threshold as entered, in V or A; `None` for a fuse.
    pub threshold: Option<Band>,
    /// Current in the path from which it opens, in A, relaxed at ambient temperature, full cell; peak factor
    /// included for a stage.
    pub full: Option<Band>,
    /// The same with an empty cell.
    pub empty: Option<Band>,
    /// Time it takes, in s; of a fuse under short circuit, at the prospective current.
    pub delay: Option<Band>,
}

/// A short circuit at the load's terminals, at its first instant: nothing warm, nothing opened.
#[derive(Debug, Clone, PartialEq)]
pub struct ShortCircuit {
    /// Prospective current.
    pub current: Amps,
    /// The board's supply meanwhile.
    pub board: Volts,
    /// Heat in the cells.
    pub cell: Watts,
    /// Warming of the cells, in K/s, `I²·R₀/C_th`.
    pub cell_k_per_s: f64,
    /// Heat in the second protector, shunt included.
    pub second: Watts,
    /// Heat in everything ahead of the board.
    pub ahead: Watts,
    /// Heat in the board's switches and shunt.
    pub pair: Watts,
    /// Heat in everything after the board.
    pub after: Watts,
    /// The leads, in the order of the ratings.
    pub leads: Vec<LeadInShort>,
}

/// A lead that carries a short circuit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LeadInShort {
    /// `true` from cell to board, `false` from board to load.
    pub cell_side: bool,
    /// Warming at its initial temperature without cooling, in K/s.
    pub k_per_s: f64,
    /// Until its insulation's limit, without cooling.
    pub limit: Seconds,
}

/// The button held from the end of the charge on. Where neither `to_empty` nor `opened` is told, nothing is drawn, or the
/// bound on steps was reached.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Held {
    /// Draw when it begins.
    pub draw: Amps,
    /// Until the cell's terminals are at 3.0 V; `None`: never, because something opens before.
    pub to_3_0: Option<Seconds>,
    /// Until 2.5 V.
    pub to_2_5: Option<Seconds>,
    /// Until 2.0 V.
    pub to_2_0: Option<Seconds>,
    /// Until the model's cell is empty. Below that a real cell has hardly any charge: what the model has not reached by
    /// then, voltage or over-discharge detection, is given this time.
    pub to_empty: Option<Seconds>,
    /// Which over-discharge detection opens, and when.
    pub opened: Option<(Protector, Seconds)>,
}

/// One arrangement.
#[derive(Debug, Clone, PartialEq)]
pub struct Arranged {
    /// Which.
    pub arrangement: Arrangement,
    /// What opens on a current above the load's; none: empty.
    pub over_current: Vec<Layer>,
    /// What opens on a short circuit at the load for certain, with an empty cell too.
    pub short_circuit: Vec<Layer>,
    /// What ends the discharge by the load.
    pub over_discharge: Vec<Layer>,
    /// What ends a charge if the charger does not.
    pub over_charge: Vec<Layer>,
    /// What opens on too much charge current.
    pub charge_over_current: Vec<Layer>,
    /// Short circuit with a full cell.
    pub short_full: ShortCircuit,
    /// Short circuit with an empty cell.
    pub short_empty: ShortCircuit,
    /// The button held after the last press of the charge.
    pub held: Held,
    /// Standby from the recharge mark until the cell is empty; `None` without a standby draw.
    pub standby: Option<Seconds>,
}

/// All four arrangements of one design.
pub fn compare(given: &Given<'_>) -> [Arranged; 4] {
    ALL.map(|arrangement| arranged(given, arrangement))
}

/// One arrangement of a design.
pub fn arranged(given: &Given<'_>, arrangement: Arrangement) -> Arranged {
    let Corners { low, typical, high } = given.corners;
    let [low, setup, high] = [low, typical, high].map(|setup| wired(setup, arrangement));
    let ambient = setup.usage.ambient;
    let leads = &given.ratings.leads;
    let (full, empty) =
        (PressStart::relaxed(&setup, 1.0, ambient), PressStart::relaxed(&setup, 0.0, ambient));
    let (short_full, short_empty) =
        (short_circuit(&setup, &full, leads), short_circuit(&setup, &empty, leads));
    let mut over_current = Vec::new();
    let mut short = Vec::new();
    let mut over_discharge = Vec::new();
    for protector in [Protector::Board, Protector::Second] {
        let setups = [&low, &setup, &high];
        let [Some(early), Some(nominal), Some(late)] = setups.map(|setup| in_path(setup, protector)) else {
            continue;
        };
        let trio = [early, nominal, late];
        let three = [(&low, early), (&setup, nominal), (&high, late)];
        for index in 0..trio[1].stages.len() {
            let at = |start: &PressStart| {
                let [low, mid, high] = three.map(|(setup, board)| {
                    board.stages.get(index).map_or(f64::INFINITY, |stage| {
                        trip_needed(setup, protector, stage, start, setup.load.peak_factor).0
                    })
                });
                Band { low, typical: mid, high }
            };
            let figure = |of: fn(&Stage) -> f64| {
                let [low, mid, high] = trio.map(|board| board.stages.get(index).map_or(f64::INFINITY, of));
                Band { low, typical: mid, high }
            };
            let layer = Layer {
                by: By::Stage(protector, index),
                threshold: Some(figure(|stage| match stage.threshold {
                    Threshold::Sense(v) => v.0,
                    Threshold::Current(i) => i.0,
                })),
                full: Some(at(&full)),
                empty: Some(at(&empty)),
                delay: Some(figure(|stage| stage.delay.0)),
            };
            over_current.push(layer);
            if [&full, &empty].into_iter().all(|start| stage_sees_short(&high, protector, index, start)) {
                short.push(layer);
            }
        }
        if trio.iter().all(|board| board.over_discharge.is_some()) {
            let figure = |of: fn(&crate::board::OverDischarge) -> f64| {
                trio.map(|board| board.over_discharge.as_ref().map_or(0.0, of))
            };
            let (threshold, delay) = (figure(|od| od.threshold.0), figure(|od| od.delay.0));
            over_discharge.push(Layer {
                by: By::OverDischarge(protector),
                threshold: Some(band_of(threshold)),
                full: None,
                empty: None,
                delay: Some(band_of(delay)),
            });
        }
    }
    if let Some(fuse) = &given.ratings.fuse {
        let band = fuse_band(fuse, ambient);
        let layer = Layer { by: By::Fuse, threshold: None, full: Some(band), empty: Some(band), delay: None };
        over_current.push(layer);
        let (soonest, latest) =
            (fuse_time(fuse, short_full.current, ambient), fuse_time(fuse, short_empty.current, ambient));
        if let (Some(low), Some(high)) = (soonest.earliest, latest.latest) {
            let typical = (low.0 * high.0).sqrt();
            short.push(Layer { delay: Some(Band { low: low.0, typical, high: high.0 }), ..layer });
        }
    }
    Arranged {
        arrangement,
        over_current,
        short_circuit: short,
        over_discharge,
        over_charge: charge_layers(given, arrangement, By::OverCharge, |o| Some(o.threshold)),
        charge_over_current: charge_layers(given, arrangement, By::ChargeOverCurrent, |o| o.charge_sense),
        short_full,
        short_empty,
        held: given.charge.presses.last().map_or_else(Held::default, |p| held(&setup, &after(&p.summary))),
        standby: standby(given),
    }
}

/// The same design, its load wired as `arrangement` says.
pub fn wired(setup: &Setup, arrangement: Arrangement) -> Setup {
    Setup { arrangement, ..setup.clone() }
}

/// A protector, where it stands in the load's path.
pub fn in_path(setup: &Setup, protector: Protector) -> Option<&Board> {
    match protector {
        Protector::Board => setup.board_in_path(),
        Protector::Second => setup.second_protector.as_ref(),
    }
}

fn band_of([a, typical, b]: [f64; 3]) -> Band {
    Band { low: a.min(b), typical, high: a.max(b) }
}

/// Over-charge layers: the charger stays behind the board where the load is taken at the cell; a bridged or
/// absent board can open nothing.
fn charge_layers(
    given: &Given<'_>,
    arrangement: Arrangement,
    by: fn(Protector) -> By,
    of: fn(&OverCharge) -> Option<Band>,
) -> Vec<Layer> {
    let setup = given.corners.typical;
    let board = match arrangement {
        Arrangement::ThroughBoard | Arrangement::LoadAtCell => {
            setup.board.as_ref().zip(given.ratings.board_over_charge.as_ref())
        }
        Arrangement::SwitchBridged | Arrangement::NoBoard => None,
    };
    let second = setup.second_protector.as_ref().zip(given.ratings.second_over_charge.as_ref());
    let mut layers = Vec::new();
    for (protector, pair) in [(Protector::Board, board), (Protector::Second, second)] {
        let Some((board, over_charge)) = pair else { continue };
        let Some(threshold) = of(over_charge) else { continue };
        let by = by(protector);
        // Charging, the current is measured over the same pair, at about the cell's own voltage.
        let current = |soc: f64| {
            let supply = setup.cell.open_circuit(soc, setup.usage.ambient);
            let r = sense_ohm(board, supply.0, setup.usage.ambient);
            Band { low: threshold.low / r, typical: threshold.typical / r, high: threshold.high / r }
        };
        let currents = matches!(by, By::ChargeOverCurrent(_));
        layers.push(Layer {
            by,
            threshold: Some(threshold),
            full: currents.then(|| current(1.0)),
            empty: currents.then(|| current(0.0)),
            delay: None,
        });
    }
    layers
}

/// All pairs together, without shunt.
fn pair_ohm(board: &Board, supply: f64, t: Celsius) -> f64 {
    (1.0 + board.alpha_per_k * (t.0 - 25.0)) * board.on_resistance.at(supply) / f64::from(board.pairs)
}

/// What the sense voltage stands over.
fn sense_ohm(board: &Board, supply: f64, t: Celsius) -> f64 {
    match board.sense {
        SensePoint::Pair => pair_ohm(board, supply, t),
        SensePoint::Shunt => board.shunt.0,
    }
}

/// Inner voltage and `R₀` of the cell where a press begins.
fn inner(setup: &Setup, start: &PressStart) -> (f64, f64) {
    let polar = start.branches.iter().fold(0.0, |sum, v| sum + v.0);
    let t = start.cell_temperature;
    (setup.cell.open_circuit(start.soc, t).0 - polar, setup.cell.r0_at(start.soc, t).0)
}

/// Supplies of the board and of the second protector at a current in the path.
fn supplies(setup: &Setup, start: &PressStart, current: f64) -> (f64, f64) {
    let (e, r0) = inner(setup, start);
    let cell = e - current * r0;
    let second = setup
        .second_protector
        .as_ref()
        .map_or(0.0, |s| pair_ohm(s, cell, start.second_temperature) + s.shunt.0);
    (cell - current * (second + setup.path.ahead.0), cell)
}

/// The steady current in the path that a stage needs to be exceeded, whether or not the path can give it.
///
/// Where it can, this is [`crate::margins::trip_current`].
///
/// - `protector`: whose stage it is; it is in the path of `setup`.
/// - `start`: state of the cell and temperatures of the switches.
/// - `peak_factor`: of the load's draw; 1 for a steady current.
///
/// `k·I·R_pair(V_board(I)) = V_sense`: the left side rises with I, because the on-resistance never rises with the
/// supply. Infinite where the sense resistance is 0.
pub fn trip_needed(
    setup: &Setup,
    protector: Protector,
    stage: &Stage,
    start: &PressStart,
    peak_factor: f64,
) -> Amps {
    let (board, t) = match protector {
        Protector::Board => (setup.board.as_ref(), start.switch_temperature),
        Protector::Second => (setup.second_protector.as_ref(), start.second_temperature),
    };
    let threshold = match stage.threshold {
        Threshold::Current(i) => return i / peak_factor,
        Threshold::Sense(v) => v.0 / peak_factor,
    };
    let Some(board) = board else { return Amps(f64::INFINITY) };
    let sensed = |current: f64| {
        let (ahead, cell) = supplies(setup, start, current);
        let supply = if protector == Protector::Board { ahead } else { cell };
        current * sense_ohm(board, supply, t)
    };
    // The highest supply has the lowest resistance, hence the highest current.
    let least = sense_ohm(board, f64::MAX, t);
    if least <= 0.0 {
        return Amps(f64::INFINITY);
    }
    let (mut low, mut high) = (0.0, threshold / least);
    if sensed(high) <= threshold {
        return Amps(high);
    }
    for _ in 0..100 {
        let middle = 0.5 * (low + high);
        if sensed(middle) > threshold {
            high = middle;
        } else {
            low = middle;
        }
    }
    Amps(high)
}

/// Whether a stage is exceeded by a short circuit at the load.
fn stage_sees_short(setup: &Setup, protector: Protector, index: usize, start: &PressStart) -> bool {
    let Some(stage) = in_path(setup, protector).and_then(|b| b.stages.get(index)) else { return false };
    shorted(setup, start).current > trip_needed(setup, protector, stage, start, 1.0).0
}

/// Whether anything electronic opens on a short circuit at the load: a current stage, or over-discharge detection
/// because the supply breaks down. The latest delay comes with it.
///
/// - `setup`: with the protectors at their late corner, wired as asked.
pub fn opens_on_short(setup: &Setup, start: &PressStart) -> Option<(By, Seconds)> {
    let short = shorted(setup, start);
    let mut first: Option<(By, Seconds)> = None;
    let boards =
        [(Protector::Board, setup.board_in_path()), (Protector::Second, setup.second_protector.as_ref())];
    for (protector, board) in boards {
        let Some(board) = board else { continue };
        let supply = if protector == Protector::Board { short.board } else { short.cell };
        let stages = (0..board.stages.len())
            .filter(|k| stage_sees_short(setup, protector, *k, start))
            .map(|k| (By::Stage(protector, k), board.stages[k].delay));
        let low = board
            .over_discharge
            .iter()
            .filter(|od| supply < od.threshold.0)
            .map(|od| (By::OverDischarge(protector), od.delay));
        for (by, delay) in stages.chain(low) {
            if first.is_none_or(|(_, before)| delay < before) {
                first = Some((by, delay));
            }
        }
    }
    first
}

fn factors(setup: &Setup, start: &PressStart) -> (f64, f64) {
    let factor = |board: Option<&Board>, t: Celsius| {
        board.map_or(1.0, |b| (1.0 + b.alpha_per_k * (t.0 - 25.0)) / f64::from(b.pairs))
    };
    (
        factor(setup.board_in_path(), start.switch_temperature),
        factor(setup.second_protector.as_ref(), start.second_temperature),
    )
}

fn shorted(setup: &Setup, start: &PressStart) -> PathNow {
    let (e, r0) = inner(setup, start);
    Circuit::new(setup).path(e, r0, factors(setup, start), 0.0)
}

/// A short circuit at the load's terminals.
///
/// - `start`: state of the cell and temperatures of the switches.
///
/// `I = U_E/R_total`, the total resistance that of the path and the cell's `R₀` (the slow branches come later).
pub fn short_circuit(setup: &Setup, start: &PressStart, leads: &[LeadRating]) -> ShortCircuit {
    let (_, r0) = inner(setup, start);
    let now = shorted(setup, start);
    let current = Amps(now.current);
    let i2 = now.current * now.current;
    let second_shunt = setup.second_protector.as_ref().map_or(0.0, |b| b.shunt.0);
    let shunt = setup.board_in_path().map_or(0.0, |b| b.shunt.0);
    ShortCircuit {
        current,
        board: Volts(now.board),
        cell: Watts(i2 * r0),
        cell_k_per_s: i2 * r0 / setup.cell.heat_capacity_j_per_k,
        second: Watts(i2 * (now.second + second_shunt)),
        ahead: Watts(i2 * setup.path.ahead.0),
        pair: Watts(i2 * (now.pair + shunt)),
        after: Watts(i2 * setup.path.after.0),
        leads: leads.iter().map(|lead| lead_in_short(lead, current)).collect(),
    }
}

/// A lead at a current, without cooling.
///
/// `dT/dt = I²·R'(θ_i)/(Q_c·S)`, `t = k²S²/I²`
///
/// Source: IEC 60364-4-43, 434.5.2; Q_c from IEC 60364-5-54, annex A.
pub fn lead_in_short(lead: &LeadRating, current: Amps) -> LeadInShort {
    let ohm_per_m = lead.ohm_per_m_20 * copper_factor(lead.initial);
    let j_per_k_m = COPPER_HEAT * lead.area_mm2 * 1e3;
    LeadInShort {
        cell_side: lead.cell_side,
        k_per_s: current.0 * current.0 * ohm_per_m / j_per_k_m,
        limit: time_to_limit(adiabatic_k(lead.initial, lead.last), lead.area_mm2, current),
    }
}

/// When a fuse opens: not before, and at the latest. `None`: not within what is known.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FuseTime {
    /// Not before.
    pub earliest: Option<Seconds>,
    /// For certain by then.
    pub latest: Option<Seconds>,
}

/// Derating of a PTC's currents against 23 °C.
///
/// Points of makers' charts for radial polymer types, from memory; straight lines between.
fn ptc_derating(t: Celsius) -> f64 {
    const POINTS: [(f64, f64); 5] = [(0.0, 1.15), (23.0, 1.0), (40.0, 0.87), (60.0, 0.72), (85.0, 0.45)];
    let above = POINTS.partition_point(|(x, _)| *x <= t.0).clamp(1, POINTS.len() - 1);
    let ((x0, y0), (x1, y1)) = (POINTS[above - 1], POINTS[above]);
    (y0 + (t.0 - x0) / (x1 - x0) * (y1 - y0)).max(0.1)
}

/// Current from which a fuse may open, in A, and from which it must; in the middle neither is known.
///
/// - `ambient`: only a PTC depends on it.
pub fn fuse_band(fuse: &Fuse, ambient: Celsius) -> Band {
    let between = |low: f64, high: f64| Band { low, typical: 0.5 * (low + high), high };
    match &fuse.kind {
        FuseKind::Quick | FuseKind::TimeLag => between(1.5 * fuse.rating.0, 2.1 * fuse.rating.0),
        FuseKind::MeltingI2t(_) => Band::exact(fuse.rating.0),
        FuseKind::Ptc { trip, .. } => {
            let derated = ptc_derating(ambient);
            between(derated * fuse.rating.0, derated * trip.0)
        }
    }
}

/// When a fuse opens at a steady current.
///
/// The times are those of [`time_current::fuse_times`]; a PTC that is warmer than 23 °C opens as at a current that is
/// larger by its derating.
pub fn fuse_time(fuse: &Fuse, current: Amps, ambient: Celsius) -> FuseTime {
    let current = match fuse.kind {
        FuseKind::Ptc { .. } => current / ptc_derating(ambient),
        FuseKind::Quick | FuseKind::TimeLag | FuseKind::MeltingI2t(_) => current,
    };
    let (earliest, latest) = time_current::fuse_times(fuse, current);
    FuseTime { earliest, latest }
}

/// Where the state stands after a press.
pub fn after(press: &PressSummary) -> PressStart {
    PressStart {
        soc: press.soc_end,
        cell_temperature: press.cell_temperature_end,
        switch_temperature: press.switch_temperature_end,
        second_temperature: press.second_temperature_end,
        branches: press.branches_end,
    }
}

/// Standby from the recharge mark to empty; from the end of the charge where no press was full.
fn standby(given: &Given<'_>) -> Option<Seconds> {
    let draw = given.corners.typical.usage.standby.0;
    if draw <= 0.0 {
        return None;
    }
    let full = given.charge.presses.iter().rev().find(|p| p.summary.not_full.is_none());
    let soc = full.map_or(given.charge.soc_left, |p| p.summary.soc_end);
    Some(Seconds(soc * given.corners.typical.cell.charge_as() / draw))
}

/// The largest part of the charge that one step of a held button takes.
const HELD_PIECE: f64 = 2e-3;
/// The first step of a held button, and by how much the next may be longer.
const HELD_FIRST_S: f64 = 0.05;
const HELD_GROWS: f64 = 1.25;
/// State of charge that counts as empty.
const HELD_EMPTY: f64 = 1e-7;
/// By how much the current may change in a step longer than the first.
const HELD_CHANGE: f64 = 0.02;
/// Bound on steps: a charge takes about 600.
const HELD_STEPS: u32 = 3000;

/// The button held from `start` on, the arc not striking again: the load draws what it draws unlit or stalled, as it
/// comes up from switching on (a load that cannot start stays stalled, which may be the heavier draw), until an
/// over-discharge detection in the path opens or the cell is empty.
///
/// - `setup`: wired as asked; its press length is not used.
///
/// The current is constant within a step and taken at its middle; branches and temperatures are exponentials then.
/// An arc that flickers empties the cell sooner.
pub fn held(setup: &Setup, start: &PressStart) -> Held {
    let circuit = Circuit::new(setup);
    let drain = Drain { setup, circuit, runs: core::cell::Cell::new(false) };

    let mut state = start.clone();
    let mut t = 0.0;
    let mut h = HELD_FIRST_S;
    let mut since: [Option<f64>; 2] = [None, None];
    let first = drain.now(&state);
    let mut result = Held { draw: Amps(first.current), ..Held::default() };
    let levels = [3.0, 2.5, 2.0];
    let mut reached: [Option<f64>; 3] = levels.map(|v| (first.cell < v).then_some(0.0));
    let limits = [
        (Protector::Board, setup.board_in_path().and_then(|b| b.over_discharge)),
        (Protector::Second, setup.second_protector.as_ref().and_then(|b| b.over_discharge)),
    ];
    let supply = |path: &PathNow, k: usize| if k == 0 { path.board } else { path.cell };
    for (k, (_, limit)) in limits.iter().enumerate() {
        if limit.is_some_and(|od| supply(&first, k) < od.threshold.0) {
            since[k] = Some(0.0);
        }
    }
    for _ in 0..HELD_STEPS {
        let (now, runs) = drain.now_and_runs(&state);
        drain.runs.set(runs);
        if now.current <= 0.0 || state.soc <= 0.0 {
            break;
        }
        let charge = setup.cell.charge_as();
        let left = state.soc * charge / now.current;
        h = h.min(HELD_PIECE * charge / now.current).min(left);
        let to = drain.step(&state, &now, h);
        // A step that was to take all of it may leave a little, which the next one takes.
        let empties = to.soc <= HELD_EMPTY;
        let then = drain.now(&to);
        // A jump or a quick change is followed by short steps.
        if (then.current - now.current).abs() > HELD_CHANGE * now.current && h > HELD_FIRST_S {
            h = (0.5 * h).max(HELD_FIRST_S);
            continue;
        }
        let pass = |reads: &dyn Fn(&PathNow) -> f64, level: f64| {
            let (mut a, mut b) = (0.0, h);
            for _ in 0..40 {
                let m = 0.5 * (a + b);
                if reads(&drain.now(&drain.step(&state, &now, m))) < level {
                    b = m;
                } else {
                    a = m;
                }
            }
            t + b
        };
        let mut opens: Option<(Protector, f64)> = None;
        for (k, (protector, limit)) in limits.iter().enumerate() {
            let Some(od) = limit else { continue };
            if supply(&then, k) < od.threshold.0 {
                let from = *since[k].get_or_insert_with(|| pass(&|p| supply(p, k), od.threshold.0));
                let at = from + od.delay.0;
                if at <= t + h && opens.is_none_or(|(_, before)| at < before) {
                    opens = Some((*protector, at));
                }
            } else {
                since[k] = None;
            }
        }
        for (k, level) in levels.iter().enumerate() {
            if reached[k].is_none() && then.cell < *level {
                let at = pass(&|p| p.cell, *level);
                if opens.is_none_or(|(_, opened)| at <= opened) {
                    reached[k] = Some(at);
                }
            }
        }
        t += h;
        if let Some((protector, at)) = opens {
            result.opened = Some((protector, Seconds(at)));
            break;
        }
        if empties {
            result.to_empty = Some(Seconds(t));
            // What is left of the voltage goes at once, through every level and threshold below it.
            let detects = limits.iter().filter_map(|(protector, limit)| limit.map(|od| (*protector, od)));
            let first = detects.reduce(|a, b| if b.1.threshold > a.1.threshold { b } else { a });
            let down_to = first.map_or(0.0, |(_, od)| od.threshold.0);
            for (reached, level) in reached.iter_mut().zip(levels) {
                if reached.is_none() && level >= down_to {
                    *reached = Some(t);
                }
            }
            result.opened = first.map(|(protector, od)| (protector, Seconds(t + od.delay.0)));
            break;
        }
        state = to;
        h *= HELD_GROWS;
    }
    [result.to_3_0, result.to_2_5, result.to_2_0] = reached.map(|at| at.map(Seconds));
    result
}

/// A load that is held on without an arc.
struct Drain<'a> {
    setup: &'a Setup,
    circuit: Circuit<'a>,
    /// Whether the load ran at the beginning of the step.
    runs: core::cell::Cell<bool>,
}

impl Drain<'_> {
    /// Path and draw in a state; a load that runs goes on while it can, one that does not run starts only once its
    /// stall draw lets the voltage up to the start voltage.
    fn now(&self, state: &PressStart) -> PathNow {
        self.now_and_runs(state).0
    }

    fn now_and_runs(&self, state: &PressStart) -> (PathNow, bool) {
        let (e, r0) = inner(self.setup, state);
        let factors = factors(self.setup, state);
        let start = self.setup.load.start.0;
        let runs = self.on_resistance(e, r0, factors, self.setup.load.unlit.0);
        if self.runs.get() && runs.1 >= start {
            return (runs.0, true);
        }
        let stalled = self.on_resistance(e, r0, factors, self.circuit.stall_ohm);
        if stalled.1 < start {
            return (stalled.0, false);
        }
        // Held at the start voltage, where it cannot go on running.
        if runs.1 >= start { (runs.0, true) } else { (self.circuit.path(e, r0, factors, start), false) }
    }

    /// Path and load voltage with a resistance as load: bracketed Newton on `I(V) = V/R`.
    fn on_resistance(&self, e: f64, r0: f64, factors: (f64, f64), ohm: f64) -> (PathNow, f64) {
        let (mut low, mut high) = (0.0, e.max(0.0));
        let mut v = high;
        let mut now = self.circuit.path(e, r0, factors, v);
        for _ in 0..60 {
            let miss = now.current - v / ohm;
            if miss > 0.0 {
                low = v;
            } else {
                high = v;
            }
            let mut next = v + miss / (now.conductance + 1.0 / ohm);
            if !(next > low && next < high) {
                next = 0.5 * (low + high);
            }
            let moved = (next - v).abs();
            v = next;
            now = self.circuit.path(e, r0, factors, v);
            if moved <= 1e-11 {
                break;
            }
        }
        (now, v)
    }

    /// The state a time `h` later, with the current that the middle of the step has.
    ///
    /// That current is solved for: a load held at its start voltage takes what the path gives, and a step that
    /// guessed it would have to be short against the cell's branches. More current leaves a lower voltage and so
    /// less current in the middle, hence one root.
    fn step(&self, state: &PressStart, now: &PathNow, h: f64) -> PressStart {
        let middle = |path: &PathNow| {
            let half = self.move_on(state, path, state, 0.5 * h);
            let there = self.now(&half);
            (half, there)
        };
        let mut path = *now;
        let (mut half, mut there) = middle(&path);
        let (mut low, mut high) = (0.0, f64::INFINITY);
        // The current before and what was missing with it.
        let mut before: Option<(f64, f64)> = None;
        for _ in 0..60 {
            let (i, miss) = (path.current, there.current - path.current);
            if miss.abs() <= 1e-7 * i.abs() {
                break;
            }
            if miss > 0.0 {
                low = i;
            } else {
                high = i;
            }
            let secant = before.map_or(there.current, |(j, last)| i - miss * (i - j) / (miss - last));
            let next = if secant > low && secant < high {
                secant
            } else if high.is_finite() {
                0.5 * (low + high)
            } else {
                there.current
            };
            before = Some((i, miss));
            path = PathNow { current: next, ..there };
            (half, there) = middle(&path);
        }
        self.move_on(state, &PathNow { current: path.current, ..there }, &half, h)
    }

    /// From `from` on for `h` with the path and the parameters of `at`.
    fn move_on(&self, from: &PressStart, path: &PathNow, at: &PressStart, h: f64) -> PressStart {
        let cell = &self.setup.cell;
        let ambient = self.setup.usage.ambient.0;
        let i = path.current;
        let mut to = from.clone();
        to.soc = (from.soc - i * h / cell.charge_as()).max(0.0);
        for (k, branch) in cell.branches.iter().take(MAX_BRANCHES).enumerate() {
            let settled = i * cell.branch_at(k, at.soc, at.cell_temperature).0;
            to.branches[k].0 = settled + (from.branches[k].0 - settled) * exp(-h / branch.time_constant.0);
        }
        let kelvin = at.cell_temperature.kelvin();
        let heat = i * (cell.open_circuit(at.soc, at.cell_temperature).0 - path.cell)
            - i * kelvin * cell.entropy.at(at.soc);
        to.cell_temperature = Celsius(towards(
            from.cell_temperature.0,
            ambient,
            heat,
            (cell.cooling_w_per_k, cell.heat_capacity_j_per_k),
            h,
        ));
        let warm = |board: Option<&Board>, t: Celsius, ohm: f64| {
            board.map_or(t, |b| {
                let settled = ambient + i * i * ohm * b.thermal_k_per_w;
                Celsius(settled + (t.0 - settled) * exp(-h / b.thermal_time.0))
            })
        };
        to.switch_temperature = warm(self.setup.board_in_path(), from.switch_temperature, path.pair);
        to.second_temperature =
            warm(self.setup.second_protector.as_ref(), from.second_temperature, path.second);
        to
    }
}

/// Temperature of one body after `h` with a steady heat; `(cooling in W/K, heat capacity in J/K)`.
///
/// `T = T_a + P/G + (T_0 − T_a − P/G)·e^(−tG/C)`
pub fn towards(from: f64, ambient: f64, heat_w: f64, (cooling, capacity): (f64, f64), h: f64) -> f64 {
    if cooling > 0.0 {
        let settled = ambient + heat_w / cooling;
        settled + (from - settled) * exp(-h * cooling / capacity)
    } else {
        from + heat_w * h / capacity
    }
}
