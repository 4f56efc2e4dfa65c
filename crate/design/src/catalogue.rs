//! The field catalogue: every input, once.
//!
//! Form, validation, link and design file are made from this table, so a new input is written here and
//! read in `check`. A field's text is what the person typed; tables are texts of two columns.

use crate::quantity::{Shown, Unit};

/// Which part of the design a field belongs to, in the order of the page.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Part {
    /// The cell.
    Cell,
    /// The protection board.
    Board,
    /// A second protector in the cell's wrap.
    Second,
    /// Leads, joints, fuse and switch.
    Leads,
    /// The load.
    Load,
    /// How it is used.
    Use,
    /// The charger.
    Charger,
}

/// All parts, in order, with how the page names them.
pub const PARTS: [(Part, &str); 7] = [
    (Part::Cell, "Cell"),
    (Part::Board, "Board"),
    (Part::Leads, "Leads and switch"),
    (Part::Load, "Load"),
    (Part::Use, "Use"),
    (Part::Charger, "Charger"),
    (Part::Second, "Second protector, in the cell's wrap"),
];

/// What a field takes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Kind {
    /// A quantity from `min` to `max`, in the base unit.
    Quantity {
        /// Unit and how it is shown.
        shown: Shown,
        /// The least that is accepted.
        min: f64,
        /// The most that is accepted.
        max: f64,
        /// May be left empty.
        optional: bool,
        /// The usual tolerance either way, as a fraction, where the field has one.
        tolerance: Option<f64>,
    },
    /// One of a list: (key, label).
    Choice(&'static [(&'static str, &'static str)]),
    /// Rows of two numbers, x rising; may be left empty where `optional`.
    Table {
        /// What the first column is.
        x: Shown,
        /// What the second column is.
        y: Shown,
        /// May be left empty.
        optional: bool,
    },
}

/// When a field matters: always, or only with a choice elsewhere.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum When {
    /// Always.
    Always,
    /// Only while the field with this key matters itself and is one of these.
    Is(&'static str, &'static [&'static str]),
}

/// One input.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Field {
    /// Its name in files and links, `part.name`.
    pub key: &'static str,
    /// Which part it belongs to.
    pub part: Part,
    /// What the page calls it.
    pub label: &'static str,
    /// What it is and where to read it.
    pub help: &'static str,
    /// What it takes.
    pub kind: Kind,
    /// What stands there at first.
    pub default: &'static str,
    /// Shown at once; the others are folded.
    pub everyday: bool,
    /// When it matters.
    pub when: When,
}

const fn shown(unit: Unit, text: &'static str, worth: f64) -> Shown {
    Shown { unit, text, worth }
}

const V: Shown = shown(Unit::Volt, "V", 1.0);
const MV: Shown = shown(Unit::Volt, "mV", 1e-3);
const A: Shown = shown(Unit::Ampere, "A", 1.0);
const MA: Shown = shown(Unit::Ampere, "mA", 1e-3);
const A2S: Shown = shown(Unit::SquareAmpereSecond, "A²s", 1.0);
const KV: Shown = shown(Unit::Volt, "kV", 1e3);
const NF: Shown = shown(Unit::Farad, "nF", 1e-9);
const UH: Shown = shown(Unit::Henry, "µH", 1e-6);
const KHZ: Shown = shown(Unit::Hertz, "kHz", 1e3);
const MM: Shown = shown(Unit::Metre, "mm", 1e-3);
const HOURS: Shown = shown(Unit::Second, "h", 3600.0);
const DAYS: Shown = shown(Unit::Second, "d", 86_400.0);
const UA: Shown = shown(Unit::Ampere, "µA", 1e-6);
const OHM: Shown = shown(Unit::Ohm, "Ω", 1.0);
const MOHM: Shown = shown(Unit::Ohm, "mΩ", 1e-3);
const AH: Shown = shown(Unit::AmpereHour, "Ah", 1.0);
const UF: Shown = shown(Unit::Farad, "µF", 1e-6);
const S: Shown = shown(Unit::Second, "s", 1.0);
const MS: Shown = shown(Unit::Second, "ms", 1e-3);
const W: Shown = shown(Unit::Watt, "W", 1.0);
const DEG: Shown = shown(Unit::Celsius, "°C", 1.0);
const M: Shown = shown(Unit::Metre, "m", 1.0);
const MM2: Shown = shown(Unit::Section, "mm²", 1.0);
const RATIO: Shown = shown(Unit::Ratio, "", 1.0);
const PERCENT: Shown = shown(Unit::Ratio, "%", 0.01);
const COUNT: Shown = shown(Unit::Count, "", 1.0);
const JK: Shown = shown(Unit::HeatCapacity, "J/K", 1.0);
const WK: Shown = shown(Unit::Cooling, "W/K", 1.0);
const KW: Shown = shown(Unit::ThermalResistance, "K/W", 1.0);
const KJMOL: Shown = shown(Unit::Activation, "kJ/mol", 1e3);
const PERK: Shown = shown(Unit::PerKelvin, "%/K", 0.01);
const MVK: Shown = shown(Unit::VoltPerKelvin, "mV/K", 1e-3);

const fn needs(shown: Shown, min: f64, max: f64) -> Kind {
    Kind::Quantity { shown, min, max, optional: false, tolerance: None }
}

const fn may(shown: Shown, min: f64, max: f64) -> Kind {
    Kind::Quantity { shown, min, max, optional: true, tolerance: None }
}

const fn about(shown: Shown, min: f64, max: f64, tolerance: f64) -> Kind {
    Kind::Quantity { shown, min, max, optional: false, tolerance: Some(tolerance) }
}

const fn may_about(shown: Shown, min: f64, max: f64, tolerance: f64) -> Kind {
    Kind::Quantity { shown, min, max, optional: true, tolerance: Some(tolerance) }
}

const fn table(x: Shown, y: Shown) -> Kind {
    Kind::Table { x, y, optional: true }
}

macro_rules! fields {
    ($($key:literal $part:ident $mark:ident $when:expr, $label:literal, $kind:expr, $default:literal, $help:literal;)*) => {
        &[$(Field {
            key: $key,
            part: Part::$part,
            label: $label,
            help: $help,
            kind: $kind,
            default: $default,
            everyday: fields!(@ $mark),
            when: $when,
        }),*]
    };
    (@ plain) => { true };
    (@ folded) => { false };
}

const ALWAYS: When = When::Always;
const SECOND: When = When::Is("second.fitted", &["yes"]);
const LABEL: When = When::Is("cell.route", &["typical", "measured"]);
const ONE_READING: When = When::Is("cell.route", &["measured"]);
const SAG: When = When::Is("cell.route", &["sag"]);
const BRANCHES: When = When::Is("cell.route", &["branches"]);

const FUSED: When = When::Is("leads.fuse", &["quick", "lag", "i2t", "ptc"]);
const MELTS: When = When::Is("leads.fuse", &["quick", "lag", "i2t"]);
const PTC: When = When::Is("leads.fuse", &["ptc"]);
const MEASURED: When = When::Is("load.known", &["measured"]);
const ESTIMATED: When = When::Is("load.known", &["estimated"]);
const CHARGER: When = When::Is("charger.fitted", &["yes"]);

const YES_NO: Kind = Kind::Choice(&[("no", "none"), ("yes", "fitted")]);
const SENSE: Kind = Kind::Choice(&[("pair", "over the switch pair"), ("shunt", "over a shunt")]);

/// Every input.
pub const FIELDS: &[Field] = fields![
    // Cell
    "cell.chemistry" Cell plain ALWAYS, "Kind of cell", Kind::Choice(&[
        ("lco_pouch", "Polymer pouch (LCO)"), ("nmc_pouch", "Pouch (NMC)"),
        ("nmc_cylinder", "Cylinder (NMC or NCA)"), ("lfp_cylinder", "Cylinder (LFP)"),
    ]), "lco_pouch", "Sets the voltage curve and how resistance goes with charge and temperature. A flat foil cell marked 3.7 V is usually the polymer pouch.";
    "cell.capacity" Cell plain ALWAYS, "Capacity", needs(AH, 0.01, 500.0), "1.1 Ah", "Of one cell, as its label says.";
    "cell.route" Cell plain ALWAYS, "Resistance known from", Kind::Choice(&[
        ("typical", "its kind and capacity (a guess)"), ("measured", "a reading after 10 s"),
        ("sag", "a sag under a known load"), ("branches", "its own branches"),
    ]), "typical", "The 1 kHz figure of a meter is a floor: what the cell shows after seconds is several times higher. A sag reading under the real current is worth most.";
    "cell.r_10s" Cell plain ONE_READING, "Resistance after 10 s", may_about(MOHM, 1e-4, 10.0, 0.1), "", "Voltage drop over current, ten seconds into a steady load, near half charge and 25 °C, one cell.";
    "cell.sag_rested" Cell plain SAG, "Rested voltage", may(V, 1.5, 4.6), "", "Before the load, after an hour's rest.";
    "cell.sag_loaded" Cell plain SAG, "Voltage under load", may(V, 1.0, 4.6), "", "At the cell's own terminals.";
    "cell.sag_current" Cell plain SAG, "Load current", may(A, 0.01, 200.0), "", "While the loaded voltage was read.";
    "cell.sag_time" Cell plain SAG, "Read after", needs(S, 0.1, 600.0), "10 s", "From switching the load on to the reading.";
    "cell.continuous" Cell folded ALWAYS, "Continuous current", may(A, 0.01, 1000.0), "", "What the maker allows one cell for good. Left empty: not judged.";
    "cell.pulse" Cell folded ALWAYS, "Pulse current", may(A, 0.01, 1000.0), "", "What the maker allows one cell for a short time. Data sheet: pulse or peak discharge current. Left empty: not judged.";
    "cell.pulse_time" Cell folded ALWAYS, "Pulse current, for", needs(S, 1e-3, 600.0), "10 s", "How long the pulse current may last, from the same line of the data sheet.";
    "cell.charge" Cell folded ALWAYS, "Charge current, most", may(A, 0.001, 1000.0), "", "What the maker allows one cell. Data sheet: maximum charge current, often 0.5 to 1 times the capacity. Left empty: not judged.";
    "cell.voltage_max" Cell folded ALWAYS, "Charge voltage, most", may(V, 1.5, 5.0), "", "Data sheet: charge voltage limit. Left empty: that of the kind of cell.";
    "cell.voltage_min" Cell folded ALWAYS, "Discharge voltage, least", may(V, 0.5, 4.5), "", "Data sheet: discharge cut-off voltage. Left empty: that of the kind of cell.";
    "cell.discharge_cold" Cell folded ALWAYS, "Coldest in use", needs(DEG, -60.0, 60.0), "-20 °C", "Data sheet: operating temperature, discharge. The cell's own temperature.";
    "cell.discharge_hot" Cell folded ALWAYS, "Hottest in use", needs(DEG, 0.0, 120.0), "60 °C", "Data sheet: operating temperature, discharge.";
    "cell.charge_cold" Cell folded ALWAYS, "Coldest in charge", needs(DEG, -60.0, 60.0), "0 °C", "Data sheet: operating temperature, charge. Below it the cell is damaged for good.";
    "cell.charge_hot" Cell folded ALWAYS, "Hottest in charge", needs(DEG, 0.0, 120.0), "45 °C", "Data sheet: operating temperature, charge.";
    "cell.parallel" Cell folded ALWAYS, "Cells in parallel", needs(COUNT, 1.0, 20.0), "1", "Equal cells, joined for good.";
    "cell.mismatch" Cell folded ALWAYS, "Parallel cells differ by", needs(V, 0.0, 4.2), "0 V", "Difference of the rested voltages when the cells are joined; a meter shows it. Counts with two or more cells in parallel.";
    "cell.health" Cell folded ALWAYS, "Capacity left with age", needs(PERCENT, 0.2, 1.0), "100 %", "100 % when new; 80 % is the usual end of life.";
    "cell.growth" Cell folded ALWAYS, "Resistance growth with age", needs(RATIO, 0.5, 10.0), "1", "1 when new; about 2 at the end of life.";
    "cell.tolerance" Cell folded LABEL, "Resistance may be higher by", needs(PERCENT, 0.0, 2.0), "25 %", "The weak corner takes every resistance of the cell higher by this.";
    "cell.r0" Cell folded BRANCHES, "Ohmic resistance", may(MOHM, 1e-5, 10.0), "", "R₀ of one cell at half charge and 25 °C.";
    "cell.r1" Cell folded BRANCHES, "Branch 1", may(MOHM, 0.0, 10.0), "", "At half charge and 25 °C, one cell.";
    "cell.tau1" Cell folded BRANCHES, "Branch 1, time constant", needs(S, 0.01, 1e5), "1.5 s", "Seconds.";
    "cell.r2" Cell folded BRANCHES, "Branch 2", may(MOHM, 0.0, 10.0), "", "At half charge and 25 °C, one cell.";
    "cell.tau2" Cell folded BRANCHES, "Branch 2, time constant", needs(S, 0.01, 1e5), "30 s", "About a minute.";
    "cell.r3" Cell folded BRANCHES, "Branch 3", may(MOHM, 0.0, 10.0), "", "At half charge and 25 °C, one cell.";
    "cell.tau3" Cell folded BRANCHES, "Branch 3, time constant", needs(S, 0.01, 1e5), "250 s", "Minutes.";
    "cell.ocv" Cell folded ALWAYS, "Voltage curve of your own", table(RATIO, V), "", "Charge (0 to 1) and rested voltage, a pair a line, both rising, from 0 to 1. Replaces the shipped curve.";
    "cell.entropy" Cell folded ALWAYS, "Its change with temperature", table(RATIO, MVK), "", "Charge (0 to 1) and mV per K, a pair a line. Left empty: the shipped one.";
    "cell.r0_shape" Cell folded ALWAYS, "Shape of R₀ over charge", table(RATIO, RATIO), "", "Charge (0 to 1) and factor, 1 at half charge, a pair a line.";
    "cell.branch_shape" Cell folded ALWAYS, "Shape of the branches over charge", table(RATIO, RATIO), "", "Charge (0 to 1) and factor, 1 at half charge, a pair a line.";
    "cell.r0_activation" Cell folded ALWAYS, "Activation energy of R₀", may(KJMOL, 0.0, 80e3), "", "How fast R₀ rises in the cold. Published: 17 to 55 kJ/mol.";
    "cell.branch_activation" Cell folded ALWAYS, "Activation energy of the branches", may(KJMOL, 0.0, 80e3), "", "The same for the slow part. Published: 20 to 40 kJ/mol.";
    "cell.heat" Cell folded ALWAYS, "Heat capacity", may(JK, 0.1, 1e6), "", "Of all cells together; about 1 J/K per gram of cell.";
    "cell.cooling" Cell folded ALWAYS, "Cooling", may(WK, 0.0, 1e4), "", "Heat let go per K above ambient by all cells together; about 10 W/(m²·K) in the open, half of it in a closed case.";
    // Board
    "board.arrangement" Board plain ALWAYS, "Load is wired", Kind::Choice(&[
        ("through_board", "through the board"), ("load_at_cell", "at the cell, before the board"),
        ("switch_bridged", "with the board's switch bridged"), ("no_board", "without a board"),
    ]), "through_board", "Only through the board does anything open on a short or an empty cell.";
    "board.stage1" Board plain ALWAYS, "Over-current sense voltage", may_about(MV, 1e-3, 10.0, 0.2), "150 ± 30 mV", "Data sheet of the protector: over-current detection voltage. The classes at hand: 50 to 200 mV.";
    "board.delay1" Board plain ALWAYS, "Over-current delay", about(MS, 0.0, 100.0, 0.4), "10 ± 4 ms", "Data sheet: over-current detection delay.";
    "board.pair" Board plain ALWAYS, "Switch pair, at 3.8 V", about(MOHM, 1e-4, 10.0, 0.2), "50 ± 10 mΩ", "Both switches in series, cold. Twice the on-resistance of one at 3.8 V gate, or measure the voltage over the pair at a known current.";
    "board.pairs" Board plain ALWAYS, "Pairs in parallel", needs(COUNT, 1.0, 20.0), "1", "Count the eight-legged packages: mostly one pair each.";
    "board.stage2" Board folded ALWAYS, "Second level", may_about(MV, 1e-3, 10.0, 0.2), "", "Sense voltage, where the protector has a second over-current level.";
    "board.delay2" Board folded ALWAYS, "Second level, delay", about(MS, 0.0, 100.0, 0.2), "2.2 ms", "Its delay.";
    "board.stage3" Board folded ALWAYS, "Short-circuit sense voltage", may_about(MV, 1e-3, 10.0, 0.3), "1 V", "Data sheet: short-circuit detection voltage, 0.7 to 1.4 V.";
    "board.delay3" Board folded ALWAYS, "Short-circuit delay", about(MS, 0.0, 100.0, 0.4), "0.3 ms", "Data sheet: short-circuit detection delay.";
    "board.limit4" Board folded ALWAYS, "A limit in amps", may_about(A, 0.01, 1000.0, 0.1), "", "For a board that measures the current itself.";
    "board.delay4" Board folded ALWAYS, "A limit in amps, delay", about(MS, 0.0, 100.0, 0.2), "10 ms", "Its delay.";
    "board.od" Board folded ALWAYS, "Over-discharge voltage", may_about(V, 0.5, 4.0, 0.04), "2.4 ± 0.1 V", "Data sheet: over-discharge detection voltage.";
    "board.od_delay" Board folded ALWAYS, "Over-discharge delay", about(MS, 0.0, 1000.0, 0.5), "40 ms", "Data sheet: over-discharge detection delay.";
    "board.oc" Board folded ALWAYS, "Over-charge voltage", may_about(V, 2.0, 6.0, 0.012), "4.3 ± 0.05 V", "Data sheet: over-charge detection voltage. Left empty: the board has none, or it is not known.";
    "board.charge_sense" Board folded ALWAYS, "Charge over-current sense voltage", may_about(MV, 1e-3, 10.0, 0.2), "", "Data sheet: charge over-current detection voltage, without its minus sign. Many protectors have none: leave it empty.";
    "board.release" Board folded ALWAYS, "Conducts again", Kind::Choice(&[
        ("load_removed", "when the load is taken away"), ("retry", "by itself, after a while"),
        ("charger", "when a charger is connected"),
    ]), "load_removed", "After a trip.";
    "board.retry" Board folded When::Is("board.release", &["retry"]), "Tries again every", needs(S, 1e-3, 1e4), "1 s", "Time between two tries.";
    "board.sense" Board folded ALWAYS, "Senses", SENSE, "pair", "A low-value resistor beside the protector is a shunt.";
    "board.shunt" Board folded ALWAYS, "Shunt", needs(MOHM, 0.0, 1.0), "0 mΩ", "0 where there is none.";
    "board.on" Board folded ALWAYS, "Pair over gate voltage", table(V, MOHM), "", "Gate voltage and mΩ of one pair, a pair a line, not rising. Left empty: a usual shape through the figure at 3.8 V; its tolerance counts here too.";
    "board.alpha" Board folded ALWAYS, "Pair, change with temperature", needs(PERK, 0.0, 0.05), "0.4 %/K", "Common engineering law: 0.4 % per K.";
    "board.thermal" Board folded ALWAYS, "Pair, thermal resistance", needs(KW, 0.0, 1000.0), "60 K/W", "Of the whole group of pairs to the air.";
    "board.thermal_time" Board folded ALWAYS, "Pair, thermal time constant", needs(S, 1e-3, 1e4), "8 s", "Package and a little copper: seconds.";
    "board.supply" Board folded ALWAYS, "Own supply current", needs(UA, 0.0, 1.0), "5 µA", "Drawn in rests.";
    // Leads
    "leads.cell_length" Leads plain ALWAYS, "Cell to board, one way", needs(M, 0.0, 20.0), "0.05 m", "Length of one conductor; both ways are counted.";
    "leads.cell_section" Leads plain ALWAYS, "Cell to board, section", needs(MM2, 0.005, 100.0), "0.75 mm²", "In mm² or AWG.";
    "leads.load_length" Leads plain ALWAYS, "Board to load, one way", needs(M, 0.0, 20.0), "0.1 m", "Length of one conductor; both ways are counted.";
    "leads.load_section" Leads plain ALWAYS, "Board to load, section", needs(MM2, 0.005, 100.0), "0.75 mm²", "In mm² or AWG.";
    "leads.conductor" Leads folded ALWAYS, "Conductor", Kind::Choice(&[
        ("flexible", "flexible, class 5"), ("tinned", "flexible, tinned, class 5"), ("solid", "solid, class 1"),
        ("ideal", "pure copper"),
    ]), "flexible", "The class's largest resistance is taken; pure copper is the least it can be.";
    "leads.temperature" Leads folded ALWAYS, "Conductor temperature", needs(DEG, -40.0, 120.0), "20 °C", "Copper gains 0.39 % per K.";
    "leads.insulation" Leads folded ALWAYS, "Insulation", Kind::Choice(&[
        ("unknown", "not known"), ("pvc", "PVC"), ("xlpe", "cross-linked PE or rubber"), ("silicone", "silicone"),
    ]), "pvc", "Printed on the wire or its reel; most hook-up wire is PVC. Says how hot a lead may get in a short. Not known: not judged.";
    "leads.cell_joints" Leads folded ALWAYS, "Joints ahead of the board", needs(MOHM, 0.0, 10.0), "4 mΩ", "Connector and solder joints between cell and board, all together, without the fuse.";
    "leads.load_joints" Leads folded ALWAYS, "Joints after the board", needs(MOHM, 0.0, 10.0), "4 mΩ", "Connector and solder joints between board and load, all together.";
    "leads.switch" Leads plain ALWAYS, "Push button", about(MOHM, 0.0, 10.0, 0.5), "10 mΩ", "Contact resistance; a small tactile switch has 30 to 100 mΩ.";
    "leads.fuse" Leads folded ALWAYS, "Fuse between cell and board", Kind::Choice(&[
        ("none", "none"), ("quick", "quick acting, F (IEC 60127-2)"), ("lag", "time-lag, T (IEC 60127-2)"),
        ("i2t", "another, by its melting I²t"), ("ptc", "resettable (PTC)"),
    ]), "none", "F or T stands on the cap of a miniature fuse, before the amps.";
    "leads.fuse_rating" Leads folded FUSED, "Fuse, rated current", needs(A, 0.01, 100.0), "4 A", "On its cap. Of a PTC: the hold current at 23 °C, from its data sheet.";
    "leads.fuse_cold" Leads folded FUSED, "Fuse, resistance", about(MOHM, 0.0, 10.0, 0.2), "17 mΩ", "Data sheet: cold resistance; or measure it with four wires. Of a PTC: after it has tripped once, the most.";
    "leads.fuse_i2t" Leads folded When::Is("leads.fuse", &["i2t"]), "Fuse, melting I²t", may_about(A2S, 1e-6, 1e6, 0.3), "", "Data sheet: melting or pre-arcing I²t. Fuses of one rating differ six-fold, so there is no usual value.";
    "leads.fuse_breaking" Leads folded MELTS, "Fuse, breaking capacity", may(A, 0.1, 1e6), "", "Data sheet: the largest current it can interrupt, at d.c. Left empty: not judged.";
    "leads.ptc_trip" Leads folded PTC, "PTC, trip current", may(A, 0.01, 1000.0), "", "Data sheet: trip current at 23 °C. Left empty: twice the rated current.";
    "leads.ptc_time" Leads folded PTC, "PTC, time to trip", needs(S, 1e-3, 1e4), "20 s", "Data sheet: longest time to trip, at the current below.";
    "leads.ptc_at" Leads folded PTC, "PTC, that time is at", may(A, 0.01, 1000.0), "", "The current beside the time to trip. Left empty: five times the rated current.";
    "leads.button_current" Leads folded ALWAYS, "Push button, rated current", may(A, 1e-3, 1000.0), "", "On the switch or in its data sheet; the figure for d.c. A small tactile switch stands 0.05 A. Left empty: not judged.";
    "leads.button_voltage" Leads folded ALWAYS, "Push button, rated voltage", may(V, 0.1, 1000.0), "", "Beside the current; the figure for d.c. Left empty: not judged.";
    "leads.connector_current" Leads folded ALWAYS, "Connector, rated current", may(A, 1e-3, 1000.0), "", "Of the weakest connector on the way from cell to load, per contact. Left empty: not judged.";
    "leads.connector_voltage" Leads folded ALWAYS, "Connector, rated voltage", may(V, 0.1, 1000.0), "", "From the same data sheet. Left empty: not judged.";
    // Load
    "load.law" Load plain ALWAYS, "Draw when lit", Kind::Choice(&[
        ("table", "measured: volts and amps"), ("current", "the same current"), ("power", "the same power"),
        ("resistance", "a resistance"),
    ]), "table", "Best from a bench supply: set a voltage, read the current, three to six times.";
    "load.table" Load plain When::Is("load.law", &["table"]), "Volts and amps, lit", table(V, A), "", "At the load's own terminals, a pair a line; paste two columns.";
    "load.current" Load plain When::Is("load.law", &["current"]), "Current when lit", needs(A, 0.001, 500.0), "2.5 A", "While the arc is on.";
    "load.power" Load plain When::Is("load.law", &["power"]), "Power when lit", needs(W, 0.001, 2000.0), "9 W", "While the arc is on.";
    "load.resistance" Load plain When::Is("load.law", &["resistance"]), "Resistance when lit", needs(OHM, 0.001, 1e5), "1.4 Ω", "While the arc is on.";
    "load.known" Load plain ALWAYS, "Strike voltage known from", Kind::Choice(&[
        ("measured", "the bench supply"), ("estimated", "its windings (an estimate)"),
    ]), "measured", "For a resonant push-pull driver that nobody has measured yet, its turns and gap give a band. Measure it before you build.";
    "load.strike" Load plain MEASURED, "Strikes at", about(V, 0.3, 60.0, 0.02), "3.3 V", "Lowest voltage at the load's terminals at which the arc ignites. Turn the bench supply up slowly.";
    "load.primary" Load plain ESTIMATED, "Primary turns, both halves", needs(COUNT, 1.0, 1000.0), "4", "Of the whole primary: 2 + 2 are 4. Count them.";
    "load.secondary" Load plain ESTIMATED, "Secondary turns", needs(COUNT, 1.0, 100_000.0), "600", "From the transformer's description, or counted when it is wound.";
    "load.gap" Load plain ESTIMATED, "Gap", needs(MM, 1e-4, 20e-3), "1.5 mm", "Shortest way through the air between the electrodes.";
    "load.electrodes" Load folded ESTIMATED, "Electrodes", Kind::Choice(&[
        ("unknown", "not known"), ("points", "points or thin wires"), ("smooth", "large and smooth"),
    ]), "points", "Points break down at a fraction of what smooth electrodes take. Not known: from one to the other.";
    "load.altitude" Load folded ESTIMATED, "Altitude", needs(M, -400.0, 6000.0), "0 m", "Above the sea. Thin air breaks down sooner.";
    "load.tank" Load folded ESTIMATED, "Resonance known from", Kind::Choice(&[
        ("unknown", "not known"), ("values", "capacitance and inductance"),
        ("frequencies", "the frequency with and without the capacitor"),
    ]), "unknown", "Gives the frequency and the current in the tank's capacitors; the strike voltage does not need it.";
    "load.tank_capacitance" Load folded When::Is("load.tank", &["values", "frequencies"]), "Tank capacitor", may(NF, 1e-12, 1e-3), "", "Over the whole primary; printed on it. Several in parallel add up.";
    "load.tank_inductance" Load folded When::Is("load.tank", &["values"]), "Primary inductance", may(UH, 1e-9, 1.0), "", "Of the whole primary, secondary open; with an LCR meter.";
    "load.tank_alone" Load folded When::Is("load.tank", &["frequencies"]), "Frequency without the capacitor", may(KHZ, 1e2, 1e8), "", "Resonance of the primary by itself: signal generator through a large resistor, and an oscilloscope; never with the driver running.";
    "load.tank_with" Load folded When::Is("load.tank", &["frequencies"]), "Frequency with it", may(KHZ, 1e2, 1e8), "", "The same with the tank capacitor connected.";
    "load.hold" Load plain ALWAYS, "Holds down to", needs(V, 0.2, 60.0), "3 V", "Lowest voltage at which a lit arc stays. Below the strike voltage.";
    "load.start" Load folded ALWAYS, "Runs from", needs(V, 0.1, 60.0), "2.4 V", "Its oscillator runs from here. Below the hold voltage.";
    "load.strike_time" Load folded ALWAYS, "Time to strike", needs(MS, 1e-5, 100.0), "2 ms", "How long the strike voltage must stand.";
    "load.unlit" Load folded ALWAYS, "Draw without an arc", needs(OHM, 0.01, 1e6), "8 Ω", "Running but not lit, as a resistance: volts over amps.";
    "load.stall" Load folded ALWAYS, "Draw when stalled", may(OHM, 0.005, 1e6), "", "Below the voltage it runs from, as a resistance. Left empty: as without an arc.";
    "load.surge" Load folded ALWAYS, "Surge at start", needs(A, 0.0, 500.0), "0 A", "Extra current when it starts to run.";
    "load.surge_time" Load folded ALWAYS, "Surge, time constant", needs(MS, 1e-5, 100.0), "1 ms", "It falls to a third in this time.";
    "load.capacitance" Load folded ALWAYS, "Input capacitor", needs(UF, 1e-6, 10.0), "100 µF", "At least 1 µF.";
    "load.esr" Load folded ALWAYS, "Its series resistance", needs(MOHM, 0.0, 10.0), "0 mΩ", "0 for ceramic capacitors.";
    "load.peak" Load folded ALWAYS, "Peak over mean of the draw", needs(RATIO, 1.0, 10.0), "1", "The board sees peaks: 1 for a smooth draw.";
    "load.output" Load folded ALWAYS, "Output voltage, peak", may(KV, 1.0, 1e6), "", "From the driver's description. Do not measure it with a common meter: it is made for less. Left empty: not judged.";
    "load.output_capacitance" Load folded ALWAYS, "Capacitance on the output", may(NF, 0.0, 1e-3), "", "Of a capacitor that is charged to the output voltage; 0 where there is none. Left empty: not judged.";
    // Use
    "use.press" Use plain ALWAYS, "Press", needs(S, 0.01, 3600.0), "4 s", "How long the button is held.";
    "use.rest" Use plain ALWAYS, "Rest", needs(S, 0.0, 1e7), "8 s", "Between two presses.";
    "use.ambient" Use plain ALWAYS, "Temperature", needs(DEG, -40.0, 70.0), "20 °C", "Of the surroundings; the cell starts with it.";
    "use.presses" Use folded ALWAYS, "Follow at most", needs(COUNT, 1.0, 20_000.0), "5000", "Presses per charge; a charge that goes on is ended there, and says so.";
    "use.per_day" Use folded ALWAYS, "Presses a day", needs(COUNT, 0.0, 10_000.0), "20", "For how many days a charge lasts. 0: not asked.";
    "use.storage" Use folded ALWAYS, "Days on the shelf", needs(DAYS, 0.0, 3650.0 * 86_400.0), "180 d", "Longest time between two charges. 0: not asked.";
    "use.held" Use folded ALWAYS, "Held by accident for", needs(HOURS, 0.0, 1000.0 * 3600.0), "1 h", "In a pocket, or a button that sticks. 0: not asked.";
    "use.cold" Use folded ALWAYS, "Coldest use", may(DEG, -40.0, 70.0), "0 °C", "Of the surroundings. Left empty, or above the temperature: the temperature itself.";
    "use.case" Use folded ALWAYS, "Case", Kind::Choice(&[("open", "open"), ("closed", "closed")]), "closed", "A closed case lets about half the heat go.";
    // Charger
    "charger.fitted" Charger plain ALWAYS, "Charger", YES_NO, "no", "A linear charger for one cell, on the protection board or beside it.";
    "charger.current" Charger plain CHARGER, "Charge current", about(A, 1e-3, 50.0, 0.1), "1 A", "Set by a resistor on the charger; most are sold at 1 A. Of the charger, not of one cell.";
    "charger.float" Charger folded CHARGER, "Charge voltage", about(V, 2.0, 5.0, 0.015), "4.2 V", "Data sheet: float or regulation voltage.";
    "charger.termination" Charger folded CHARGER, "Ends at", may(A, 1e-4, 50.0), "", "It ends when its current falls below this. Data sheet: termination current. Left empty: a tenth of the charge current.";
    "charger.trickle_below" Charger folded CHARGER, "Trickle below", needs(V, 0.0, 4.5), "2.9 V", "Below this it gives the trickle current only. Data sheet: trickle or pre-charge threshold.";
    "charger.trickle" Charger folded CHARGER, "Trickle current", may(A, 0.0, 50.0), "", "Data sheet: trickle or pre-charge current. Left empty: a tenth of the charge current.";
    "charger.supply" Charger folded CHARGER, "Supply", needs(V, 2.5, 30.0), "5 V", "What feeds it; 5 V from a USB port.";
    "charger.load" Charger folded CHARGER, "Drawn meanwhile", needs(MA, 0.0, 50.0), "0 mA", "What stays connected to the cell and draws current while it is charged, button not pressed.";
    "charger.cold" Charger folded CHARGER, "Charged from", needs(DEG, -40.0, 70.0), "10 °C", "Coldest surroundings in which it is charged.";
    "charger.hot" Charger folded CHARGER, "Charged up to", needs(DEG, -40.0, 70.0), "30 °C", "Hottest surroundings in which it is charged.";
    "charger.power" Charger folded CHARGER, "Power it stands", may(W, 0.01, 100.0), "", "Heat at which the charger folds back, as it is mounted. Left empty: not judged.";
    // Second protector
    "second.fitted" Second folded ALWAYS, "Second protector", YES_NO, "no", "Many pouch cells carry a strip with a protector of their own under the tape.";
    "second.stage1" Second folded SECOND, "Over-current sense voltage", may_about(MV, 1e-3, 10.0, 0.2), "150 ± 30 mV", "As for the board.";
    "second.delay1" Second folded SECOND, "Over-current delay", about(MS, 0.0, 100.0, 0.4), "10 ± 4 ms", "As for the board.";
    "second.pair" Second folded SECOND, "Switch pair, at 3.8 V", about(MOHM, 1e-4, 10.0, 0.2), "40 ± 8 mΩ", "As for the board.";
    "second.pairs" Second folded SECOND, "Pairs in parallel", needs(COUNT, 1.0, 20.0), "1", "As for the board.";
    "second.od" Second folded SECOND, "Over-discharge voltage", may_about(V, 0.5, 4.0, 0.04), "2.8 ± 0.1 V", "As for the board.";
    "second.od_delay" Second folded SECOND, "Over-discharge delay", about(MS, 0.0, 1000.0, 0.5), "100 ms", "As for the board.";
    "second.oc" Second folded SECOND, "Over-charge voltage", may_about(V, 2.0, 6.0, 0.012), "4.28 ± 0.05 V", "As for the board.";
    "second.charge_sense" Second folded SECOND, "Charge over-current sense voltage", may_about(MV, 1e-3, 10.0, 0.2), "", "As for the board.";
];

/// The field with this key.
pub fn field(key: &str) -> Option<&'static Field> {
    FIELDS.iter().find(|f| f.key == key)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn law_keys_are_unique_and_belong_to_their_part() {
        for (k, f) in FIELDS.iter().enumerate() {
            assert!(FIELDS[..k].iter().all(|other| other.key != f.key), "{} stands twice", f.key);
            assert!(f.key.contains('.') && f.help.ends_with('.'), "{}", f.key);
        }
    }
}
