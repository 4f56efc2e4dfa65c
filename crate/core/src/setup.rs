//! What a simulation starts from: the parts, how they are wired, and how they are used.
//!
//! Everything here has been checked where it entered; a run on it cannot fail, it can only reach
//! its bound of work, and then it says so.

use crate::board::Board;
use crate::cell::Cell;
use crate::load::Load;
use crate::units::{Amps, Celsius, Ohms, Seconds};

/// How the load is wired to the board.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Arrangement {
    /// As the board is meant to be used.
    ThroughBoard,
    /// The load is taken at the cell, before the board.
    LoadAtCell,
    /// A wire over the board's switch.
    SwitchBridged,
    /// There is no board.
    NoBoard,
}

/// The resistances between cell and load, both ways, everything in them.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Path {
    /// Between the cell and the point where the board takes its supply.
    pub ahead: Ohms,
    /// From there to the load.
    pub after: Ohms,
}

/// How the device is pressed, rested and kept.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Use {
    /// Length of a press, above 0.
    pub press: Seconds,
    /// Length of a rest, 0 or more.
    pub rest: Seconds,
    /// Ambient temperature.
    pub ambient: Celsius,
    /// What the board (or anything else) draws in a rest.
    pub standby: Amps,
    /// A charge is ended after this many presses, and says so.
    pub max_presses: u32,
}

/// A complete design, ready to be simulated.
#[derive(Debug, Clone, PartialEq)]
pub struct Setup {
    /// The cell.
    pub cell: Cell,
    /// The second protector in the cell's wrap, in series at the cell in every arrangement.
    pub second_protector: Option<Board>,
    /// Leads, joints, fuse and switch.
    pub path: Path,
    /// The protection board.
    pub board: Option<Board>,
    /// How the load is wired to it.
    pub arrangement: Arrangement,
    /// The load.
    pub load: Load,
    /// How it is used.
    pub usage: Use,
}

impl Setup {
    /// The board, where it stands in the load's path.
    pub fn board_in_path(&self) -> Option<&Board> {
        match self.arrangement {
            Arrangement::ThroughBoard => self.board.as_ref(),
            Arrangement::LoadAtCell | Arrangement::SwitchBridged | Arrangement::NoBoard => None,
        }
    }
}
