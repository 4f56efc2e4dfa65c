//! Hazards: every check on one design, as findings with the numbers they rest on.
//!
//! Three levels. **Stop**: somebody can be hurt, or a cell can be ruined, by one foreseeable mistake or fault. **Look**:
//! a limit is passed, or a protection is thinner than it should be. **Note**: always true, or to be known. A
//! threshold is a published one or is marked as our choice. An absent rating is not judged, and that is listed.
//! No finding is a certificate; nothing here recommends a bypass of the board.

mod charging;
mod check;
mod keeping;
mod law;
mod opening;
mod rating;

use crate::arrangements::{Arranged, By, Given, Held, ShortCircuit};
use crate::margins::Corners;
use crate::ratings::{Band, Ratings};
use crate::report::{ChargeReport, Limit, Protector};
use crate::setup::{Arrangement, Setup};
use crate::thermal::BARE_METAL;
use crate::units::{Amps, Celsius, Coulombs, Farads, Joules, Seconds, Volts, Watts};
use check::Look;
pub use law::{
    equalising_current, settled, settled_lead, settled_switch, stored_limit, stored_tier, transport_wh,
};

/// Draw over the cell's continuous rating from which it is a stop. Our choice; above 1 it is worth a look.
pub const CELL_OVERLOAD_STOP: f64 = 1.5;
/// Cell voltage below which a cell counts as damaged. Conservative engineering rule; measured onsets lie far lower.
pub const DAMAGE_BELOW: Volts = Volts(2.0);
/// Cell temperature that is a stop: 10 K below the first exothermic step, about 90 °C on graphite (reviews of battery
/// safety).
pub const CELL_STOP: Celsius = Celsius(80.0);
/// Switch temperature worth a look. Our choice.
pub const SWITCH_LOOK: Celsius = Celsius(100.0);
/// Junction temperature that silicon switches are rated to. Common practice, no source.
pub const SWITCH_STOP: Celsius = Celsius(150.0);
/// Touched for ten minutes, bare metal burns from about here. ISO 13732-1, from memory.
pub const TOUCH_LOOK: Celsius = BARE_METAL[3].1;
/// Touched for half a second, bare metal burns from about here. ISO 13732-1, 4.2.1.2, as quoted.
pub const TOUCH_STOP: Celsius = BARE_METAL[0].1;
/// What a closed case does to every rise over ambient. Our choice, a rough one.
pub const CLOSED_CASE: f64 = 2.0;
/// Heat transfer from a bare conductor, in W/(m²·K): convection and radiation in still air give about 10 to 12.
pub const LEAD_COOLING: f64 = 10.0;
/// Highest sustained dissipation of a miniature fuse. IEC 60127-2, from memory.
pub const FUSE_HEAT_LOOK: Watts = Watts(1.6);
/// Contact current over its rating that is a stop: contacts weld, and a welded button stays on. Our choice.
pub const CONTACT_STOP: f64 = 2.0;
/// Surge over a contact's steady rating that is worth a look. Our choice.
pub const CONTACT_SURGE_LOOK: f64 = 5.0;
/// No cell is charged hotter than this; JEITA-type charger windows end here.
pub const CHARGE_HOT_STOP: Celsius = Celsius(60.0);
/// Over-charge detection this far above the cell's highest voltage comes too late. Common practice has 0.15 V (4.35 on
/// 4.20), no source.
pub const OVER_CHARGE_ABOVE: Volts = Volts(0.15);
/// Trickle current over It that is worth a look: cell makers ask for 0.1 It or less below the over-discharge voltage.
pub const TRICKLE_RATE: f64 = 0.1;
/// Equalising current over the charge limit that is a stop. Our choice.
pub const EQUALISING_STOP: f64 = 5.0;
/// What protection lets through for good, over the cell's continuous rating, that is worth a look. Our choice.
pub const LETS_THROUGH_LOOK: f64 = 2.0;
/// Peak voltage from which the capacitance limit applies. IEC 60335-1, 8.1.4.
pub const TOUCHABLE: Volts = Volts(42.4);
/// Peak voltage from which the charge limit applies. IEC 60335-1, 8.1.4.
pub const CHARGE_TIER: Volts = Volts(450.0);
/// Peak voltage from which the energy limit applies. IEC 60335-1, 8.1.4.
pub const ENERGY_TIER: Volts = Volts(15e3);
/// Largest capacitance of the first tier. IEC 60335-1, 8.1.4.
pub const CAPACITANCE_LIMIT: Farads = Farads(0.1e-6);
/// Largest charge of the second tier. IEC 60335-1, 8.1.4.
pub const CHARGE_LIMIT: Coulombs = Coulombs(45e-6);
/// Largest energy of the third tier. IEC 60335-1, 8.1.4.
pub const ENERGY_LIMIT: Joules = Joules(0.350);
/// Mean voltage by which transport rules turn capacity into energy here.
pub const TRANSPORT_VOLTAGE: Volts = Volts(3.7);
/// Energy of one cell up to which the small-cell rules hold, in Wh. IATA/ICAO packing instruction 965.
pub const TRANSPORT_CELL_WH: f64 = 20.0;
/// Energy of a battery up to which the small-battery rules hold, in Wh. IATA/ICAO packing instruction 965.
pub const TRANSPORT_BATTERY_WH: f64 = 100.0;

/// How grave a finding is, gravest first.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Level {
    /// Do not build it so.
    Stop,
    /// Look into it first.
    Look,
    /// To be known.
    Note,
}

/// The surroundings a finding holds for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Case {
    /// At ambient temperature.
    Ambient,
    /// At the coldest temperature of use.
    Cold,
}

/// A switch or a connector.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ContactPart {
    /// The push button.
    Button,
    /// The connector with the lowest rating.
    Connector,
}

/// Which of the three limits on stored charge applies.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum StoredTier {
    /// 42.4 to 450 V: 0.1 µF.
    Capacitance,
    /// 450 V to 15 kV: 45 µC.
    Charge,
    /// Above 15 kV: 350 mJ.
    Energy,
}

/// How many layers there are against each thing.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Layers {
    /// Over-current by the load.
    pub over_current: usize,
    /// Short circuit at the load.
    pub short_circuit: usize,
    /// Over-discharge by the load.
    pub over_discharge: usize,
    /// Over-charge.
    pub over_charge: usize,
    /// Charge over-current.
    pub charge_over_current: usize,
}

impl From<&Arranged> for Layers {
    fn from(a: &Arranged) -> Self {
        Self {
            over_current: a.over_current.len(),
            short_circuit: a.short_circuit.len(),
            over_discharge: a.over_discharge.len(),
            over_charge: a.over_charge.len(),
            charge_over_current: a.charge_over_current.len(),
        }
    }
}

/// What was found, with its numbers. Within a level the order here is that of importance.
#[derive(Debug, Clone, PartialEq)]
pub enum Kind {
    /// No electronic protection opens on a short circuit at the load in this arrangement. Stop; a look where a fuse
    /// clears within the leads' limit at the full and at the weakest current. Source of the limit: IEC 60364-4-43.
    ShortUnprotected {
        /// How the load is wired.
        arrangement: Arrangement,
        /// With a full cell and nominal parts.
        full: ShortCircuit,
        /// Weakest: empty, weak parts, at ambient or cold.
        weakest: Amps,
        /// Shortest time of a lead to its limit at the full current.
        lead_limit: Option<Seconds>,
        /// When the fuse clears at the weakest current, at the latest.
        fuse_clears: Option<Seconds>,
        /// Smallest and largest rated current of a quick fuse that carries the draw and clears in time at both
        /// currents, if any. It looks at the leads only; the cell is heated meanwhile.
        quick_fuse: Option<(Amps, Amps)>,
    },
    /// A protector is in the path, and a short circuit does not exceed any of its stages: cell too weak, leads too
    /// long, threshold too high. Stop where nothing else opens; a look where over-discharge detection or a fuse does.
    NeverTripsOnShort {
        /// Surroundings.
        case: Case,
        /// State of charge, 0 to 1.
        soc: f64,
        /// Prospective current with weak parts.
        prospective: Amps,
        /// Lowest current that would trip a stage, late parts; `None` without stages.
        trip: Option<Amps>,
        /// Over-discharge detection that opens instead.
        instead: Option<By>,
        /// When the fuse clears, at the latest.
        fuse_clears: Option<Seconds>,
    },
    /// Nothing ends the discharge by the load. Stop: a held button or a shelf empties the cell below what it survives.
    OverDischargeUnprotected {
        /// How the load is wired.
        arrangement: Arrangement,
        /// The button held after the last press.
        held: Held,
        /// Standby from the recharge mark.
        standby: Option<Seconds>,
    },
    /// The arrangement does without the board. Stop if nothing is left against short circuit or over-discharge, else
    /// a look.
    ArrangementLoses {
        /// How the load is wired.
        arrangement: Arrangement,
        /// Layers left.
        left: Layers,
        /// Layers with the load through the board.
        through_board: Layers,
    },
    /// The charger is the only thing against over-charge: if it fails, nothing ends the charge. Stop.
    NoOverChargeLayer {
        /// How the load is wired.
        arrangement: Arrangement,
        /// Highest float voltage.
        float: Volts,
        /// The charger's supply, which the cell gets then.
        input: Volts,
    },
    /// Float voltage above the cell's highest. Stop by its typical value, a look by its tolerance.
    FloatAboveCell {
        /// Float voltage, in V.
        float: Band,
        /// Highest voltage of the cell.
        limit: Volts,
    },
    /// Every over-charge detection comes later than [`OVER_CHARGE_ABOVE`] over the cell's highest voltage. Stop.
    OverChargeTooHigh {
        /// Lowest of the highest thresholds.
        threshold: Volts,
        /// Highest voltage of the cell.
        limit: Volts,
    },
    /// Charge current above the cell's limit, per cell. Stop by its typical value, a look by its tolerance.
    ChargeAboveLimit {
        /// Charge current per cell, in A.
        current: Band,
        /// The cell's limit.
        limit: Amps,
    },
    /// Charge current above 1 It, per cell. Stop without a maker's limit; with one that allows it, a note.
    ChargeAboveIt {
        /// Over It.
        rate: f64,
    },
    /// Charged colder or hotter than the cell allows. Stop below (lithium plating) and above 60 °C, else a look.
    ChargeTemperature {
        /// Coldest and hottest it is charged at.
        ambient: (Celsius, Celsius),
        /// The cell's window.
        window: (Celsius, Celsius),
    },
    /// What is stored on the output is above the limit for parts that can be touched. Stop. IEC 60335-1, 8.1.4.
    StoredEnergy {
        /// Which limit applies.
        tier: StoredTier,
        /// Peak voltage.
        voltage: Volts,
        /// Capacitance.
        capacitance: Farads,
        /// Charge.
        charge: Coulombs,
        /// Energy.
        energy: Joules,
    },
    /// The cell gives more than it is rated for, per cell. Stop above the pulse rating, or above
    /// [`CELL_OVERLOAD_STOP`] times the continuous one for longer than a pulse; else a look.
    CellOverRating {
        /// Largest steady draw of a press.
        draw: Amps,
        /// Effective over press and rest.
        effective: Amps,
        /// Continuous rating.
        continuous: Option<Amps>,
        /// Pulse rating.
        pulse: Option<Amps>,
        /// How long the draw lasts: a press, or as long as the button may be held.
        lasts: Seconds,
    },
    /// The cell gets hotter than it may. A look above its window, stop above [`CELL_STOP`].
    CellHot {
        /// In the charge.
        charge: Celsius,
        /// With the button held.
        held: Option<Celsius>,
        /// The window's upper end.
        limit: Celsius,
    },
    /// Used colder or hotter than the cell's discharge window. Look.
    DischargeTemperature {
        /// Coldest and ambient.
        ambient: (Celsius, Celsius),
        /// The cell's window.
        window: (Celsius, Celsius),
    },
    /// The cell is drawn below its lowest voltage. Look; stop below [`DAMAGE_BELOW`].
    CellBelowWindow {
        /// Lowest terminal voltage at a press's end.
        lowest: Volts,
        /// The cell's lowest voltage.
        limit: Volts,
    },
    /// The switch pair gets too hot. A look above [`SWITCH_LOOK`], stop above [`SWITCH_STOP`] or where it never settles.
    SwitchHot {
        /// Which.
        protector: Protector,
        /// In the charge.
        charge: Celsius,
        /// Settled at the steady draw with the button held; `None`: not held, or it never settles.
        held: Option<Celsius>,
        /// It never settles.
        runs_away: bool,
    },
    /// A lead at the steady draw gets hotter than its insulation stands for good. Look; stop above what it survives.
    LeadHot {
        /// `true` from cell to board.
        cell_side: bool,
        /// Settled; `None`: it never settles.
        settled: Option<Celsius>,
        /// What the insulation stands.
        limit: Celsius,
        /// Current density, in A/mm².
        density: f64,
    },
    /// A surface gets too hot to hold. A look above [`TOUCH_LOOK`], stop above [`TOUCH_STOP`].
    Touch {
        /// Of the cell's surface, which the hand is taken to touch.
        surface: Celsius,
    },
    /// A contact carries more than it is rated for. Look; stop above [`CONTACT_STOP`] times.
    ContactCurrent {
        /// Which.
        part: ContactPart,
        /// Steady draw.
        draw: Amps,
        /// Rating, d.c.
        rating: Amps,
    },
    /// The largest current of a press over the contact's steady rating. Note; look above [`CONTACT_SURGE_LOOK`] times.
    ContactSurge {
        /// Which.
        part: ContactPart,
        /// Largest current of a press.
        peak: Amps,
        /// Rating, d.c.
        rating: Amps,
    },
    /// The cell's full voltage is above the contact's d.c. rating. Look.
    ContactVoltage {
        /// Which.
        part: ContactPart,
        /// Full cell.
        voltage: Volts,
        /// Rating, d.c.
        rating: Volts,
    },
    /// The fuse cannot interrupt the prospective current. Stop where nothing else opens, else a look. IEC 60127.
    FuseBreaking {
        /// Prospective, full cell.
        prospective: Amps,
        /// Breaking capacity.
        breaking: Amps,
    },
    /// At the weakest short circuit the fuse is slower than the leads, or is not sure to open. Look.
    FuseTooSlow {
        /// Weakest prospective current.
        prospective: Amps,
        /// When it opens at the latest; `None`: not known to.
        latest: Option<Seconds>,
        /// Shortest time of a lead to its limit.
        lead_limit: Option<Seconds>,
    },
    /// The draw is above what the fuse carries for good: it may open on the load, in a press or a held one. Look.
    FuseOpensOnLoad {
        /// Steady draw.
        draw: Amps,
        /// Rating; hold current of a PTC at this temperature.
        rating: Amps,
        /// Not before.
        earliest: Option<Seconds>,
    },
    /// The protector opens long before the fuse would. Note: it guards against what the protector cannot, its own failure.
    FuseBackupOnly {
        /// The protector's latest delay.
        protector: Seconds,
        /// The fuse, not before.
        fuse: Seconds,
    },
    /// Heat in the fuse at the steady draw. Look above [`FUSE_HEAT_LOOK`].
    FuseHeat {
        /// Heat, cold resistance.
        power: Watts,
    },
    /// The draw is inside or above a stage's band. Look: it trips, some boards or all of them, and a trip tempts to a bypass.
    NuisanceTrip {
        /// What opens.
        limit: Limit,
        /// Surroundings.
        case: Case,
        /// Highest state of charge at which it does, 0 to 1.
        soc: f64,
        /// What the stage sees just before it opens, peak factor included.
        draw: Amps,
        /// Trip current, steady, in A.
        trip: Band,
        /// A late board opens too.
        certain: bool,
    },
    /// Over-current protection lets more through for good than the cell is rated for. Note; look above
    /// [`LETS_THROUGH_LOOK`] times.
    LetsThrough {
        /// Highest current that a late protector never opens on, all cells.
        lasting: Amps,
        /// The cells' continuous rating together.
        continuous: Amps,
    },
    /// Standby empties the cell on the shelf. Look.
    StandbyDrain {
        /// From the recharge mark to empty, in days.
        days: f64,
        /// Days on the shelf.
        storage_days: f64,
    },
    /// The load keeps the charger's current above its termination: the charge never ends. Look.
    TerminationNeverReached {
        /// The load while it is charged.
        load: Amps,
        /// Termination current.
        termination: Amps,
    },
    /// The load takes all of the trickle current: a deeply discharged cell never recovers. Look; stop where nothing
    /// ends the discharge.
    TrickleNeverRecovers {
        /// The load while it is charged.
        load: Amps,
        /// Trickle current.
        trickle: Amps,
    },
    /// A press while charging discharges the cell all the same. Note.
    PressWhileCharging {
        /// Into the cell, negative when it is discharged.
        cell: Amps,
    },
    /// Trickle current above 0.1 It, per cell. Look.
    TrickleAboveLimit {
        /// Over It.
        rate: f64,
    },
    /// A linear charger dissipates more than it can. Look.
    ChargerHot {
        /// At the end of the trickle, highest current.
        power: Watts,
        /// What it can, in this case.
        limit: Watts,
    },
    /// Parallel cells joined at different voltages. A look above the charge limit, stop above [`EQUALISING_STOP`] times;
    /// else a note.
    ParallelMismatch {
        /// Voltage difference.
        difference: Volts,
        /// First current between one cell and the others.
        current: Amps,
        /// Charge limit of one cell, or 1 It.
        limit: Amps,
    },
    /// A cell put in the wrong way round. Note; among parallel cells a look.
    ReversedCell {
        /// First current through the reversed cell, by the cells' own resistance; with one cell, through the path.
        current: Amps,
    },
    /// High voltage can kill. Look; a note where the output is known to stay below [`TOUCHABLE`].
    HighVoltage {
        /// Peak, if known.
        voltage: Option<Volts>,
    },
    /// Over-discharge detection is below the cell's lowest voltage. Note.
    DetectionBelowWindow {
        /// Lowest threshold.
        threshold: Volts,
        /// The cell's lowest voltage.
        limit: Volts,
    },
    /// Nothing but the board opens, and it does not see a short circuit between the cell and itself. Note: the leads
    /// ahead of it are the place for a fuse.
    ShortAheadOfBoard {
        /// Straight at the cell, full.
        current: Amps,
        /// Shortest time of a cell lead to its limit.
        lead_limit: Option<Seconds>,
    },
    /// Energy for the transport rules. Note; look above the small-cell or small-battery limit.
    Transport {
        /// Of one cell, in Wh.
        cell_wh: f64,
        /// Of all cells, in Wh.
        total_wh: f64,
    },
    /// A swollen cell is out of use, and no cell goes into household waste. Note.
    SwellingAndDisposal,
    /// The load's figures are an estimate, and so is all that rests on them. Note.
    LoadEstimated,
}

/// One finding.
#[derive(Debug, Clone, PartialEq)]
pub struct Finding {
    /// How grave.
    pub level: Level,
    /// What.
    pub kind: Kind,
}

/// What could not be judged for want of a figure.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum NotJudged {
    /// The cell's continuous current.
    CellContinuous,
    /// The cell's pulse current.
    CellPulse,
    /// The cell's charge current.
    CellCharge,
    /// No charge at the coldest temperature was given.
    ColdCharge,
    /// A press, probed for a nuisance trip, reached its bound of work: an arc that flickers, mostly.
    LongPress(Case),
    /// No lead has a rating.
    Leads,
    /// The fuse's breaking capacity.
    FuseBreaking,
    /// The fuse's resistance.
    FuseHeat,
    /// A contact's current rating.
    ContactCurrent(ContactPart),
    /// A contact's voltage rating.
    ContactVoltage(ContactPart),
    /// The charger: no data.
    Charger,
    /// What power the charger can stand.
    ChargerPower,
    /// The output's voltage.
    OutputVoltage,
    /// The output's capacitance.
    OutputCapacitance,
    /// The thermal resistance of a protector's switches.
    SwitchHeat(Protector),
}

/// Everything that was found.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Hazards {
    /// By level, then by importance.
    pub findings: Vec<Finding>,
    /// Checks that were made, with or without a finding.
    pub checks_made: u32,
    /// Checks that a missing figure prevented.
    pub not_judged: Vec<NotJudged>,
}

impl Hazards {
    /// Whether anything is at stop level.
    pub fn has_stop(&self) -> bool {
        self.findings.iter().any(|f| f.level == Level::Stop)
    }
}

/// What the checks look at.
#[derive(Debug, Clone, Copy)]
pub struct Circumstances<'a> {
    /// The nominal parts as they are wired, and their protectors at both ends of the tolerances.
    pub corners: Corners<'a>,
    /// Every tolerance at its unfavourable end.
    pub weak: &'a Setup,
    /// The charge of the nominal parts.
    pub charge: &'a ChargeReport,
    /// The charge of the weak parts.
    pub weak_charge: Option<&'a ChargeReport>,
    /// The charge of the nominal parts at the coldest temperature of use.
    pub cold_charge: Option<&'a ChargeReport>,
    /// Ratings and what surrounds the parts.
    pub ratings: &'a Ratings,
}

/// All checks on one design.
pub fn hazards(c: &Circumstances<'_>) -> Hazards {
    let given = Given { corners: c.corners, charge: c.charge, ratings: c.ratings };
    let look = Look::new(c, &given);
    let mut found = Hazards::default();
    look.short(&mut found);
    look.short_ahead(&mut found);
    look.what_is_lost(&mut found, &given);
    look.nuisance(&mut found);
    look.lets_through(&mut found);
    look.standby(&mut found);
    look.over_charge(&mut found);
    look.charging(&mut found);
    look.cell_use(&mut found);
    look.cell_heat(&mut found);
    look.switches(&mut found);
    look.leads(&mut found);
    look.contacts(&mut found);
    look.fuse(&mut found);
    look.wrong_cells(&mut found);
    look.output(&mut found);
    look.keeping(&mut found);
    // Stable: what is equal stays in the order of the checks.
    found.findings.sort_by_key(|f| (f.level, rank(&f.kind)));
    found
}

/// The standard or other source that a finding rests on.
pub fn source(kind: &Kind) -> &'static str {
    const PRACTICE: &str = "common practice, no source";
    const OURS: &str = "energy balance; the threshold is our choice";
    match kind {
        Kind::ShortUnprotected { .. } | Kind::ShortAheadOfBoard { .. } => {
            "IEC 60364-4-43, 434.5.2; IEC 60127-2"
        }
        Kind::NeverTripsOnShort { .. } | Kind::NuisanceTrip { .. } => {
            "Ohm's law and the protector's data sheet"
        }
        Kind::OverDischargeUnprotected { .. } | Kind::CellBelowWindow { .. } => {
            "the cell's data sheet; below 2.0 V an engineering rule"
        }
        Kind::ArrangementLoses { .. } => "the circuit itself",
        Kind::NoOverChargeLayer { .. } => "single-fault rule of IEC 62133-2 and IEC 62368-1, from memory",
        Kind::FloatAboveCell { .. } | Kind::ChargeTemperature { .. } | Kind::DischargeTemperature { .. } => {
            "the cell's data sheet"
        }
        Kind::OverChargeTooHigh { .. } => PRACTICE,
        Kind::ChargeAboveLimit { .. } => "the cell's data sheet",
        Kind::ChargeAboveIt { .. } | Kind::TrickleAboveLimit { .. } => "cell makers' charging rules",
        Kind::StoredEnergy { .. } => "IEC 60335-1, 8.1.4",
        Kind::CellOverRating { .. } | Kind::LetsThrough { .. } => {
            "the cell's data sheet; the factor is our choice"
        }
        Kind::CellHot { .. } => {
            "the cell's data sheet; reviews of battery safety (first step above about 90 °C)"
        }
        Kind::SwitchHot { .. } => PRACTICE,
        Kind::LeadHot { .. } => "the lead's data sheet; IEC 60028 copper, still air",
        Kind::Touch { .. } => "ISO 13732-1",
        Kind::ContactCurrent { .. } | Kind::ContactSurge { .. } | Kind::ContactVoltage { .. } => {
            "the contact's data sheet; the factors are our choice"
        }
        Kind::FuseBreaking { .. } | Kind::FuseTooSlow { .. } | Kind::FuseOpensOnLoad { .. } => {
            "IEC 60127-2; the PTC's data sheet"
        }
        Kind::FuseBackupOnly { .. } => "IEC 60127-2; the protector's data sheet",
        Kind::FuseHeat { .. } => "IEC 60127-2, from memory",
        Kind::StandbyDrain { .. } => "charge balance",
        Kind::TerminationNeverReached { .. }
        | Kind::TrickleNeverRecovers { .. }
        | Kind::PressWhileCharging { .. } => "charger makers' notes on load sharing",
        Kind::ChargerHot { .. } => OURS,
        Kind::ParallelMismatch { .. } => "Ohm's law; the factor is our choice",
        Kind::ReversedCell { .. } => "Ohm's law",
        Kind::HighVoltage { .. } => "IEC 60335-1, 8.1.4; IEC 60479-1",
        Kind::DetectionBelowWindow { .. } => "data sheets of cell and protector",
        Kind::Transport { .. } => "IATA/ICAO packing instruction 965; UN 38.3",
        Kind::SwellingAndDisposal => PRACTICE,
        Kind::LoadEstimated => "the estimate's own statement",
    }
}

/// Importance within a level, the order of [`Kind`].
fn rank(kind: &Kind) -> u8 {
    match kind {
        Kind::ShortUnprotected { .. } => 0,
        Kind::NeverTripsOnShort { .. } => 1,
        Kind::OverDischargeUnprotected { .. } => 2,
        Kind::ArrangementLoses { .. } => 3,
        Kind::NoOverChargeLayer { .. } => 4,
        Kind::FloatAboveCell { .. } => 5,
        Kind::OverChargeTooHigh { .. } => 6,
        Kind::ChargeAboveLimit { .. } => 7,
        Kind::ChargeAboveIt { .. } => 8,
        Kind::ChargeTemperature { .. } => 9,
        Kind::StoredEnergy { .. } => 10,
        Kind::CellOverRating { .. } => 11,
        Kind::CellHot { .. } => 12,
        Kind::DischargeTemperature { .. } => 13,
        Kind::CellBelowWindow { .. } => 14,
        Kind::SwitchHot { .. } => 15,
        Kind::LeadHot { .. } => 16,
        Kind::Touch { .. } => 17,
        Kind::ContactCurrent { .. } => 18,
        Kind::ContactSurge { .. } => 19,
        Kind::ContactVoltage { .. } => 20,
        Kind::FuseBreaking { .. } => 21,
        Kind::FuseTooSlow { .. } => 22,
        Kind::FuseOpensOnLoad { .. } => 23,
        Kind::FuseBackupOnly { .. } => 24,
        Kind::FuseHeat { .. } => 25,
        Kind::NuisanceTrip { .. } => 26,
        Kind::LetsThrough { .. } => 27,
        Kind::StandbyDrain { .. } => 28,
        Kind::TerminationNeverReached { .. } => 29,
        Kind::TrickleNeverRecovers { .. } => 30,
        Kind::PressWhileCharging { .. } => 31,
        Kind::TrickleAboveLimit { .. } => 32,
        Kind::ChargerHot { .. } => 33,
        Kind::ParallelMismatch { .. } => 34,
        Kind::ReversedCell { .. } => 35,
        Kind::HighVoltage { .. } => 36,
        Kind::DetectionBelowWindow { .. } => 37,
        Kind::ShortAheadOfBoard { .. } => 38,
        Kind::Transport { .. } => 39,
        Kind::SwellingAndDisposal => 40,
        Kind::LoadEstimated => 41,
    }
}
