//! What a charge means for the builder: holds, borderline or fails, and the reason that decides it.
//!
//! A charge always ends somehow; the question is when. A design that gives no full press, or stops
//! with more than half of the charge left, fails: that is the igniter that works for ten presses.
//! The same rule over the parts' weak corner tells holds from borderline.

use crate::hazard::{Hazards, Level};
use crate::report::{ChargeEnd, ChargeReport, NotFull, Sample};
use crate::setup::Setup;
use crate::units::Volts;

/// More charge left than this, as a fraction, and the design stops too early. Our choice.
pub const LEFT_TOO_MUCH: f64 = 0.5;

/// The answer in a word.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Word {
    /// Nominal parts and weak parts both run the charge down.
    Holds,
    /// Nominal parts do, weak ones do not.
    Borderline,
    /// Nominal parts do not.
    Fails,
}

/// Which parts a reason was found with.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Parts {
    /// Every value as entered.
    Nominal,
    /// Every tolerance at its unfavourable end at once.
    Weak,
}

/// Why a charge is not good enough.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Reason {
    /// It is good enough; this ends it.
    RunsDown(ChargeEnd),
    /// Not one full press.
    NoFullPress(NotFull),
    /// It stops with more than half of the charge left.
    StopsEarly(ChargeEnd),
}

/// The verdict on a design.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Verdict {
    /// In a word.
    pub word: Word,
    /// The parts that decide it.
    pub parts: Parts,
    /// Why.
    pub reason: Reason,
}

/// The verdict from a charge with nominal parts and one with weak parts.
pub fn judge(nominal: &ChargeReport, weak: &ChargeReport) -> Verdict {
    let reason = look(nominal);
    if !matches!(reason, Reason::RunsDown(_)) {
        return Verdict { word: Word::Fails, parts: Parts::Nominal, reason };
    }
    let weak_reason = look(weak);
    if !matches!(weak_reason, Reason::RunsDown(_)) {
        return Verdict { word: Word::Borderline, parts: Parts::Weak, reason: weak_reason };
    }
    Verdict { word: Word::Holds, parts: Parts::Nominal, reason }
}

/// The verdict with the hazards weighed in.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Overall {
    /// In a word: that of `works`, but a stop-level hazard is a failure.
    pub word: Word,
    /// Whether it works, and why.
    pub works: Verdict,
    /// How many hazards are at stop level; where there are any, they decide.
    pub stops: usize,
}

/// A design that works is still not good enough with a stop-level hazard.
pub fn weigh(works: Verdict, hazards: &Hazards) -> Overall {
    let stops = hazards.findings.iter().filter(|f| f.level == Level::Stop).count();
    Overall { word: if stops > 0 { Word::Fails } else { works.word }, works, stops }
}

fn look(charge: &ChargeReport) -> Reason {
    let first = charge.first_imperfect.and_then(|k| charge.presses[k].summary.not_full);
    match first {
        Some(why) if charge.full_presses == 0 => Reason::NoFullPress(why),
        _ if charge.soc_left > LEFT_TOO_MUCH => Reason::StopsEarly(charge.end),
        _ => Reason::RunsDown(charge.end),
    }
}

/// One step of the staircase from the open-circuit voltage down to the load.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Drop {
    /// What takes it.
    pub part: Part,
    /// How much.
    pub volts: Volts,
}

/// What takes a part of the voltage, in the order from the cell to the load.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Part {
    /// The cell's ohmic resistance, at once.
    CellAtOnce,
    /// The cell's slow branches.
    CellSlow,
    /// A second protector in the cell's wrap, and the path ahead of the board.
    AheadOfBoard,
    /// The board's switches.
    BoardSwitch,
    /// The board's shunt.
    BoardShunt,
    /// Leads, joints, switch and fuse after the board.
    AfterBoard,
}

/// How the open-circuit voltage is eaten at one instant.
#[derive(Debug, Clone, PartialEq)]
pub struct Staircase {
    /// Where it begins.
    pub open_circuit: Volts,
    /// Every part that is there, in order; what takes nothing is left out.
    pub drops: Vec<Drop>,
    /// Where it ends.
    pub load: Volts,
}

/// The staircase at a sample of a press.
pub fn staircase(setup: &Setup, sample: &Sample) -> Staircase {
    let open_circuit = setup.cell.open_circuit(sample.soc, sample.cell_temperature);
    let slow = sample.branches.iter().fold(Volts(0.0), |sum, v| sum + *v);
    let shunt = setup.board_in_path().map_or(Volts(0.0), |board| sample.current * board.shunt);
    let drops = [
        (Part::CellAtOnce, open_circuit - slow - sample.cell),
        (Part::CellSlow, slow),
        (Part::AheadOfBoard, sample.cell - sample.board),
        (Part::BoardSwitch, sample.current * sample.pair),
        (Part::BoardShunt, shunt),
        (Part::AfterBoard, sample.current * setup.path.after),
    ];
    let drops = drops
        .into_iter()
        .filter(|(_, volts)| volts.0.abs() > 1e-12)
        .map(|(part, volts)| Drop { part, volts })
        .collect();
    Staircase { open_circuit, drops, load: sample.load }
}
