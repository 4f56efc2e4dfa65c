//! What the parts are rated for and what surrounds them: data that a press does not need, but the checks on it do.
//!
//! An absent rating is not judged, and whoever judges says so.

use crate::units::{Amps, Celsius, Coulombs, Farads, Ohms, Seconds, Volts, Watts};

/// A value with its tolerance, in the unit of whoever holds it; low ≤ typical ≤ high.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Band {
    /// Lowest.
    pub low: f64,
    /// Typical.
    pub typical: f64,
    /// Highest.
    pub high: f64,
}

impl Band {
    /// The same value three times.
    pub const fn exact(value: f64) -> Self {
        Self { low: value, typical: value, high: value }
    }
}

/// What one cell stands; currents are for one cell.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CellRatings {
    /// Rated capacity over one hour: the current called 1 It.
    pub it: Amps,
    /// Current it gives for good.
    pub continuous: Option<Amps>,
    /// Current it gives for [`Self::pulse_time`].
    pub pulse: Option<Amps>,
    /// How long the pulse current may last.
    pub pulse_time: Seconds,
    /// Highest charge current.
    pub charge: Option<Amps>,
    /// Highest charge voltage.
    pub voltage_max: Volts,
    /// Lowest voltage under discharge.
    pub voltage_min: Volts,
    /// Coldest and hottest in discharge.
    pub discharge_window: (Celsius, Celsius),
    /// Coldest and hottest in charge.
    pub charge_window: (Celsius, Celsius),
}

/// A linear charger on the board or beside it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Charger {
    /// Constant current, of the charger as a whole, in A.
    pub current: Band,
    /// Float voltage, in V.
    pub float: Band,
    /// Ends when the charger's own output current falls below this.
    pub termination: Amps,
    /// Below this cell voltage it gives the trickle current only.
    pub trickle_below: Volts,
    /// Trickle current.
    pub trickle: Amps,
    /// Its supply.
    pub input: Volts,
    /// What the device draws from the cell while it is charged, button not pressed.
    pub load_while_charging: Amps,
    /// Ambient temperatures at which it is charged, coldest and hottest.
    pub ambient: (Celsius, Celsius),
    /// Power at which a linear charger of this size folds back or gets too hot; `None`: not judged.
    pub power_limit: Option<Watts>,
}

/// How a fuse is known.
#[derive(Debug, Clone, PartialEq)]
pub enum FuseKind {
    /// Miniature fuse of IEC 60127-2, quick acting (F), by its time–current gates.
    Quick,
    /// Miniature fuse of IEC 60127-2, time-lag (T), by its time–current gates.
    TimeLag,
    /// By its melting I²t, in A²·s, and the current it carries for good.
    MeltingI2t(Band),
    /// A resettable polymer element.
    Ptc {
        /// Current that trips it in the end, at 23 °C.
        trip: Amps,
        /// Time to trip at `at`.
        time: Seconds,
        /// Current of that time.
        at: Amps,
    },
}

/// A fuse or PTC in series, on the cell's side of the board.
#[derive(Debug, Clone, PartialEq)]
pub struct Fuse {
    /// Rated current; hold current of a PTC at 23 °C.
    pub rating: Amps,
    /// What it is.
    pub kind: FuseKind,
    /// Largest current it can interrupt at this voltage; `None`: not judged.
    pub breaking: Option<Amps>,
    /// Cold resistance, as it stands in the path; `None`: not known apart from the joints.
    pub resistance: Option<Ohms>,
}

/// A lead as far as heating goes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LeadRating {
    /// Which: `true` from cell to board, `false` from board to load.
    pub cell_side: bool,
    /// Section of one conductor, in mm².
    pub area_mm2: f64,
    /// One way, in m.
    pub length_m: f64,
    /// Largest resistance of one conductor at 20 °C, in Ω/m.
    pub ohm_per_m_20: f64,
    /// Temperature before a fault: that of the insulation's rating, to be safe.
    pub initial: Celsius,
    /// Temperature the insulation survives in a short.
    pub last: Celsius,
    /// Temperature the insulation stands for good.
    pub continuous: Celsius,
}

/// A push button, switch or connector.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Contact {
    /// Rated d.c. current.
    pub current: Option<Amps>,
    /// Rated d.c. voltage.
    pub voltage: Option<Volts>,
}

/// The load's output side.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Output {
    /// Peak voltage.
    pub voltage: Option<Volts>,
    /// Capacitance that is charged to it.
    pub capacitance: Option<Farads>,
}

impl Output {
    /// Charge stored, `Q = C·V`.
    pub fn charge(&self) -> Option<Coulombs> {
        Some(Coulombs(self.capacitance?.0 * self.voltage?.0))
    }
}

/// How the device is kept.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Keeping {
    /// Presses a day.
    pub presses_per_day: f64,
    /// Days on the shelf.
    pub storage_days: f64,
    /// Hours the button might be held by accident.
    pub held_hours: f64,
    /// Coldest ambient temperature of use.
    pub cold: Celsius,
    /// Whether it sits in a closed case.
    pub closed_case: bool,
    /// Cells are joined for good at different voltages by at most this.
    pub parallel_mismatch: Volts,
}

/// Over-charge protection of a board.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct OverCharge {
    /// Detection voltage, in V.
    pub threshold: Band,
    /// Charge over-current: sense voltage over the pair in the other direction, in V.
    pub charge_sense: Option<Band>,
}

/// Everything beside the setup.
#[derive(Debug, Clone, PartialEq)]
pub struct Ratings {
    /// One cell.
    pub cell: CellRatings,
    /// The charger, where there is one.
    pub charger: Option<Charger>,
    /// Over-charge protection of the board, where it has it.
    pub board_over_charge: Option<OverCharge>,
    /// The same of the second protector.
    pub second_over_charge: Option<OverCharge>,
    /// Fuse or PTC ahead of the board.
    pub fuse: Option<Fuse>,
    /// The leads.
    pub leads: Vec<LeadRating>,
    /// Push button.
    pub button: Contact,
    /// Connector with the lowest rating.
    pub connector: Contact,
    /// Output side.
    pub output: Output,
    /// Keeping.
    pub keeping: Keeping,
    /// Whether the load's figures are an estimate.
    pub load_estimated: bool,
}
