//! Hazards: every check on one design, as findings with the numbers they rest on.
//!
//! Three levels. **Stop**: somebody can be hurt, or a cell can be ruined, by one foreseeable mistake or fault. **Look**:
//! a limit is passed, or a protection is thinner than it should be. **Note**: always true, or to be known. A
//! threshold is a published one or is marked as our choice. An absent rating is not judged, and that is listed.
//! No finding is a certificate; nothing here recommends a bypass of the board.

use crate::arrangements::{self, Arranged, By, Corners, Given, Held, ShortCircuit};
use crate::board::Board;
use crate::press::{self, PressOptions, PressStart};
use crate::ratings::{Band, Charger, Contact, Fuse, LeadRating, Ratings};
use crate::report::{ChargeReport, Limit, PressEnd, Protector};
use crate::setup::{Arrangement, Setup};
use crate::units::{Amps, Celsius, Coulombs, Farads, Joules, Ohms, Seconds, Volts, Watts};
use crate::wiring::{COPPER_ALPHA_20, REFERENCE};

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
pub const TOUCH_LOOK: Celsius = Celsius(48.0);
/// Touched for half a second, bare metal burns from about here. ISO 13732-1, 4.2.1.2, as quoted.
pub const TOUCH_STOP: Celsius = Celsius(65.0);
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
        /// Rated currents of a quick fuse that carry the draw and clear in time, if any: 1.0 times the draw to a third
        /// or less of the weakest current.
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
    /// The fuse may open on the load within a press. Look.
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
    /// Nominal parts as they are wired.
    pub nominal: &'a Setup,
    /// Every tolerance at its unfavourable end.
    pub weak: &'a Setup,
    /// The board's tolerance.
    pub board: Corners<'a>,
    /// The second protector's tolerance.
    pub second: Corners<'a>,
    /// The charge of the nominal parts.
    pub charge: &'a ChargeReport,
    /// The charge of the weak parts.
    pub weak_charge: Option<&'a ChargeReport>,
    /// The charge of the nominal parts at the coldest temperature of use.
    pub cold_charge: Option<&'a ChargeReport>,
    /// Ratings and what surrounds the parts.
    pub ratings: &'a Ratings,
    /// Cold resistance of the fuse or PTC.
    pub fuse_resistance: Option<Ohms>,
}

/// All checks on one design.
pub fn hazards(c: &Circumstances<'_>) -> Hazards {
    let given =
        Given { setup: c.nominal, board: c.board, second: c.second, charge: c.charge, ratings: c.ratings };
    let look = Look {
        c,
        arranged: arrangements::arranged(&given, c.nominal.arrangement),
        draw: steady_draw(c),
        peak: charges(c).flat_map(|r| &r.presses).fold(0.0, |m: f64, p| m.max(p.summary.peak_current.0)),
    };
    let mut found = Checks::default();
    look.short(&mut found);
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

type Checks = Hazards;

impl Checks {
    /// A check that was made, and what it found.
    fn check(&mut self, found: Option<(Level, Kind)>) {
        self.checks_made += 1;
        if let Some((level, kind)) = found {
            self.findings.push(Finding { level, kind });
        }
    }

    fn cannot(&mut self, what: NotJudged) {
        self.not_judged.push(what);
    }
}

/// Every charge there is: nominal, weak, cold.
fn charges<'a>(c: &Circumstances<'a>) -> impl Iterator<Item = &'a ChargeReport> {
    [Some(c.charge), c.weak_charge, c.cold_charge].into_iter().flatten()
}

/// The largest draw at the end of a press, all charges.
fn steady_draw(c: &Circumstances<'_>) -> Amps {
    Amps(charges(c).flat_map(|r| &r.presses).fold(0.0, |m: f64, p| m.max(p.summary.current_end.0)))
}

/// The draw of a resistance in copper that settles: temperature of a body whose heat grows with it.
///
/// - `cooling_w_per_k`: above 0; `heat_w` at the temperature `t0`, growing by the fraction `alpha` per K from there.
///
/// `T = [T_a + ΔT·(1 − α·T_0)]/(1 − α·ΔT)` with `ΔT = P_0/G`; `None` where `α·ΔT ≥ 1`: it never settles.
pub fn settled(
    ambient: Celsius,
    heat_w: f64,
    t0: Celsius,
    alpha: f64,
    cooling_w_per_k: f64,
) -> Option<Celsius> {
    let rise = heat_w / cooling_w_per_k;
    let left = 1.0 - alpha * rise;
    (left > 0.0).then(|| Celsius((ambient.0 + rise * (1.0 - alpha * t0.0)) / left))
}

/// Temperature at which a group of switch pairs settles at a steady current; `None`: it never does.
///
/// - `supply`: of the protector, which sets the on-resistance.
/// - `closed`: factor on the thermal resistance, 1 in the open.
pub fn settled_switch(
    board: &Board,
    current: Amps,
    supply: Volts,
    ambient: Celsius,
    closed: f64,
) -> Option<Celsius> {
    if board.thermal_k_per_w <= 0.0 {
        return Some(ambient);
    }
    let r25 = board.on_resistance.at(supply.0) / f64::from(board.pairs);
    let heat = current.0 * current.0 * r25;
    settled(ambient, heat, Celsius(25.0), board.alpha_per_k, 1.0 / (board.thermal_k_per_w * closed))
}

/// Temperature at which a lead settles at a steady current; `None`: it never does.
///
/// - `closed`: factor on its rise, 1 in the open.
///
/// The surface is that of a bare round conductor; insulation adds to it. Heat transfer [`LEAD_COOLING`].
pub fn settled_lead(lead: &LeadRating, current: Amps, ambient: Celsius, closed: f64) -> Option<Celsius> {
    let heat_per_m = current.0 * current.0 * lead.ohm_per_m_20;
    let around_m = 2e-3 * (core::f64::consts::PI * lead.area_mm2).sqrt();
    settled(ambient, heat_per_m, REFERENCE, COPPER_ALPHA_20, LEAD_COOLING * around_m / closed)
}

/// First current between one cell and the others of a parallel group.
///
/// - `difference`: of their open-circuit voltages.
/// - `one`: `R₀` of one cell; `count`: all cells, 2 or more.
///
/// `I = ΔU/[R·n/(n − 1)]`
pub fn equalising_current(difference: Volts, one: Ohms, count: u32) -> Amps {
    let n = f64::from(count);
    difference / (one * (n / (n - 1.0)))
}

/// Energy for the transport rules, in Wh.
pub fn transport_wh(capacity: crate::units::AmpHours) -> f64 {
    TRANSPORT_VOLTAGE.0 * capacity.0
}

/// Which limit on stored charge applies to a peak voltage; `None` below [`TOUCHABLE`].
pub fn stored_tier(voltage: Volts) -> Option<StoredTier> {
    if voltage <= TOUCHABLE {
        None
    } else if voltage <= CHARGE_TIER {
        Some(StoredTier::Capacitance)
    } else if voltage <= ENERGY_TIER {
        Some(StoredTier::Charge)
    } else {
        Some(StoredTier::Energy)
    }
}

/// The largest capacitance within the limit at a peak voltage; `None` below [`TOUCHABLE`].
pub fn stored_limit(voltage: Volts) -> Option<Farads> {
    Some(match stored_tier(voltage)? {
        StoredTier::Capacitance => CAPACITANCE_LIMIT,
        StoredTier::Charge => Farads(CHARGE_LIMIT.0 / voltage.0),
        StoredTier::Energy => Farads(2.0 * ENERGY_LIMIT.0 / (voltage.0 * voltage.0)),
    })
}

/// The standard or other source that a finding rests on.
pub fn source(kind: &Kind) -> &'static str {
    const PRACTICE: &str = "common practice, no source";
    const OURS: &str = "energy balance; the threshold is our choice";
    match kind {
        Kind::ShortUnprotected { .. } => "IEC 60364-4-43, 434.5.2; IEC 60127-2",
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
        Kind::Transport { .. } => 38,
        Kind::SwellingAndDisposal => 39,
        Kind::LoadEstimated => 40,
    }
}

/// The checks, with what several of them need.
struct Look<'c, 'a> {
    c: &'c Circumstances<'a>,
    /// As it is wired.
    arranged: Arranged,
    /// Largest steady draw of a press, all cells.
    draw: Amps,
    /// Largest current of a press, all cells.
    peak: f64,
}

/// The leads' shortest time to their limit.
fn lead_limit(short: &ShortCircuit) -> Option<Seconds> {
    short.leads.iter().map(|l| l.limit).min_by(|a, b| a.0.total_cmp(&b.0))
}

impl<'a> Look<'_, 'a> {
    fn ratings(&self) -> &'a Ratings {
        self.c.ratings
    }

    fn parallel(&self) -> f64 {
        f64::from(self.c.nominal.cell.parallel)
    }

    fn closed(&self) -> f64 {
        if self.ratings().keeping.closed_case { CLOSED_CASE } else { 1.0 }
    }

    fn held(&self) -> bool {
        self.ratings().keeping.held_hours > 0.0
    }

    fn cases(&self) -> [(Case, Celsius); 2] {
        [(Case::Ambient, self.c.nominal.usage.ambient), (Case::Cold, self.ratings().keeping.cold)]
    }

    /// Weak parts with the protectors at their late corner, at an ambient temperature.
    fn weak_and_late(&self, ambient: Celsius) -> Setup {
        let mut setup = arrangements::wired(self.c.weak, self.c.nominal.arrangement);
        setup.usage.ambient = ambient;
        if let Some(board) = self.c.board.late.or(self.c.nominal.board.as_ref()) {
            setup.board = Some(board.clone());
        }
        if let Some(board) = self.c.second.late.or(self.c.nominal.second_protector.as_ref()) {
            setup.second_protector = Some(board.clone());
        }
        setup
    }

    /// Where a weak short circuit is looked at: full and empty, at ambient and cold.
    fn weak_shorts(&self) -> Vec<(Case, Setup, PressStart, ShortCircuit)> {
        let mut list = Vec::new();
        for (case, t) in self.cases() {
            let setup = self.weak_and_late(t);
            for soc in [1.0, 0.0] {
                let start = PressStart::relaxed(&setup, soc, t);
                let short = arrangements::short_circuit(&setup, &start, &self.ratings().leads);
                list.push((case, setup.clone(), start, short));
            }
        }
        list
    }

    /// When the fuse clears for certain, in the slower of the surroundings.
    fn fuse_clears(&self, current: Amps) -> Option<Seconds> {
        let fuse = self.ratings().fuse.as_ref()?;
        let [a, b] = self.cases().map(|(_, t)| arrangements::fuse_time(fuse, current, t).latest);
        Some(Seconds(a?.0.max(b?.0)))
    }

    fn short(&self, found: &mut Checks) {
        let shorts = self.weak_shorts();
        let electronic = self.arranged.over_current.iter().any(|l| l.by != By::Fuse);
        let weakest = shorts.iter().map(|(.., s)| s).min_by(|a, b| a.current.0.total_cmp(&b.current.0));
        if !electronic {
            let Some(weakest) = weakest else { return };
            let full = &self.arranged.short_full;
            let clears = self.fuse_clears(weakest.current);
            let within = |short: &ShortCircuit| {
                self.fuse_clears(short.current)
                    .is_some_and(|t| lead_limit(short).is_none_or(|limit| t.0 < limit.0))
            };
            let level = if within(full) && within(weakest) { Level::Look } else { Level::Stop };
            found.check(Some((
                level,
                Kind::ShortUnprotected {
                    arrangement: self.c.nominal.arrangement,
                    full: full.clone(),
                    weakest: weakest.current,
                    lead_limit: lead_limit(full),
                    fuse_clears: clears,
                    quick_fuse: quick_fuse(self.draw, weakest, full),
                },
            )));
            return;
        }
        // Of the surroundings and charges in which no stage opens, the one with the least current.
        let mut worst: Option<(Level, Kind)> = None;
        for (case, setup, start, short) in &shorts {
            let opens = arrangements::opens_on_short(setup, start);
            if self.a_stage_opens(setup, start) {
                continue;
            }
            let fuse_clears = self
                .fuse_clears(short.current)
                .filter(|t| lead_limit(short).is_none_or(|limit| t.0 < limit.0));
            let level = if opens.is_some() || fuse_clears.is_some() { Level::Look } else { Level::Stop };
            let kind = Kind::NeverTripsOnShort {
                case: *case,
                soc: start.soc,
                prospective: short.current,
                trip: self.lowest_trip(setup, start),
                instead: opens.map(|(by, _)| by),
                fuse_clears,
            };
            if worst.as_ref().is_none_or(|(before, _)| level < *before) {
                worst = Some((level, kind));
            }
        }
        found.check(worst);
    }

    /// Whether a current stage opens, though over-discharge detection may be quicker.
    fn a_stage_opens(&self, setup: &Setup, start: &PressStart) -> bool {
        let mut stages_only = setup.clone();
        for board in [&mut stages_only.board, &mut stages_only.second_protector].into_iter().flatten() {
            board.over_discharge = None;
        }
        arrangements::opens_on_short(&stages_only, start).is_some()
    }

    /// Lowest steady current that trips a stage.
    fn lowest_trip(&self, setup: &Setup, start: &PressStart) -> Option<Amps> {
        let boards =
            [(Protector::Board, setup.board_in_path()), (Protector::Second, setup.second_protector.as_ref())];
        boards
            .into_iter()
            .filter_map(|(protector, board)| board.map(|b| (protector, b)))
            .flat_map(|(protector, b)| b.stages.iter().map(move |stage| (protector, stage)))
            .map(|(protector, stage)| arrangements::trip_current(setup, protector, stage, start, 1.0))
            .min_by(|a, b| a.0.total_cmp(&b.0))
    }

    fn what_is_lost(&self, found: &mut Checks, given: &Given<'_>) {
        let a = &self.arranged;
        let arrangement = a.arrangement;
        found.check((arrangement != Arrangement::ThroughBoard).then(|| {
            let through = arrangements::arranged(given, Arrangement::ThroughBoard);
            let left = Layers::from(a);
            let bare = left.short_circuit == 0 || left.over_discharge == 0;
            let level = if bare { Level::Stop } else { Level::Look };
            (level, Kind::ArrangementLoses { arrangement, left, through_board: Layers::from(&through) })
        }));
        found.check(a.over_discharge.is_empty().then(|| {
            let kind = Kind::OverDischargeUnprotected { arrangement, held: a.held, standby: a.standby };
            (Level::Stop, kind)
        }));
        let window = self.ratings().cell.voltage_min;
        let lowest = a.over_discharge.iter().filter_map(|l| l.threshold).map(|t| t.low).reduce(f64::max);
        found.check(
            lowest
                .filter(|v| *v < window.0)
                .map(|v| (Level::Note, Kind::DetectionBelowWindow { threshold: Volts(v), limit: window })),
        );
    }

    /// Presses from places of the charge, with early protectors; with late ones where those open.
    fn nuisance(&self, found: &mut Checks) {
        for (case, ambient) in self.cases() {
            let charge = match case {
                Case::Ambient => Some(self.c.charge),
                Case::Cold => self.c.cold_charge,
            };
            let same = case == Case::Cold && ambient == self.c.nominal.usage.ambient;
            let Some(charge) = charge else {
                if !same {
                    found.cannot(NotJudged::ColdCharge);
                }
                continue;
            };
            let with = |setup: &Setup, early: bool| {
                let mut setup = arrangements::wired(setup, self.c.nominal.arrangement);
                setup.usage.ambient = ambient;
                let pick = |corners: &Corners<'a>| if early { corners.early } else { corners.late };
                if let Some(board) = pick(&self.c.board).or(self.c.nominal.board.as_ref()) {
                    setup.board = Some(board.clone());
                }
                if let Some(board) = pick(&self.c.second).or(self.c.nominal.second_protector.as_ref()) {
                    setup.second_protector = Some(board.clone());
                }
                setup
            };
            let early = [with(self.c.nominal, true), with(self.c.weak, true)];
            let late = with(self.c.nominal, false);
            let mut trips: Vec<(Limit, Kind)> = Vec::new();
            for start in probes(charge, &early[0]) {
                for setup in &early {
                    let Some((limit, current)) = opened(setup, &start) else { continue };
                    let certain = opened(&late, &start).is_some();
                    let draw = current * setup.load.peak_factor;
                    let trip = self.trip_band(&early[0], &late, limit, &start);
                    let known = trips.iter_mut().find(|(l, _)| *l == limit);
                    match known {
                        // The highest state of charge comes first; later ones can only make it certain.
                        Some((_, Kind::NuisanceTrip { certain: before, .. })) => *before |= certain,
                        Some(_) => {}
                        None => trips.push((
                            limit,
                            Kind::NuisanceTrip { limit, case, soc: start.soc, draw, trip, certain },
                        )),
                    }
                }
            }
            found.check(None);
            found.findings.extend(trips.into_iter().map(|(_, kind)| Finding { level: Level::Look, kind }));
        }
    }

    fn trip_band(&self, early: &Setup, late: &Setup, limit: Limit, start: &PressStart) -> Band {
        let Limit::Stage(protector, index) = limit else { return Band::exact(0.0) };
        let of = |setup: &Setup| {
            let board = match protector {
                Protector::Board => setup.board.as_ref(),
                Protector::Second => setup.second_protector.as_ref(),
            };
            board.and_then(|b| b.stages.get(index)).map_or(f64::INFINITY, |stage| {
                arrangements::trip_current(setup, protector, stage, start, 1.0).0
            })
        };
        Band { low: of(early), typical: of(self.c.nominal), high: of(late) }
    }

    fn lets_through(&self, found: &mut Checks) {
        let Some(continuous) = self.ratings().cell.continuous else { return };
        let continuous = continuous * self.parallel();
        let lasting = self
            .arranged
            .over_current
            .iter()
            .filter(|l| l.by != By::Fuse)
            .filter_map(|l| l.full)
            .map(|band| band.high)
            .reduce(f64::min);
        found.check(lasting.filter(|i| *i > continuous.0).map(|i| {
            let level = if i > LETS_THROUGH_LOOK * continuous.0 { Level::Look } else { Level::Note };
            (level, Kind::LetsThrough { lasting: Amps(i), continuous })
        }));
    }

    fn standby(&self, found: &mut Checks) {
        let storage_days = self.ratings().keeping.storage_days;
        let days = self.arranged.standby.map(|t| t.0 / 86_400.0);
        found.check(
            days.filter(|d| *d < storage_days)
                .map(|days| (Level::Look, Kind::StandbyDrain { days, storage_days })),
        );
    }

    fn over_charge(&self, found: &mut Checks) {
        let Some(charger) = &self.ratings().charger else {
            found.cannot(NotJudged::Charger);
            return;
        };
        let limit = self.ratings().cell.voltage_max;
        let layers = &self.arranged.over_charge;
        found.check(layers.is_empty().then(|| {
            let kind = Kind::NoOverChargeLayer {
                arrangement: self.arranged.arrangement,
                float: Volts(charger.float.high),
                input: charger.input,
            };
            (Level::Stop, kind)
        }));
        let float = charger.float;
        found.check((float.high > limit.0).then(|| {
            let level = if float.typical > limit.0 { Level::Stop } else { Level::Look };
            (level, Kind::FloatAboveCell { float, limit })
        }));
        // One layer that is in time suffices.
        let threshold = layers.iter().filter_map(|l| l.threshold).map(|t| t.high).reduce(f64::min);
        found.check(
            threshold
                .filter(|v| *v > limit.0 + OVER_CHARGE_ABOVE.0 + 1e-9)
                .map(|v| (Level::Stop, Kind::OverChargeTooHigh { threshold: Volts(v), limit })),
        );
    }

    fn charging(&self, found: &mut Checks) {
        let Some(charger) = &self.ratings().charger else { return };
        let cell = &self.ratings().cell;
        let n = self.parallel();
        let each = Band {
            low: charger.current.low / n,
            typical: charger.current.typical / n,
            high: charger.current.high / n,
        };
        match cell.charge {
            Some(limit) => found.check((each.high > limit.0).then(|| {
                let level = if each.typical > limit.0 { Level::Stop } else { Level::Look };
                (level, Kind::ChargeAboveLimit { current: each, limit })
            })),
            None => found.cannot(NotJudged::CellCharge),
        }
        let rate = each.typical / cell.it.0;
        found.check((rate > 1.0).then(|| {
            let allowed = cell.charge.is_some_and(|limit| each.high <= limit.0);
            (if allowed { Level::Note } else { Level::Stop }, Kind::ChargeAboveIt { rate })
        }));
        let (ambient, window) = (charger.ambient, cell.charge_window);
        found.check((ambient.0 < window.0 || ambient.1 > window.1).then(|| {
            let grave = ambient.0 < window.0 || ambient.1 > CHARGE_HOT_STOP;
            let level = if grave { Level::Stop } else { Level::Look };
            (level, Kind::ChargeTemperature { ambient, window })
        }));
        let trickle = charger.trickle.0 / n / cell.it.0;
        found.check(
            (trickle > TRICKLE_RATE * (1.0 + 1e-9))
                .then_some((Level::Look, Kind::TrickleAboveLimit { rate: trickle })),
        );
        self.charging_while_loaded(found, charger);
        // The cell is lowest, and the full current flows, where the trickle ends.
        let power = Amps(charger.current.high) * (charger.input - charger.trickle_below);
        match charger.power_limit {
            Some(limit) => {
                let limit = limit / self.closed();
                found.check((power > limit).then_some((Level::Look, Kind::ChargerHot { power, limit })));
            }
            None => found.cannot(NotJudged::ChargerPower),
        }
    }

    fn charging_while_loaded(&self, found: &mut Checks, charger: &Charger) {
        let load = charger.load_while_charging;
        found.check((load >= charger.termination).then_some((
            Level::Look,
            Kind::TerminationNeverReached { load, termination: charger.termination },
        )));
        found.check((load >= charger.trickle).then(|| {
            let bare = self.arranged.over_discharge.is_empty();
            let level = if bare { Level::Stop } else { Level::Look };
            (level, Kind::TrickleNeverRecovers { load, trickle: charger.trickle })
        }));
        let cell = Amps(charger.current.low) - self.draw;
        found.check((cell.0 < 0.0).then_some((Level::Note, Kind::PressWhileCharging { cell })));
    }

    fn cell_use(&self, found: &mut Checks) {
        let cell = &self.ratings().cell;
        let usage = &self.c.nominal.usage;
        let draw = self.draw / self.parallel();
        let cycle = usage.press.0 + usage.rest.0;
        let effective = draw * (usage.press.0 / cycle).sqrt();
        let lasts = Seconds(usage.press.0.max(3600.0 * self.ratings().keeping.held_hours));
        if cell.continuous.is_none() {
            found.cannot(NotJudged::CellContinuous);
        }
        if cell.pulse.is_none() {
            found.cannot(NotJudged::CellPulse);
        }
        let over = |limit: Option<Amps>, factor: f64, i: Amps| limit.is_some_and(|l| i.0 > factor * l.0);
        // A press no longer than a pulse may take the pulse current, if the mean allows it and no button sticks.
        let pulsed = cell.pulse.is_some() && usage.press <= cell.pulse_time;
        let gravely = over(cell.continuous, CELL_OVERLOAD_STOP, if pulsed { effective } else { draw });
        let at_all = over(cell.continuous, 1.0, if pulsed && !self.held() { effective } else { draw });
        let level = if over(cell.pulse, 1.0, draw) || gravely {
            Some(Level::Stop)
        } else {
            at_all.then_some(Level::Look)
        };
        let (continuous, pulse) = (cell.continuous, cell.pulse);
        found.check(
            level.map(|level| (level, Kind::CellOverRating { draw, effective, continuous, pulse, lasts })),
        );
        let lowest =
            charges(self.c).flat_map(|r| &r.presses).fold(f64::INFINITY, |m, p| m.min(p.summary.cell_end.0));
        found.check((lowest < cell.voltage_min.0).then(|| {
            let level = if lowest < DAMAGE_BELOW.0 { Level::Stop } else { Level::Look };
            (level, Kind::CellBelowWindow { lowest: Volts(lowest), limit: cell.voltage_min })
        }));
        let ambient = (self.ratings().keeping.cold, usage.ambient);
        let window = cell.discharge_window;
        let outside = |t: Celsius| t < window.0 || t > window.1;
        found.check(
            (outside(ambient.0) || outside(ambient.1))
                .then_some((Level::Look, Kind::DischargeTemperature { ambient, window })),
        );
    }

    fn cell_heat(&self, found: &mut Checks) {
        let setup = self.c.nominal;
        let ambient = setup.usage.ambient;
        let hottest = charges(self.c).fold(ambient.0, |m: f64, r| m.max(r.cell_temperature_max.0));
        let charge = Celsius(ambient.0 + (hottest - ambient.0) * self.closed());
        let held = self.held().then(|| self.held_cell());
        let reached = held.map_or(charge.0, |t| t.0.max(charge.0));
        let limit = self.ratings().cell.discharge_window.1;
        found.check((reached > limit.0).then(|| {
            let level = if reached > CELL_STOP.0 { Level::Stop } else { Level::Look };
            (level, Kind::CellHot { charge, held, limit })
        }));
        found.check((reached > TOUCH_LOOK.0).then(|| {
            let level = if reached > TOUCH_STOP.0 { Level::Stop } else { Level::Look };
            (level, Kind::Touch { surface: Celsius(reached) })
        }));
    }

    /// The cell at the steady draw for as long as the button is held or the charge lasts.
    fn held_cell(&self) -> Celsius {
        let cell = &self.c.nominal.cell;
        let ambient = self.c.nominal.usage.ambient;
        let i = self.draw.0;
        let slow = (0..cell.branches.len()).fold(0.0, |sum, k| sum + cell.branch_at(k, 0.5, ambient).0);
        let heat = i * i * (cell.r0_at(0.5, ambient).0 + slow);
        let lasts = (3600.0 * self.ratings().keeping.held_hours).min(cell.charge_as() / i.max(1e-9));
        let cooling = cell.cooling_w_per_k / self.closed();
        let body = (cooling, cell.heat_capacity_j_per_k);
        Celsius(arrangements::towards(ambient.0, ambient.0, heat, body, lasts))
    }

    fn switches(&self, found: &mut Checks) {
        let setup = self.c.nominal;
        let ambient = setup.usage.ambient;
        let reached = |of: fn(&ChargeReport) -> Celsius| {
            let hottest = charges(self.c).fold(ambient.0, |m: f64, r| m.max(of(r).0));
            Celsius(ambient.0 + (hottest - ambient.0) * self.closed())
        };
        let parts = [
            (Protector::Board, setup.board_in_path(), reached(|r| r.switch_temperature_max)),
            (Protector::Second, setup.second_protector.as_ref(), reached(|r| r.second_temperature_max)),
        ];
        for (protector, board, charge) in parts {
            let Some(board) = board else { continue };
            if board.thermal_k_per_w <= 0.0 {
                found.cannot(NotJudged::SwitchHeat(protector));
                continue;
            }
            // The lowest supply has the highest on-resistance.
            let supply = charges(self.c)
                .flat_map(|r| &r.presses)
                .fold(f64::INFINITY, |m, p| m.min(p.summary.board_end.0));
            let settled = settled_switch(board, self.draw, Volts(supply), ambient, self.closed());
            let runs_away = self.held() && settled.is_none();
            let held = settled.filter(|_| self.held());
            let hottest = held.map_or(charge.0, |t| t.0.max(charge.0));
            let level = if runs_away || hottest > SWITCH_STOP.0 {
                Some(Level::Stop)
            } else {
                (hottest > SWITCH_LOOK.0).then_some(Level::Look)
            };
            found.check(level.map(|level| (level, Kind::SwitchHot { protector, charge, held, runs_away })));
        }
    }

    fn leads(&self, found: &mut Checks) {
        if self.ratings().leads.is_empty() {
            found.cannot(NotJudged::Leads);
        }
        for lead in &self.ratings().leads {
            let settled = settled_lead(lead, self.draw, self.c.nominal.usage.ambient, self.closed());
            let above = |limit: Celsius| settled.is_none_or(|t| t > limit);
            found.check(above(lead.continuous).then(|| {
                let level = if above(lead.last) { Level::Stop } else { Level::Look };
                let density = self.draw.0 / lead.area_mm2;
                (level, Kind::LeadHot { cell_side: lead.cell_side, settled, limit: lead.continuous, density })
            }));
        }
    }

    fn contacts(&self, found: &mut Checks) {
        self.contact(found, ContactPart::Button, &self.ratings().button);
        self.contact(found, ContactPart::Connector, &self.ratings().connector);
    }

    fn contact(&self, found: &mut Checks, part: ContactPart, contact: &Contact) {
        let (draw, peak) = (self.draw, Amps(self.peak));
        match contact.current {
            Some(rating) => {
                found.check((draw > rating).then(|| {
                    let grave = draw.0 > CONTACT_STOP * rating.0;
                    let level = if grave { Level::Stop } else { Level::Look };
                    (level, Kind::ContactCurrent { part, draw, rating })
                }));
                found.check((peak > rating).then(|| {
                    let big = peak.0 > CONTACT_SURGE_LOOK * rating.0;
                    let level = if big { Level::Look } else { Level::Note };
                    (level, Kind::ContactSurge { part, peak, rating })
                }));
            }
            None => found.cannot(NotJudged::ContactCurrent(part)),
        }
        match contact.voltage {
            Some(rating) => {
                let voltage = self.c.nominal.cell.open_circuit(1.0, self.c.nominal.usage.ambient);
                found.check(
                    (voltage > rating)
                        .then_some((Level::Look, Kind::ContactVoltage { part, voltage, rating })),
                );
            }
            None => found.cannot(NotJudged::ContactVoltage(part)),
        }
    }

    fn fuse(&self, found: &mut Checks) {
        let Some(fuse) = &self.ratings().fuse else { return };
        let shorts = self.weak_shorts();
        let electronic = self.arranged.over_current.iter().any(|l| l.by != By::Fuse)
            && shorts.iter().all(|(_, setup, start, _)| self.a_stage_opens(setup, start));
        let prospective = self.arranged.short_full.current;
        match fuse.breaking {
            Some(breaking) => found.check((prospective > breaking).then(|| {
                let level = if electronic { Level::Look } else { Level::Stop };
                (level, Kind::FuseBreaking { prospective, breaking })
            })),
            None => found.cannot(NotJudged::FuseBreaking),
        }
        let weakest = shorts.iter().map(|(.., s)| s).min_by(|a, b| a.current.0.total_cmp(&b.current.0));
        if let Some(short) = weakest {
            let (latest, limit) = (self.fuse_clears(short.current), lead_limit(short));
            let slow = latest.is_none_or(|t| limit.is_some_and(|l| t.0 >= l.0));
            found.check(slow.then_some((
                Level::Look,
                Kind::FuseTooSlow { prospective: short.current, latest, lead_limit: limit },
            )));
        }
        self.fuse_on_load(found, fuse);
        let delay = self.arranged.short_circuit.iter().filter(|l| l.by != By::Fuse).filter_map(|l| l.delay);
        let protector = delay.map(|d| d.high).reduce(f64::min);
        let ambient = self.c.nominal.usage.ambient;
        let earliest = arrangements::fuse_time(fuse, prospective, ambient).earliest;
        found.check(
            protector
                .zip(earliest)
                .filter(|(p, f)| *p < f.0)
                .map(|(p, fuse)| (Level::Note, Kind::FuseBackupOnly { protector: Seconds(p), fuse })),
        );
        match self.c.fuse_resistance {
            Some(r) => {
                let power = Watts(self.draw.0 * self.draw.0 * r.0);
                found.check((power > FUSE_HEAT_LOOK).then_some((Level::Look, Kind::FuseHeat { power })));
            }
            None => found.cannot(NotJudged::FuseHeat),
        }
    }

    fn fuse_on_load(&self, found: &mut Checks, fuse: &Fuse) {
        let ambient = self.c.nominal.usage.ambient;
        let earliest = arrangements::fuse_time(fuse, self.draw, ambient).earliest;
        let lasts = self.c.nominal.usage.press.0.max(3600.0 * self.ratings().keeping.held_hours);
        // What it carries for good: a fuse's rated current, a PTC's hold current at this temperature.
        let rating = match fuse.kind {
            crate::ratings::FuseKind::Ptc { .. } => Amps(arrangements::fuse_band(fuse, ambient).low),
            _ => fuse.rating,
        };
        let opens = earliest.is_some_and(|t| t.0 <= lasts) || self.draw > rating;
        found.check(
            opens.then_some((Level::Look, Kind::FuseOpensOnLoad { draw: self.draw, rating, earliest })),
        );
    }

    fn wrong_cells(&self, found: &mut Checks) {
        let setup = self.c.nominal;
        let cell = &setup.cell;
        let ambient = setup.usage.ambient;
        let full = cell.open_circuit(1.0, ambient);
        // Warm cells that are full have about the least resistance.
        let one = cell.r0_at(1.0, ambient) * self.parallel();
        if cell.parallel < 2 {
            // Through the path, whose switch conducts the other way by its own diodes.
            let current = self.arranged.short_full.current;
            found.check(Some((Level::Note, Kind::ReversedCell { current })));
            return;
        }
        let reversed = equalising_current(full * 2.0, one, cell.parallel);
        found.check(Some((Level::Look, Kind::ReversedCell { current: reversed })));
        let difference = self.ratings().keeping.parallel_mismatch;
        let current = equalising_current(difference, one, cell.parallel);
        let limit = self.ratings().cell.charge.unwrap_or(self.ratings().cell.it);
        let level = if current.0 > EQUALISING_STOP * limit.0 {
            Level::Stop
        } else if current > limit {
            Level::Look
        } else {
            Level::Note
        };
        found.check(
            (difference.0 > 0.0).then_some((level, Kind::ParallelMismatch { difference, current, limit })),
        );
    }

    fn output(&self, found: &mut Checks) {
        let output = &self.ratings().output;
        let harmless = output.voltage.is_some_and(|v| v <= TOUCHABLE);
        let level = if harmless { Level::Note } else { Level::Look };
        found.check(Some((level, Kind::HighVoltage { voltage: output.voltage })));
        let Some(voltage) = output.voltage else {
            found.cannot(NotJudged::OutputVoltage);
            return;
        };
        let Some(capacitance) = output.capacitance else {
            if !harmless {
                found.cannot(NotJudged::OutputCapacitance);
            }
            return;
        };
        let charge = Coulombs(capacitance.0 * voltage.0);
        let energy = Joules(0.5 * capacitance.0 * voltage.0 * voltage.0);
        let over = stored_tier(voltage).filter(|tier| match tier {
            StoredTier::Capacitance => capacitance > CAPACITANCE_LIMIT,
            StoredTier::Charge => charge > CHARGE_LIMIT,
            StoredTier::Energy => energy > ENERGY_LIMIT,
        });
        found.check(
            over.map(|tier| (Level::Stop, Kind::StoredEnergy { tier, voltage, capacitance, charge, energy })),
        );
    }

    fn keeping(&self, found: &mut Checks) {
        let cell_wh = transport_wh(self.c.nominal.cell.capacity);
        let total_wh = cell_wh * self.parallel();
        let large = cell_wh > TRANSPORT_CELL_WH || total_wh > TRANSPORT_BATTERY_WH;
        let level = if large { Level::Look } else { Level::Note };
        found.check(Some((level, Kind::Transport { cell_wh, total_wh })));
        found.check(Some((Level::Note, Kind::SwellingAndDisposal)));
        found.check(self.ratings().load_estimated.then_some((Level::Note, Kind::LoadEstimated)));
    }
}

/// Rated currents of a quick fuse that carries a draw and clears a short circuit within the leads' limit, at the
/// weakest and at the full current.
///
/// From the gates of IEC 60127-2, sheet 2: 2.75, 4 and 10 times the rating clear within 2, 0.3 and 0.02 s. A rating of
/// at least the draw carries it.
fn quick_fuse(draw: Amps, weakest: &ShortCircuit, full: &ShortCircuit) -> Option<(Amps, Amps)> {
    // The rating that a short circuit clears in time; the fewer multiples, the larger the fuse.
    let largest = |short: &ShortCircuit| {
        let within = lead_limit(short).map_or(f64::INFINITY, |t| t.0);
        [(2.75, 2.0), (4.0, 0.3), (10.0, 0.02)]
            .into_iter()
            .find(|(_, time)| *time < within)
            .map(|(multiple, _)| short.current.0 / multiple)
    };
    let most = largest(weakest)?.min(largest(full)?);
    (draw.0 <= most).then_some((draw, Amps(most)))
}

/// Where presses of the charge are looked at: the first, three between, the last full one and the last. Relaxed, at
/// the temperatures the press before left behind: the warmest a press can begin.
fn probes(charge: &ChargeReport, setup: &Setup) -> Vec<PressStart> {
    let n = charge.presses.len();
    let last_full = charge.presses.iter().rposition(|p| p.summary.not_full.is_none()).unwrap_or(0);
    let mut at = vec![0, n / 4, n / 2, 3 * n / 4, last_full, n.saturating_sub(1)];
    at.sort_unstable();
    at.dedup();
    at.into_iter()
        .filter_map(|k| {
            let press = &charge.presses.get(k)?.summary;
            let mut start = PressStart::relaxed(setup, press.soc_start, setup.usage.ambient);
            if let Some(before) = k.checked_sub(1).map(|b| &charge.presses[b].summary) {
                start.cell_temperature = before.cell_temperature_end;
                start.switch_temperature = before.switch_temperature_end;
                start.second_temperature = before.second_temperature_end;
            }
            Some(start)
        })
        .collect()
}

/// The current stage that opens in a press, and the current just before.
fn opened(setup: &Setup, start: &PressStart) -> Option<(Limit, Amps)> {
    let summary = press::run(setup, start, &PressOptions::default()).summary;
    match summary.end {
        PressEnd::Opened(limit @ Limit::Stage(..)) => Some((limit, summary.current_end)),
        _ => None,
    }
}
