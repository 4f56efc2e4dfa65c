//! What a run reports: events, samples, summaries and the energy ledger, as numbers.

use crate::cell::MAX_BRANCHES;
use crate::units::{AmpHours, Amps, Celsius, Joules, Ohms, Seconds, Volts};

/// State of the load.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Mode {
    /// Did not start, or fell below its start voltage; draws through its stall resistance.
    Stalled,
    /// Held at the start voltage: the stall draw lets it rise, the unlit draw pulls it down.
    Pinned,
    /// Runs, no arc.
    Unlit,
    /// Arc on.
    Lit,
}

/// Which protector a stage belongs to.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Protector {
    /// The board.
    Board,
    /// The one in the cell's own wrap.
    Second,
}

/// What can open the path.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Limit {
    /// A current stage, by its place in the protector's list.
    Stage(Protector, usize),
    /// Over-discharge.
    OverDischarge(Protector),
}

/// What happened.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum EventKind {
    /// The switch is closed; the press begins.
    Closed,
    /// A limit is exceeded; its timer starts.
    Over(Limit),
    /// A limit is no longer exceeded; its timer is reset.
    Under(Limit),
    /// The start voltage is reached for the first time; the surge begins.
    StartReached,
    /// The load runs, without an arc.
    Runs,
    /// The load is held at its start voltage.
    PinnedAtStart,
    /// The load falls below its start voltage.
    Stalls,
    /// The strike voltage is reached; the strike time begins.
    StrikeReached,
    /// The strike voltage is lost before the strike time is over.
    StrikeLost,
    /// The arc is lit.
    Lit,
    /// The arc drops.
    Drop,
    /// A protector opens the path.
    Opened(Limit),
    /// The cell is empty (z = 0).
    CellEmpty,
    /// The press ends as intended.
    Released,
    /// The bound on events was reached; the press is not followed further.
    EventLimit,
}

/// One event; the values are those just after it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Event {
    /// From switch closing.
    pub time: Seconds,
    /// What happened.
    pub kind: EventKind,
    /// State of the load after it.
    pub mode: Mode,
    /// At the load's terminals.
    pub load: Volts,
    /// Through the path.
    pub current: Amps,
    /// The board's supply.
    pub board: Volts,
    /// At the cell's terminals.
    pub cell: Volts,
    /// State of charge, 0 to 1.
    pub soc: f64,
}

/// One row of a trace.
#[derive(Debug, Clone, PartialEq)]
pub struct Sample {
    /// From switch closing.
    pub time: Seconds,
    /// State of the load.
    pub mode: Mode,
    /// At the load's terminals.
    pub load: Volts,
    /// The board's supply.
    pub board: Volts,
    /// At the cell's terminals.
    pub cell: Volts,
    /// Through the path.
    pub current: Amps,
    /// Into the load, without the input capacitor.
    pub load_current: Amps,
    /// Of the input capacitor, without its series resistance.
    pub capacitor: Volts,
    /// State of charge, 0 to 1.
    pub soc: f64,
    /// Of the slow branches; as many as the cell has.
    pub branches: Vec<Volts>,
    /// Of the cell.
    pub cell_temperature: Celsius,
    /// Of the board's switches.
    pub switch_temperature: Celsius,
    /// Of the board's switches, all pairs together.
    pub pair: Ohms,
    /// What each stage of the board sees, peak factor included, in V or A as its threshold is.
    pub sense: Vec<f64>,
}

/// Where the energy went, in J. `source` is the sum of all the others.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Ledger {
    /// From the open-circuit voltage, temperature part included.
    pub source: Joules,
    /// Heat in `R₀`.
    pub cell_ohmic: Joules,
    /// Into the slow branches.
    pub cell_polarisation: Joules,
    /// Heat in the second protector.
    pub second_protector: Joules,
    /// Heat in the path ahead of the board.
    pub ahead: Joules,
    /// Heat in the board's switches.
    pub pair: Joules,
    /// Heat in the board's shunt.
    pub shunt: Joules,
    /// Heat in the path after the board.
    pub after: Joules,
    /// Heat in the input capacitor's series resistance.
    pub esr: Joules,
    /// Left in the input capacitor when the press ends.
    pub capacitor_left: Joules,
    /// Into the load while lit.
    pub load_lit: Joules,
    /// Into the load while it runs without an arc or is held at the start voltage.
    pub load_unlit: Joules,
    /// Into the load while stalled.
    pub load_stalled: Joules,
    /// Into the standby draw, in rests.
    pub standby: Joules,
}

impl Ledger {
    /// Everything but the source.
    pub fn spent(&self) -> Joules {
        self.cell_ohmic
            + self.cell_polarisation
            + self.second_protector
            + self.ahead
            + self.pair
            + self.shunt
            + self.after
            + self.esr
            + self.capacitor_left
            + self.load_lit
            + self.load_unlit
            + self.load_stalled
            + self.standby
    }

    /// What does not close, as a fraction of the source; 0 where nothing flowed.
    pub fn residual(&self) -> f64 {
        if self.source.0 == 0.0 { 0.0 } else { (self.source.0 - self.spent().0) / self.source.0 }
    }
}

/// Why a press was not lit from strike to release without dropping. Written first decides.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum NotFull {
    /// A protector opened.
    Opened(Limit),
    /// The cell was empty.
    CellEmpty,
    /// The bound on events was reached.
    EventLimit,
    /// The arc dropped: the path gives the lit draw only below the hold voltage.
    SagBelowHold,
    /// The arc dropped: the path cannot give the lit draw at any voltage.
    NoOperatingPoint,
    /// The start voltage was never reached.
    NotStarted,
    /// It ran, but the strike voltage was never reached.
    StrikeVoltageNotReached,
    /// The strike voltage never stood for the strike time.
    StrikeTimeNotCompleted,
}

/// How a press ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum PressEnd {
    /// As intended.
    Released,
    /// A protector opened.
    Opened(Limit),
    /// The cell was empty.
    CellEmpty,
    /// The bound on events was reached.
    EventLimit,
}

/// One press in numbers.
#[derive(Debug, Clone, PartialEq)]
pub struct PressSummary {
    /// `None`: a full press.
    pub not_full: Option<NotFull>,
    /// How it ended.
    pub end: PressEnd,
    /// When, from switch closing.
    pub end_time: Seconds,
    /// Time with the arc on.
    pub lit: Seconds,
    /// When the arc first lit.
    pub first_lit: Option<Seconds>,
    /// How often it dropped.
    pub drops: u32,
    /// When the start voltage was first reached.
    pub start: Option<Seconds>,
    /// State of the load at the end.
    pub end_mode: Mode,
    /// At the load, just before the end.
    pub load_end: Volts,
    /// Through the path, just before the end.
    pub current_end: Amps,
    /// The board's supply, just before the end.
    pub board_end: Volts,
    /// At the cell's terminals, just before the end.
    pub cell_end: Volts,
    /// The board's switches, just before the end.
    pub pair_end: Ohms,
    /// Largest current of the press.
    pub peak_current: Amps,
    /// Lowest voltage at the load while lit.
    pub lowest_lit: Option<Volts>,
    /// State of charge at the beginning.
    pub soc_start: f64,
    /// State of charge at the end.
    pub soc_end: f64,
    /// Of the slow branches at the end; 0 where the cell has none.
    pub branches_end: [Volts; MAX_BRANCHES],
    /// Cell temperature at the end.
    pub cell_temperature_end: Celsius,
    /// Highest cell temperature.
    pub cell_temperature_max: Celsius,
    /// Temperature of the board's switches at the end.
    pub switch_temperature_end: Celsius,
    /// Highest temperature of the board's switches.
    pub switch_temperature_max: Celsius,
    /// Temperature of the second protector's switches at the end.
    pub second_temperature_end: Celsius,
    /// Highest temperature of the second protector's switches.
    pub second_temperature_max: Celsius,
    /// Where the energy went.
    pub ledger: Ledger,
    /// Charge through the path, in A·s.
    pub charge_as: f64,
    /// ∫i²dt through the path, in A²·s.
    pub i2t_a2s: f64,
    /// Work done: integration steps.
    pub steps: u32,
}

/// One press, followed in full.
#[derive(Debug, Clone, PartialEq)]
pub struct PressReport {
    /// Everything that happened, in order.
    pub events: Vec<Event>,
    /// Samples at the times that were asked for, up to the end.
    pub trace: Vec<Sample>,
    /// The press in numbers.
    pub summary: PressSummary,
}

/// One press of a charge, in a line.
#[derive(Debug, Clone, PartialEq)]
pub struct PressLine {
    /// From 1.
    pub number: u32,
    /// At the cell's terminals with the standby draw, just before the press.
    pub rested: Volts,
    /// The press in numbers.
    pub summary: PressSummary,
}

/// What ended a charge.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ChargeEnd {
    /// A press had no lit time at all, and nothing opened.
    NoLitTime(NotFull),
    /// A protector opened during a press.
    Opened(Limit),
    /// A protector opened during a rest.
    OpenedInRest(Limit),
    /// The cell was empty during a press.
    CellEmpty,
    /// The cell was empty during a rest.
    EmptyInRest,
    /// The set number of presses was reached.
    PressLimit,
    /// A press reached its bound on events, or the charge its bound on work.
    WorkLimit,
}

/// One charge: press after press from full.
#[derive(Debug, Clone, PartialEq)]
pub struct ChargeReport {
    /// Every press, the one that ended it included.
    pub presses: Vec<PressLine>,
    /// How many were full.
    pub full_presses: u32,
    /// Time with the arc on, all presses.
    pub lit: Seconds,
    /// Where the energy went, presses and rests.
    pub ledger: Ledger,
    /// Relaxed open-circuit voltage after the last full press; `None` if there was none.
    pub recharge_mark: Option<Volts>,
    /// Relaxed open-circuit voltage before the last full press.
    pub mark_relaxed_before: Option<Volts>,
    /// Terminal voltage at the end of the rest before the last full press.
    pub mark_in_use_before: Option<Volts>,
    /// Terminal voltage at the end of the rest after the last full press.
    pub mark_in_use_after: Option<Volts>,
    /// State of charge at the end.
    pub soc_left: f64,
    /// Charge left at the end, all cells.
    pub charge_left: AmpHours,
    /// Index in `presses` of the first press that was not full.
    pub first_imperfect: Option<usize>,
    /// What ended it.
    pub end: ChargeEnd,
    /// Time from the first press to the end.
    pub clock: Seconds,
    /// Highest cell temperature.
    pub cell_temperature_max: Celsius,
    /// Highest temperature of the board's switches.
    pub switch_temperature_max: Celsius,
    /// Highest temperature of the second protector's switches.
    pub second_temperature_max: Celsius,
    /// Work done: integration steps.
    pub steps: u64,
}
