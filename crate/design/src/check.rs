//! From what is entered to setups that can be simulated, or every fault at once.
//!
//! Setups come out: nominal parts, weak ones with every tolerance at its unfavourable end, and nominal ones whose
//! protectors trip as early, or as late, as they may. Beside them stand the ratings.

mod estimate;
mod ratings;

use strikeline_core::board::{Board, OverDischarge, Release, SensePoint, Stage, Threshold};
use strikeline_core::cell::{Branch, Cell};
use strikeline_core::load::{LitDraw, Load};
use strikeline_core::math::{Monotone, Polyline, exp};
use strikeline_core::ratings::{CellRatings, Fuse, LeadRating, OverCharge, Ratings};
use strikeline_core::setup::{Arrangement, Path, Setup, Use};
use strikeline_core::units::{AmpHours, Amps, Celsius, Farads, Ohms, Seconds, Volts, Watts};
use strikeline_core::wiring::{Conductor, Lead, Series};

use crate::catalogue::{Kind, field};
use crate::design::Design;
use crate::quantity::{self, Shown, Toleranced};
use crate::shipped;

pub use estimate::{Estimate, Tank};

/// What is wrong with one field.
#[derive(Debug, Clone, PartialEq)]
pub struct Fault {
    /// Key of the field.
    pub key: &'static str,
    /// A sentence: what was got and what would be accepted.
    pub message: String,
}

/// A design that can be simulated.
#[derive(Debug, Clone, PartialEq)]
pub struct Checked {
    /// Every value as entered.
    pub nominal: Setup,
    /// Every tolerance at its unfavourable end at once.
    pub weak: Setup,
    /// Nominal, but board and second protector open as early as their tolerances allow: sense thresholds and limits
    /// in amps at their lowest, over-discharge at its highest, delays at their shortest, pair at its highest.
    pub low: Setup,
    /// Nominal, but board and second protector open as late as their tolerances allow.
    pub high: Setup,
    /// What the parts are rated for and what surrounds them.
    pub ratings: Ratings,
    /// Where the strike voltage is an estimate: what it rests on.
    pub estimate: Option<Estimate>,
}

/// A protector as its tolerances allow.
struct Protector {
    nominal: Board,
    /// Opens at the lowest current and after the shortest time.
    earliest: Board,
    /// The reverse.
    latest: Board,
    over_charge: Option<OverCharge>,
}

/// What lies between the parts.
struct Wiring {
    nominal: Path,
    weak: Path,
    fuse: Option<Fuse>,
    leads: Vec<LeadRating>,
}

/// Checks a design.
///
/// # Errors
/// Every fault, each at its field.
pub fn check(design: &Design) -> Result<Checked, Vec<Fault>> {
    let mut reader = Reader { design, faults: Vec::new() };
    let checked = reader.setups();
    match checked {
        Some(checked) if reader.faults.is_empty() => Ok(checked),
        _ => Err(reader.faults),
    }
}

/// Which of a list of (key, label) a text chooses.
///
/// # Errors
/// A sentence: what was got and what would be accepted.
pub fn chosen(list: &'static [(&'static str, &'static str)], text: &str) -> Result<&'static str, String> {
    let text = text.trim();
    if let Some((found, _)) = list.iter().find(|(key, _)| *key == text) {
        return Ok(found);
    }
    let accepted: Vec<&str> = list.iter().map(|(key, _)| *key).collect();
    Err(format!("“{}” is not one of {}", quantity::quoted(text), accepted.join(", ")))
}

struct Reader<'d> {
    design: &'d Design,
    faults: Vec<Fault>,
}

fn range(shown: &Shown, min: f64, max: f64) -> String {
    format!("{} to {}", quantity::format(min, shown), quantity::format(max, shown))
}

impl Reader<'_> {
    fn fault(&mut self, key: &'static str, message: String) {
        self.faults.push(Fault { key, message });
    }

    /// A quantity with its tolerance; `None` where it is optional and empty, or faulty.
    fn toleranced(&mut self, key: &'static str) -> Option<Toleranced> {
        let (Some(field), text) = (field(key), self.design.get(key).trim()) else { return None };
        let Kind::Quantity { shown, min, max, optional, tolerance } = field.kind else { return None };
        if text.is_empty() && optional {
            return None;
        }
        let read = match tolerance {
            Some(usual) => quantity::parse_toleranced(text, &shown, usual),
            None => quantity::parse(text, &shown).map(|v| Toleranced { typical: v, min: v, max: v }),
        };
        match read {
            Ok(t) if t.typical < min || t.typical > max => {
                let got = quantity::quoted(text);
                let message = format!("{} is {got}; accepted is {}", field.label, range(&shown, min, max));
                self.fault(key, message);
                None
            }
            Ok(t) => Some(Toleranced {
                typical: t.typical,
                min: t.min.clamp(min, max),
                max: t.max.clamp(min, max),
            }),
            Err(error) => {
                let message = format!("{error}, {}", range(&shown, min, max));
                self.fault(key, message);
                None
            }
        }
    }

    fn value(&mut self, key: &'static str) -> Option<f64> {
        self.toleranced(key).map(|t| t.typical)
    }

    fn count(&mut self, key: &'static str) -> Option<u32> {
        let value = self.value(key)?;
        if value.fract() == 0.0 {
            // The catalogue's range fits.
            return Some(value as u32);
        }
        self.fault(key, format!("{value} is not a whole number; accepted is 1, 2, 3, …"));
        None
    }

    fn choice(&mut self, key: &'static str) -> &str {
        let Some(Kind::Choice(list)) = field(key).map(|f| f.kind) else { return "" };
        match chosen(list, self.design.get(key)) {
            Ok(found) => found,
            Err(message) => {
                self.fault(key, message);
                list[0].0
            }
        }
    }

    /// The rows of a table; `None` where it is empty or faulty.
    fn table(&mut self, key: &'static str) -> Option<(Vec<f64>, Vec<f64>)> {
        let text = self.design.get(key);
        let Some(Kind::Table { x, y, .. }) = field(key).map(|f| f.kind) else { return None };
        let mut columns = (Vec::new(), Vec::new());
        for (k, line) in text.lines().map(str::trim).filter(|l| !l.is_empty()).enumerate() {
            match row(line, &x, &y) {
                Ok((a, b)) => {
                    columns.0.push(a);
                    columns.1.push(b);
                }
                Err(why) => {
                    self.fault(key, format!("line {}: {why}", k + 1));
                    return None;
                }
            }
        }
        if columns.0.is_empty() {
            return None;
        }
        if columns.0.len() > 500 {
            self.fault(key, format!("{} lines; accepted are at most 500", columns.0.len()));
            return None;
        }
        if let Some(k) = (1..columns.0.len()).find(|&k| columns.0[k] <= columns.0[k - 1]) {
            self.fault(key, format!("line {}: the first column must rise from line to line", k + 1));
            return None;
        }
        Some(columns)
    }

    fn polyline(&mut self, key: &'static str, min: f64, max: f64) -> Option<Polyline> {
        let (x, y) = self.table(key)?;
        if let Some(k) = y.iter().position(|v| !(min..=max).contains(v)) {
            self.fault(
                key,
                format!("line {}: the second column is outside {min} to {max} (base unit)", k + 1),
            );
            return None;
        }
        match Polyline::new(x, y) {
            Ok(line) => Some(line),
            Err(error) => {
                self.fault(key, error.to_string());
                None
            }
        }
    }

    fn setups(&mut self) -> Option<Checked> {
        let cells = self.cell();
        let arrangement = match self.choice("board.arrangement") {
            "load_at_cell" => Arrangement::LoadAtCell,
            "switch_bridged" => Arrangement::SwitchBridged,
            "no_board" => Arrangement::NoBoard,
            _ => Arrangement::ThroughBoard,
        };
        let board = self.board();
        let second = if self.choice("second.fitted") == "yes" { Some(self.second()) } else { None };
        let wiring = self.wiring();
        let supply = self.value("board.supply");
        let usage = self.usage(if arrangement == Arrangement::NoBoard { Some(0.0) } else { supply });
        let estimated = self.choice("load.known") == "estimated";
        let estimate = if estimated { self.estimate(usage.as_ref().map(|u| u.ambient)) } else { None };
        let strike =
            if estimated { estimate.map(|e| e.toleranced()) } else { self.toleranced("load.strike") };
        let loads = self.load(strike);
        let button = self.contact("leads.button_current", "leads.button_voltage");
        let connector = self.contact("leads.connector_current", "leads.connector_voltage");
        let output = self.output();
        let keeping = self.keeping(usage.as_ref().map(|u| u.ambient));
        let charger = self.charger();
        let (cell, weak_cell, cell_ratings) = cells?;
        let board = board?;
        let wiring = wiring?;
        let (load, weak_load) = loads?;
        let second = match second {
            Some(second) => Some(second?),
            None => None,
        };
        let fitted = (arrangement != Arrangement::NoBoard).then_some(board);
        let nominal = Setup {
            cell,
            second_protector: second.as_ref().map(|p| p.nominal.clone()),
            path: wiring.nominal,
            board: fitted.as_ref().map(|p| p.nominal.clone()),
            arrangement,
            load,
            usage: usage?,
        };
        let low = Setup {
            second_protector: second.as_ref().map(|p| p.earliest.clone()),
            board: fitted.as_ref().map(|p| p.earliest.clone()),
            ..nominal.clone()
        };
        let high = Setup {
            second_protector: second.as_ref().map(|p| p.latest.clone()),
            board: fitted.as_ref().map(|p| p.latest.clone()),
            ..nominal.clone()
        };
        let weak = Setup { cell: weak_cell, path: wiring.weak, load: weak_load, ..low.clone() };
        let ratings = Ratings {
            cell: cell_ratings,
            charger: charger?,
            board_over_charge: fitted.and_then(|p| p.over_charge),
            second_over_charge: second.and_then(|p| p.over_charge),
            fuse: wiring.fuse,
            leads: wiring.leads,
            button,
            connector,
            output,
            keeping: keeping?,
            load_estimated: estimated,
        };
        Some(Checked { nominal, weak, low, high, ratings, estimate })
    }

    fn cell(&mut self) -> Option<(Cell, Cell, CellRatings)> {
        let key = self.choice("cell.chemistry").to_string();
        let kind = shipped::chemistry(&key).unwrap_or(&shipped::CHEMISTRIES[0]);
        let capacity = self.value("cell.capacity");
        let parallel = self.count("cell.parallel");
        let health = self.value("cell.health");
        let growth = self.value("cell.growth");
        let ratings = self.cell_ratings(kind, capacity);
        let heat = self.value("cell.heat");
        let cooling = self.value("cell.cooling");
        let activations = (self.value("cell.r0_activation"), self.value("cell.branch_activation"));
        let entropy = self.polyline("cell.entropy", -0.05, 0.05);
        let shapes =
            (self.polyline("cell.r0_shape", 0.01, 100.0), self.polyline("cell.branch_shape", 0.01, 100.0));
        let ocv = self.ocv();
        let mut cell = kind.cell(AmpHours(capacity?));
        cell.parallel = parallel?;
        cell.health = health?;
        cell.growth = growth?;
        cell.heat_capacity_j_per_k = heat.unwrap_or(cell.heat_capacity_j_per_k * f64::from(cell.parallel));
        cell.cooling_w_per_k = cooling.unwrap_or(cell.cooling_w_per_k * f64::from(cell.parallel));
        if let Some(ocv) = ocv {
            cell.ocv = ocv;
        }
        if let Some(entropy) = entropy {
            cell.entropy = entropy;
        }
        if let Some(shape) = shapes.0 {
            cell.r0_shape = shape;
        }
        if let Some(shape) = shapes.1 {
            cell.branch_shape = shape;
        }
        cell.r0_activation = activations.0.unwrap_or(cell.r0_activation);
        cell.branch_activation = activations.1.unwrap_or(cell.branch_activation);
        let more = self.resistance(&mut cell)?;
        let ratings = ratings?;
        cell.limits = ratings::limits(&ratings);
        let mut weak = cell.clone();
        scale(&mut weak, more);
        Some((cell, weak, ratings))
    }

    /// A voltage curve of the builder's own.
    fn ocv(&mut self) -> Option<Monotone> {
        let (x, y) = self.table("cell.ocv")?;
        let ends = (x.first().copied().unwrap_or(1.0), x.last().copied().unwrap_or(0.0));
        if ends.0 > 0.0 || ends.1 < 1.0 {
            self.fault(
                "cell.ocv",
                format!("charge goes from {} to {}; accepted is from 0 to 1", ends.0, ends.1),
            );
        } else if let Some(k) = (1..y.len()).find(|&k| y[k] <= y[k - 1]) {
            self.fault("cell.ocv", format!("line {}: the voltage must rise with the charge", k + 1));
        } else if y.iter().any(|v| !(0.5..=60.0).contains(v)) {
            self.fault("cell.ocv", "a voltage is outside 0.5 V to 60 V".into());
        } else {
            match Monotone::new(x, y) {
                Ok(curve) => return Some(curve),
                Err(error) => self.fault("cell.ocv", error.to_string()),
            }
        }
        None
    }

    /// Sets the cell's resistances by the chosen route; by how much they may be higher.
    fn resistance(&mut self, cell: &mut Cell) -> Option<f64> {
        match self.choice("cell.route") {
            "measured" => {
                let measured = self.toleranced("cell.r_10s");
                let tolerance = self.value("cell.tolerance");
                let Some(measured) = measured else {
                    if self.design.get("cell.r_10s").trim().is_empty() {
                        let message = "nothing is entered; accepted is a resistance in mΩ, e.g. 60 mΩ";
                        self.fault("cell.r_10s", message.into());
                    }
                    return None;
                };
                scale(cell, measured.typical / after(cell, 10.0));
                Some((measured.max / measured.typical).max(1.0 + tolerance?.min(0.1)))
            }
            "sag" => {
                let keys = ["cell.sag_rested", "cell.sag_loaded", "cell.sag_current", "cell.sag_time"];
                let values = keys.map(|key| self.value(key));
                for (key, value) in keys.iter().zip(&values) {
                    if value.is_none() && self.design.get(key).trim().is_empty() {
                        self.fault(key, "nothing is entered; the three readings belong together".into());
                    }
                }
                let [rested, loaded, current, time] = values;
                let (rested, loaded, current, time) = (rested?, loaded?, current?, time?);
                if loaded >= rested {
                    let message = format!(
                        "{loaded} V under load is not below {rested} V rested; accepted is less than that"
                    );
                    self.fault("cell.sag_loaded", message);
                    return None;
                }
                let each = (rested - loaded) / current * f64::from(cell.parallel);
                scale(cell, each / after(cell, time));
                Some(1.1)
            }
            "branches" => {
                let r0 = self.value("cell.r0");
                let pairs = [("cell.r1", "cell.tau1"), ("cell.r2", "cell.tau2"), ("cell.r3", "cell.tau3")]
                    .map(|(r, tau)| (self.value(r), self.value(tau)));
                let Some(r0) = r0 else {
                    if self.design.get("cell.r0").trim().is_empty() {
                        self.fault("cell.r0", "nothing is entered; accepted is a resistance in mΩ".into());
                    }
                    return None;
                };
                cell.r0 = Ohms(r0);
                cell.branches = pairs
                    .into_iter()
                    .filter_map(|(r, tau)| {
                        let (resistance, time_constant) = (Ohms(r?), Seconds(tau?));
                        (resistance.0 > 0.0).then_some(Branch { resistance, time_constant })
                    })
                    .collect();
                Some(1.1)
            }
            _ => Some(1.0 + self.value("cell.tolerance")?),
        }
    }

    /// A stage as it is, at its earliest and at its latest.
    fn stage(&mut self, name: &str, limit: &'static str, delay: &'static str) -> Option<[Stage; 3]> {
        let amps = limit == "board.limit4";
        let threshold = self.toleranced(limit);
        let delay = self.toleranced(delay);
        let (threshold, delay) = (threshold?, delay?);
        let of = |value: f64, delay: f64| Stage {
            name: name.to_string(),
            threshold: if amps { Threshold::Current(Amps(value)) } else { Threshold::Sense(Volts(value)) },
            delay: Seconds(delay),
        };
        Some([
            of(threshold.typical, delay.typical),
            of(threshold.min, delay.min),
            of(threshold.max, delay.max),
        ])
    }

    /// Over-discharge as it is, at its earliest and at its latest.
    fn over_discharge(&mut self, at: &'static str, delay: &'static str) -> [Option<OverDischarge>; 3] {
        let (threshold, delay) = (self.toleranced(at), self.toleranced(delay));
        let (Some(threshold), Some(delay)) = (threshold, delay) else { return [None; 3] };
        let of = |v: f64, s: f64| Some(OverDischarge { threshold: Volts(v), delay: Seconds(s) });
        [of(threshold.typical, delay.typical), of(threshold.max, delay.min), of(threshold.min, delay.max)]
    }

    fn board(&mut self) -> Option<Protector> {
        let rows = [
            ("over_current", "board.stage1", "board.delay1"),
            ("over_current_2", "board.stage2", "board.delay2"),
            ("short", "board.stage3", "board.delay3"),
            ("over_current_amps", "board.limit4", "board.delay4"),
        ];
        let stages: Vec<_> =
            rows.into_iter().filter_map(|(name, limit, delay)| self.stage(name, limit, delay)).collect();
        let od = self.over_discharge("board.od", "board.od_delay");
        let over_charge = self.over_charge("board.oc", "board.charge_sense", od[0].map(|od| od.threshold));
        let pair = self.toleranced("board.pair");
        let pairs = self.count("board.pairs");
        let on = self.polyline("board.on", 1e-5, 10.0);
        let sense = match self.choice("board.sense") {
            "shunt" => SensePoint::Shunt,
            _ => SensePoint::Pair,
        };
        let shunt = self.value("board.shunt");
        if sense == SensePoint::Shunt && shunt == Some(0.0) {
            self.fault(
                "board.shunt",
                "0 mΩ gives a board that senses over a shunt nothing to see; accepted is more".into(),
            );
        }
        let release = match self.choice("board.release") {
            "retry" => Release::Retry { every: Seconds(self.value("board.retry").unwrap_or(1.0)) },
            "charger" => Release::ChargerNeeded,
            _ => Release::LoadRemoved,
        };
        let alpha = self.value("board.alpha");
        let thermal = self.value("board.thermal");
        let time = self.value("board.thermal_time");
        if let Some(k) = on.as_ref().and_then(|on| (1..on.y().len()).find(|&k| on.y()[k] > on.y()[k - 1])) {
            self.fault("board.on", format!("line {}: resistance must not rise with the gate voltage", k + 1));
        }
        let pair = pair?;
        let nominal = Board {
            on_resistance: on.clone().unwrap_or_else(|| usual_on_resistance(pair.typical)),
            alpha_per_k: alpha?,
            pairs: pairs?,
            thermal_k_per_w: thermal?,
            thermal_time: Seconds(time?),
            shunt: Ohms(shunt?),
            sense,
            stages: stages.iter().map(|s| s[0].clone()).collect(),
            over_discharge: od[0],
            release,
        };
        // A table is as uncertain as the figure at 3.8 V, in parts of it.
        let scaled = |on: &Polyline, by: f64| {
            let y = on.y().iter().map(|r| r * by).collect();
            Polyline::new(on.x().to_vec(), y).unwrap_or_else(|_| on.clone())
        };
        let corner = |r: f64, k: usize| Board {
            on_resistance: match &on {
                Some(on) => scaled(on, r / pair.typical),
                None => usual_on_resistance(r),
            },
            stages: stages.iter().map(|s| s[k].clone()).collect(),
            over_discharge: od[k],
            ..nominal.clone()
        };
        let (earliest, latest) = (corner(pair.max, 1), corner(pair.min, 2));
        Some(Protector { nominal, earliest, latest, over_charge })
    }

    fn second(&mut self) -> Option<Protector> {
        let stage = self.stage("over_current", "second.stage1", "second.delay1");
        let od = self.over_discharge("second.od", "second.od_delay");
        let over_charge = self.over_charge("second.oc", "second.charge_sense", od[0].map(|od| od.threshold));
        let pair = self.toleranced("second.pair");
        let pairs = self.count("second.pairs");
        let pair = pair?;
        let nominal = Board {
            on_resistance: usual_on_resistance(pair.typical),
            alpha_per_k: 0.004,
            pairs: pairs?,
            thermal_k_per_w: 60.0,
            thermal_time: Seconds(8.0),
            shunt: Ohms(0.0),
            sense: SensePoint::Pair,
            stages: stage.iter().map(|s| s[0].clone()).collect(),
            over_discharge: od[0],
            release: Release::LoadRemoved,
        };
        let corner = |pair: f64, k: usize| Board {
            on_resistance: usual_on_resistance(pair),
            stages: stage.iter().map(|s| s[k].clone()).collect(),
            over_discharge: od[k],
            ..nominal.clone()
        };
        let (earliest, latest) = (corner(pair.max, 1), corner(pair.min, 2));
        Some(Protector { nominal, earliest, latest, over_charge })
    }

    fn wiring(&mut self) -> Option<Wiring> {
        let conductor = match self.choice("leads.conductor") {
            "tinned" => Conductor::FlexibleTinned,
            "solid" => Conductor::Solid,
            "ideal" => Conductor::Ideal,
            _ => Conductor::Flexible,
        };
        let t = self.value("leads.temperature");
        let cell = (self.value("leads.cell_length"), self.value("leads.cell_section"));
        let load = (self.value("leads.load_length"), self.value("leads.load_section"));
        let joints = (self.value("leads.cell_joints"), self.value("leads.load_joints"));
        let switch = self.toleranced("leads.switch");
        let fuse = self.fuse();
        let insulation = self.insulation();
        let t = Celsius(t?);
        let switch = switch?;
        let lead = |length_m, area_mm2| Lead { length_m, area_mm2, conductor, temperature: t };
        let series = Series {
            cell_leads: lead(cell.0?, cell.1?),
            fuse: Ohms(0.0),
            cell_joints: Ohms(joints.0?),
            load_leads: lead(load.0?, load.1?),
            load_joints: Ohms(joints.1?),
            switch: Ohms(0.0),
        };
        let leads = ratings::leads(insulation, &series.cell_leads, &series.load_leads);
        let (fuse, cold) = fuse?;
        let of = |switch: f64, fuse: f64| Series { switch: Ohms(switch), fuse: Ohms(fuse), ..series }.path();
        let (nominal, weak) = (of(switch.typical, cold.typical), of(switch.max, cold.max));
        // A path of nothing at all has no current to solve for.
        if nominal.ahead.0 + nominal.after.0 <= 0.0 {
            self.fault(
                "leads.load_joints",
                "leads, joints and switch are all 0; accepted is more than 0 mΩ together".into(),
            );
            return None;
        }
        Some(Wiring { nominal, weak, fuse, leads })
    }

    /// - `strike`: as entered, or as estimated.
    fn load(&mut self, strike: Option<Toleranced>) -> Option<(Load, Load)> {
        let lit = self.lit();
        let keys =
            ["load.start", "load.hold", "load.strike_time", "load.unlit", "load.surge", "load.surge_time"];
        let [start, hold, strike_time, unlit, surge, surge_time] = keys.map(|key| self.value(key));
        let stall = self.value("load.stall");
        let capacitance = self.value("load.capacitance");
        let esr = self.value("load.esr");
        let peak = self.value("load.peak");
        if let (Some(strike), Some(hold)) = (strike, hold)
            && strike.min <= hold
        {
            let least = (strike.min * 1e4).floor() / 1e4;
            let message =
                format!("{hold} V is not below the strike voltage, {least} V at its least; accepted is less");
            self.fault("load.hold", message);
        }
        if let (Some(hold), Some(start)) = (hold, start)
            && hold <= start
        {
            self.fault(
                "load.start",
                format!("{start} V is not below the hold voltage, {hold} V; accepted is less"),
            );
        }
        let lit = lit?;
        let (hold, esr) = (hold?, esr?);
        if esr > 0.0 && falling_slope(&lit, hold) * esr >= 1.0 {
            let message = "it times the fall of the lit draw reaches 1, so the voltage has no single value; accepted is less";
            self.fault("load.esr", message.into());
            return None;
        }
        let strike = strike?;
        let nominal = Load {
            lit,
            unlit: Ohms(unlit?),
            stall: stall.map(Ohms),
            start: Volts(start?),
            strike: Volts(strike.typical),
            strike_time: Seconds(strike_time?),
            hold: Volts(hold),
            surge: Amps(surge?),
            surge_time: Seconds(surge_time?),
            capacitance: Farads(capacitance?),
            esr: Ohms(esr),
            peak_factor: peak?,
        };
        let weak = Load { strike: Volts(strike.max), ..nominal.clone() };
        Some((nominal, weak))
    }

    fn lit(&mut self) -> Option<LitDraw> {
        match self.choice("load.law") {
            "current" => self.value("load.current").map(|i| LitDraw::Current(Amps(i))),
            "power" => self.value("load.power").map(|p| LitDraw::Power(Watts(p))),
            "resistance" => self.value("load.resistance").map(|r| LitDraw::Resistance(Ohms(r))),
            _ => {
                let faults = self.faults.len();
                let (x, y) = match self.table("load.table") {
                    Some(columns) => columns,
                    None => {
                        if self.faults.len() == faults {
                            let message = "nothing is entered; accepted is a pair of volts and amps a line, e.g. 3.6 2.7";
                            self.fault("load.table", message.into());
                        }
                        return None;
                    }
                };
                if x[0] < 0.1 || y.iter().any(|i| !(1e-6..=500.0).contains(i)) || x.iter().any(|v| *v > 60.0)
                {
                    let message = "a number is outside 0.1 V to 60 V or 0.000001 A to 500 A";
                    self.fault("load.table", message.into());
                    return None;
                }
                match Polyline::new(x, y) {
                    Ok(line) => Some(LitDraw::Table(line)),
                    Err(error) => {
                        self.fault("load.table", error.to_string());
                        None
                    }
                }
            }
        }
    }

    fn usage(&mut self, standby: Option<f64>) -> Option<Use> {
        let (press, rest) = (self.value("use.press"), self.value("use.rest"));
        let ambient = self.value("use.ambient");
        let presses = self.count("use.presses");
        Some(Use {
            press: Seconds(press?),
            rest: Seconds(rest?),
            ambient: Celsius(ambient?),
            standby: Amps(standby?),
            max_presses: presses?,
        })
    }
}

/// The steepest fall of a lit draw, in A/V, from the hold voltage up.
fn falling_slope(lit: &LitDraw, hold: f64) -> f64 {
    match lit {
        LitDraw::Current(_) | LitDraw::Resistance(_) => 0.0,
        LitDraw::Power(p) => p.0 / (hold * hold),
        LitDraw::Table(line) => (1..line.x().len())
            .map(|k| (line.y()[k - 1] - line.y()[k]) / (line.x()[k] - line.x()[k - 1]))
            .fold(0.0, f64::max),
    }
}

fn row(line: &str, x: &Shown, y: &Shown) -> Result<(f64, f64), String> {
    let parts: Vec<&str> = if line.contains(';') || line.contains('\t') {
        line.split([';', '\t']).map(str::trim).filter(|p| !p.is_empty()).collect()
    } else if line.contains('.') && line.matches(',').count() == 1 && !line.contains(char::is_whitespace) {
        // The point is the decimal sign, so the comma parts the columns.
        line.split(',').map(str::trim).collect()
    } else {
        line.split_whitespace().collect()
    };
    match parts[..] {
        [a, b] => {
            let a = quantity::parse(a.trim_end_matches(','), x).map_err(|e| e.to_string())?;
            let b = quantity::parse(b, y).map_err(|e| e.to_string())?;
            Ok((a, b))
        }
        _ => Err(format!("“{}” is not two numbers", quantity::quoted(line))),
    }
}

/// Resistance that one cell shows a time after a step, at half charge and 25 °C.
fn after(cell: &Cell, time_s: f64) -> f64 {
    cell.branches
        .iter()
        .fold(cell.r0.0, |sum, b| sum + b.resistance.0 * (1.0 - exp(-time_s / b.time_constant.0)))
}

fn scale(cell: &mut Cell, by: f64) {
    cell.r0 = cell.r0 * by;
    for branch in &mut cell.branches {
        branch.resistance = branch.resistance * by;
    }
}

/// A pair's resistance over its gate voltage, through a figure at 3.8 V.
///
/// The shape is that of the best table found: a source-to-source pair, typical values 17, 18, 19 and
/// 22 mΩ at 4.5, 3.8, 3.1 and 2.5 V (data sheet FC4B22270L1, TT4-ZZ-02012 rev. 1). Below 2.5 V it goes on
/// rising as fast, down to 2 V.
fn usual_on_resistance(at_3_8: f64) -> Polyline {
    let x = vec![2.0, 2.5, 3.1, 3.8, 4.5];
    let y = [24.5, 22.0, 19.0, 18.0, 17.0].map(|r| r / 18.0 * at_3_8).to_vec();
    Polyline::new(x, y).expect("five rising places")
}

#[cfg(test)]
mod tests {
    use super::*;
    use strikeline_core::ratings::FuseKind;

    #[test]
    fn exact_weak_parts_take_the_unfavourable_end() {
        let mut design = Design::default();
        design.set("board.stage1", "120–180 mV");
        design.set("board.delay1", "10 (20) ms");
        design.set("board.pair", "50 (65) mΩ");
        let checked = check(&design).expect("sound");
        let stage = |setup: &Setup| setup.board.as_ref().expect("a board").stages[0].clone();
        let (nominal, weak) = (stage(&checked.nominal), stage(&checked.weak));
        let Threshold::Sense(least) = weak.threshold else { panic!("{weak:?}") };
        // The delay has no least of its own: the field's usual 40 % below 10 ms.
        assert!((least.0 - 0.12).abs() < 1e-12 && (weak.delay.0 - 6e-3).abs() < 1e-12, "{weak:?}");
        assert_eq!(nominal.delay, Seconds(0.01));
        let pair = |setup: &Setup| setup.board.as_ref().expect("a board").on_resistance.at(3.8);
        let got = (pair(&checked.nominal), pair(&checked.weak));
        assert!((got.0 - 0.05).abs() < 1e-12 && (got.1 - 0.065).abs() < 1e-12, "{got:?}");
    }

    #[test]
    fn exact_a_protector_at_its_earliest_and_latest() {
        let mut design = Design::default();
        design.set("board.limit4", "5 ± 1 A");
        design.set("second.fitted", "yes");
        let checked = check(&design).expect("sound");
        let of = |setup: &Setup| {
            let board = setup.board.as_ref().expect("a board");
            let Threshold::Sense(sense) = board.stages[0].threshold else { panic!("{board:?}") };
            let Threshold::Current(amps) = board.stages[2].threshold else { panic!("{board:?}") };
            let od = board.over_discharge.expect("over-discharge");
            let delay = board.stages[0].delay;
            [sense.0, delay.0, amps.0, board.on_resistance.at(3.8), od.threshold.0, od.delay.0]
        };
        let close = |got: [f64; 6], want: [f64; 6]| {
            assert!(got.iter().zip(want).all(|(g, w)| (g - w).abs() < 1e-12), "{got:?}, not {want:?}");
        };
        close(of(&checked.nominal), [0.15, 0.01, 5.0, 0.05, 2.4, 0.04]);
        close(of(&checked.low), [0.12, 0.006, 4.0, 0.06, 2.5, 0.02]);
        close(of(&checked.high), [0.18, 0.014, 6.0, 0.04, 2.3, 0.06]);
        assert_eq!((&checked.low.cell, &checked.low.path), (&checked.nominal.cell, &checked.nominal.path));
        let pair = |setup: &Setup| setup.second_protector.as_ref().expect("fitted").on_resistance.at(3.8);
        assert!(pair(&checked.low) > pair(&checked.nominal) && pair(&checked.nominal) > pair(&checked.high));
    }

    #[test]
    fn exact_a_table_of_the_pair_is_as_uncertain_as_its_figure() {
        let mut design = Design::demo();
        design.set("board.pair", "50 ± 10 mΩ");
        design.set("board.on", "2.5 60\n4.5 40");
        let checked = check(&design).expect("sound");
        let at = |setup: &Setup| setup.board.as_ref().expect("fitted").on_resistance.at(4.5);
        for (setup, ohm) in [(&checked.low, 0.048), (&checked.nominal, 0.040), (&checked.high, 0.032)] {
            assert!((at(setup) - ohm).abs() < 1e-12, "{} Ω", at(setup));
        }
        assert!((at(&checked.weak) - 0.048).abs() < 1e-12, "{} Ω", at(&checked.weak));
    }

    #[test]
    fn exact_a_fuse_is_ahead_of_the_board() {
        let mut design = Design::default();
        let without = check(&design).expect("sound");
        design.set("leads.fuse", "lag");
        design.set("leads.fuse_rating", "3.15 A");
        design.set("leads.fuse_cold", "23.1 mΩ ± 10 %");
        let with = check(&design).expect("sound");
        let more = |a: &Setup, b: &Setup| a.path.ahead.0 - b.path.ahead.0;
        assert!((more(&with.nominal, &without.nominal) - 23.1e-3).abs() < 1e-12);
        assert!((more(&with.weak, &without.weak) - 25.41e-3).abs() < 1e-12);
        assert_eq!(with.nominal.path.after, without.nominal.path.after);
        let fuse = with.ratings.fuse.expect("a fuse");
        assert_eq!((fuse.rating, fuse.kind, fuse.breaking), (Amps(3.15), FuseKind::TimeLag, None));
        assert_eq!(without.ratings.fuse, None);
    }

    /// What the fields leave empty comes from the kind of cell, the fuse and the charger themselves.
    #[test]
    fn exact_empty_ratings_take_what_their_help_says() {
        let mut design = Design::default();
        for (key, text) in [
            ("cell.chemistry", "lfp_cylinder"),
            ("charger.fitted", "yes"),
            ("charger.current", "500 mA"),
            ("charger.float", "3.6 V"),
            ("leads.fuse", "ptc"),
            ("leads.fuse_rating", "3 A"),
            ("leads.insulation", "silicone"),
            ("use.ambient", "-5"),
            ("use.storage", "12 h"),
        ] {
            design.set(key, text);
        }
        let ratings = check(&design).expect("sound").ratings;
        assert_eq!((ratings.cell.voltage_min, ratings.cell.voltage_max), (Volts(2.0), Volts(3.65)));
        assert_eq!((ratings.cell.it, ratings.cell.pulse), (Amps(1.1), None));
        let charger = ratings.charger.expect("fitted");
        assert_eq!((charger.termination, charger.trickle), (Amps(0.05), Amps(0.05)));
        assert!((charger.float.high - 3.654).abs() < 1e-12 && (charger.current.low - 0.45).abs() < 1e-12);
        let ptc = FuseKind::Ptc { trip: Amps(6.0), time: Seconds(20.0), at: Amps(15.0) };
        assert_eq!(ratings.fuse.expect("a PTC").kind, ptc);
        assert_eq!(ratings.leads.len(), 2);
        assert_eq!((ratings.leads[0].initial, ratings.leads[0].last), (Celsius(180.0), Celsius(350.0)));
        assert!((ratings.leads[0].ohm_per_m_20 - 0.026).abs() < 1e-12, "class 5, 0.75 mm²: 26.0 Ω/km");
        assert_eq!((ratings.keeping.cold, ratings.keeping.storage_days), (Celsius(-5.0), 0.5));
    }

    #[test]
    fn exact_fields_that_contradict_each_other_are_faults() {
        for (entries, key) in [
            (&[("cell.continuous", "5 A"), ("cell.pulse", "4 A")][..], "cell.pulse"),
            (&[("cell.voltage_min", "4.3 V")], "cell.voltage_min"),
            (&[("cell.voltage_max", "2.9 V")], "cell.voltage_max"),
            (&[("cell.charge_cold", "50")], "cell.charge_cold"),
            (&[("board.oc", "2.4 V")], "board.oc"),
            (&[("leads.fuse", "i2t")], "leads.fuse_i2t"),
            (&[("leads.fuse", "ptc"), ("leads.ptc_trip", "3 A")], "leads.ptc_trip"),
            (&[("leads.fuse", "ptc"), ("leads.ptc_at", "5 A")], "leads.ptc_at"),
            (&[("charger.fitted", "yes"), ("charger.termination", "0.95 A")], "charger.termination"),
            (&[("charger.fitted", "yes"), ("charger.trickle_below", "4.2 V")], "charger.trickle_below"),
            (&[("charger.fitted", "yes"), ("charger.supply", "4.2 V")], "charger.supply"),
            (&[("charger.fitted", "yes"), ("charger.cold", "30")], "charger.cold"),
            (&[("load.strike", "3.05 V")], "load.hold"),
            (&[("load.start", "3 V")], "load.start"),
        ] {
            let mut design = Design::default();
            for (k, text) in entries {
                assert!(design.set(k, text), "{k}");
            }
            let faults = check(&design).expect_err(key);
            let keys: Vec<&str> = faults.iter().map(|f| f.key).collect();
            assert_eq!(keys, [key], "{faults:?}");
        }
    }

    #[test]
    fn exact_an_estimate_is_the_strike_voltage_with_its_spread() {
        let mut design = Design::default();
        design.set("load.strike", "no number");
        design.set("load.known", "estimated");
        design.set("load.electrodes", "unknown");
        let checked = check(&design).expect("the measured strike voltage is not asked for");
        let estimate = checked.estimate.expect("an estimate");
        assert!(checked.ratings.load_estimated);
        assert_eq!(checked.weak.load.strike, estimate.strike.high);
        let middle = checked.nominal.load.strike.0;
        assert!((middle * middle - estimate.strike.low.0 * estimate.strike.high.0).abs() < 1e-9);
        // 1.5 mm at the sea and 20 °C: 2.44·pd + 2.12·√pd with pd = 1.01325·1.5; by N_s·π/N_p = 600·π/4.
        let pd = 1.01325 * 1.5_f64;
        let uniform = 1e3 * (2.44 * pd + 2.12 * pd.sqrt()) / (150.0 * std::f64::consts::PI);
        assert!(
            (estimate.strike.high.0 - uniform).abs() < 1e-3 * uniform,
            "{estimate:?} against {uniform} V"
        );
        design.set("load.known", "measured");
        design.set("load.strike", "3.3 V");
        let measured = check(&design).expect("sound");
        assert!(!measured.ratings.load_estimated && measured.estimate.is_none());
    }

    /// A coil of 320 kHz alone and 76 kHz with 220 nF: 13.151 nF and 18.809 µH, by Thomson's formula.
    #[test]
    fn exact_a_tank_from_two_frequencies() {
        let mut design = Design::default();
        for (key, text) in [
            ("load.known", "estimated"),
            ("load.tank", "frequencies"),
            ("load.tank_capacitance", "220 nF"),
            ("load.tank_alone", "320 kHz"),
            ("load.tank_with", "76"),
        ] {
            assert!(design.set(key, text), "{key}");
        }
        let estimate = check(&design).expect("sound").estimate.expect("an estimate");
        let tank = estimate.tank.expect("a tank");
        assert!((tank.inductance.0 - 18.809e-6).abs() < 1e-9, "{tank:?}");
        assert!((tank.capacitance.0 - 233.151e-9).abs() < 1e-12, "{tank:?}");
        assert!((tank.frequency.0 - 76e3).abs() < 1e-9);
        assert!(estimate.tank_current(Volts(3.3)).expect("a tank").0 > 0.0);
        design.set("load.tank_with", "330 kHz");
        let faults = check(&design).expect_err("more with the capacitor");
        assert_eq!(faults[0].key, "load.tank_with");
        design.set("load.gap", "20 mm");
        design.set("load.secondary", "20");
        let faults = check(&design).expect_err("too far");
        assert!(faults.iter().any(|f| f.key == "load.gap"), "{faults:?}");
    }
}
