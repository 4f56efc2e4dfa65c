//! Reference cases: their JSON form, into a setup and back from a report.
//!
//! The form is documented field by field beside the cases, in `data/cases/README.md`.

use serde::Deserialize;
use serde_json::{Value, json};
use strikeline_core::board::{Board, OverDischarge, Release, SensePoint, Stage, Threshold};
use strikeline_core::cell::{Branch, Cell, CellLimits};
use strikeline_core::charge;
use strikeline_core::load::{LitDraw, Load};
use strikeline_core::math::{Monotone, Polyline};
use strikeline_core::press::{self, PressOptions, PressStart};
use strikeline_core::report::{ChargeReport, PressReport};
use strikeline_core::setup::{Arrangement, Path, Setup, Use};
use strikeline_core::units::{AmpHours, Amps, Celsius, Farads, Ohms, Seconds, Volts, Watts};
use strikeline_design::report::{charge_json, event_json, summary_json, trace_json};

/// A case as its file holds it.
#[derive(Debug, Clone, Deserialize)]
pub struct Case {
    /// Its name.
    pub name: String,
    /// `press` or `charge`.
    pub kind: String,
    /// Where it begins.
    pub start: Start,
    /// The design.
    pub design: CaseDesign,
}

/// Where a case begins.
#[derive(Debug, Clone, Deserialize)]
#[allow(non_snake_case)]
pub struct Start {
    soc: f64,
    T_cell_C: f64,
}

/// The design of a case.
#[derive(Debug, Clone, Deserialize)]
pub struct CaseDesign {
    cell: CaseCell,
    path: CasePath,
    board: Option<CaseBoard>,
    second_protector: Option<CaseBoard>,
    arrangement: String,
    load: CaseLoad,
    r#use: CaseUse,
}

#[derive(Debug, Clone, Deserialize)]
#[allow(non_snake_case)]
struct CaseCell {
    n_parallel: u32,
    capacity_Ah: f64,
    health: f64,
    growth: f64,
    ocv_soc: Vec<f64>,
    ocv_V: Vec<f64>,
    r0_ohm: f64,
    branches: Vec<CaseBranch>,
    r0_shape_soc: Vec<f64>,
    r0_shape: Vec<f64>,
    r0_Ea_J_per_mol: f64,
    rk_shape_soc: Vec<f64>,
    rk_shape: Vec<f64>,
    rk_Ea_J_per_mol: f64,
    dudt_soc: Vec<f64>,
    dudt_V_per_K: Vec<f64>,
    c_th_J_per_K: f64,
    g_W_per_K: f64,
}

#[derive(Debug, Clone, Deserialize)]
struct CaseBranch {
    r_ohm: f64,
    tau_s: f64,
}

#[derive(Debug, Clone, Deserialize)]
struct CasePath {
    r_ahead_ohm: f64,
    r_after_ohm: f64,
}

#[derive(Debug, Clone, Deserialize)]
#[allow(non_snake_case)]
struct CaseBoard {
    ron_V: Vec<f64>,
    ron_ohm: Vec<f64>,
    alpha_per_K: f64,
    pairs: u32,
    rth_K_per_W: f64,
    tau_switch_s: f64,
    shunt_ohm: f64,
    sense: String,
    stages: Vec<CaseStage>,
    over_discharge: Option<CaseOverDischarge>,
}

#[derive(Debug, Clone, Deserialize)]
#[allow(non_snake_case)]
struct CaseStage {
    name: String,
    threshold_V: Option<f64>,
    threshold_A: Option<f64>,
    delay_s: f64,
}

#[derive(Debug, Clone, Deserialize)]
#[allow(non_snake_case)]
struct CaseOverDischarge {
    threshold_V: f64,
    delay_s: f64,
}

#[derive(Debug, Clone, Deserialize)]
#[allow(non_snake_case)]
struct CaseLit {
    kind: String,
    current_A: Option<f64>,
    power_W: Option<f64>,
    resistance_ohm: Option<f64>,
    table_V: Option<Vec<f64>>,
    table_A: Option<Vec<f64>>,
}

#[derive(Debug, Clone, Deserialize)]
#[allow(non_snake_case)]
struct CaseLoad {
    lit: CaseLit,
    r_unlit_ohm: f64,
    r_stall_ohm: Option<f64>,
    start_V: f64,
    strike_V: f64,
    strike_time_s: f64,
    hold_V: f64,
    surge_A: f64,
    surge_tau_s: f64,
    c_in_F: f64,
    esr_ohm: f64,
    peak_factor: f64,
}

#[derive(Debug, Clone, Deserialize)]
#[allow(non_snake_case)]
struct CaseUse {
    press_s: f64,
    rest_s: f64,
    T_amb_C: f64,
    standby_A: f64,
    max_presses: u32,
}

/// A file with a case, and perhaps the reference's result for it.
#[derive(Debug, Clone, Deserialize)]
pub struct CaseFile {
    /// The inputs.
    pub case: Case,
    /// What the reference found.
    #[serde(default)]
    pub result: Option<Value>,
}

/// Reads a case, alone or in a file with its result.
///
/// # Errors
/// What `serde_json` says of a text that is neither.
pub fn read(text: &str) -> Result<CaseFile, serde_json::Error> {
    match serde_json::from_str::<CaseFile>(text) {
        Ok(file) => Ok(file),
        Err(error) => match serde_json::from_str::<Case>(text) {
            Ok(case) => Ok(CaseFile { case, result: None }),
            Err(_) => Err(error),
        },
    }
}

fn line(x: &[f64], y: &[f64]) -> Result<Polyline, String> {
    Polyline::new(x.to_vec(), y.to_vec()).map_err(|e| e.to_string())
}

impl CaseBoard {
    fn board(&self) -> Result<Board, String> {
        let stages = self
            .stages
            .iter()
            .map(|s| {
                let threshold = match (s.threshold_V, s.threshold_A) {
                    (Some(v), _) => Threshold::Sense(Volts(v)),
                    (None, Some(i)) => Threshold::Current(Amps(i)),
                    (None, None) => return Err(format!("stage {} has no threshold", s.name)),
                };
                Ok(Stage { name: s.name.clone(), threshold, delay: Seconds(s.delay_s) })
            })
            .collect::<Result<_, _>>()?;
        Ok(Board {
            on_resistance: line(&self.ron_V, &self.ron_ohm)?,
            alpha_per_k: self.alpha_per_K,
            pairs: self.pairs,
            thermal_k_per_w: self.rth_K_per_W,
            thermal_time: Seconds(self.tau_switch_s),
            shunt: Ohms(self.shunt_ohm),
            sense: if self.sense == "shunt" { SensePoint::Shunt } else { SensePoint::Pair },
            stages,
            over_discharge: self
                .over_discharge
                .as_ref()
                .map(|o| OverDischarge { threshold: Volts(o.threshold_V), delay: Seconds(o.delay_s) }),
            release: Release::LoadRemoved,
        })
    }
}

impl CaseLit {
    fn draw(&self) -> Result<LitDraw, String> {
        let missing = || format!("lit draw of kind {} lacks its value", self.kind);
        Ok(match self.kind.as_str() {
            "current" => LitDraw::Current(Amps(self.current_A.ok_or_else(missing)?)),
            "power" => LitDraw::Power(Watts(self.power_W.ok_or_else(missing)?)),
            "resistance" => LitDraw::Resistance(Ohms(self.resistance_ohm.ok_or_else(missing)?)),
            "table" => LitDraw::Table(line(
                self.table_V.as_ref().ok_or_else(missing)?,
                self.table_A.as_ref().ok_or_else(missing)?,
            )?),
            other => return Err(format!("unknown lit draw {other}")),
        })
    }
}

impl Case {
    /// The setup of this case.
    ///
    /// # Errors
    /// A sentence on what is not a curve, or missing.
    pub fn setup(&self) -> Result<Setup, String> {
        let d = &self.design;
        let c = &d.cell;
        let cell = Cell {
            parallel: c.n_parallel,
            capacity: AmpHours(c.capacity_Ah),
            health: c.health,
            growth: c.growth,
            ocv: Monotone::new(c.ocv_soc.clone(), c.ocv_V.clone()).map_err(|e| e.to_string())?,
            entropy: line(&c.dudt_soc, &c.dudt_V_per_K)?,
            r0: Ohms(c.r0_ohm),
            r0_shape: line(&c.r0_shape_soc, &c.r0_shape)?,
            r0_activation: c.r0_Ea_J_per_mol,
            branches: c
                .branches
                .iter()
                .map(|b| Branch { resistance: Ohms(b.r_ohm), time_constant: Seconds(b.tau_s) })
                .collect(),
            branch_shape: line(&c.rk_shape_soc, &c.rk_shape)?,
            branch_activation: c.rk_Ea_J_per_mol,
            heat_capacity_j_per_k: c.c_th_J_per_K,
            cooling_w_per_k: c.g_W_per_K,
            limits: CellLimits::default(),
        };
        let l = &d.load;
        Ok(Setup {
            cell,
            second_protector: d.second_protector.as_ref().map(CaseBoard::board).transpose()?,
            path: Path { ahead: Ohms(d.path.r_ahead_ohm), after: Ohms(d.path.r_after_ohm) },
            board: d.board.as_ref().map(CaseBoard::board).transpose()?,
            arrangement: match d.arrangement.as_str() {
                "through_board" => Arrangement::ThroughBoard,
                "load_at_cell" => Arrangement::LoadAtCell,
                "switch_bridged" => Arrangement::SwitchBridged,
                "no_board" => Arrangement::NoBoard,
                other => return Err(format!("unknown arrangement {other}")),
            },
            load: Load {
                lit: l.lit.draw()?,
                unlit: Ohms(l.r_unlit_ohm),
                stall: l.r_stall_ohm.map(Ohms),
                start: Volts(l.start_V),
                strike: Volts(l.strike_V),
                strike_time: Seconds(l.strike_time_s),
                hold: Volts(l.hold_V),
                surge: Amps(l.surge_A),
                surge_time: Seconds(l.surge_tau_s),
                capacitance: Farads(l.c_in_F),
                esr: Ohms(l.esr_ohm),
                peak_factor: l.peak_factor,
            },
            usage: Use {
                press: Seconds(d.r#use.press_s),
                rest: Seconds(d.r#use.rest_s),
                ambient: Celsius(d.r#use.T_amb_C),
                standby: Amps(d.r#use.standby_A),
                max_presses: d.r#use.max_presses,
            },
        })
    }

    /// Solves the case and writes the result in the form of the reference.
    ///
    /// # Errors
    /// As [`Case::setup`].
    pub fn solve(&self) -> Result<Value, String> {
        let setup = self.setup()?;
        let start = PressStart::relaxed(&setup, self.start.soc, Celsius(self.start.T_cell_C));
        if self.kind == "press" {
            let options =
                PressOptions { samples: press::sample_times(setup.usage.press), ..PressOptions::default() };
            return Ok(press_result(&setup, &self.name, &press::run(&setup, &start, &options)));
        }
        let report = charge::run_from(&setup, &start, 50_000_000);
        Ok(charge_result(&setup, &self.name, &report))
    }
}

fn press_result(setup: &Setup, name: &str, report: &PressReport) -> Value {
    let sense_names: Vec<&str> =
        setup.board_in_path().map(|b| b.stages.iter().map(|s| s.name.as_str()).collect()).unwrap_or_default();
    let mut counts = serde_json::Map::new();
    let events: Vec<Value> = report.events.iter().map(|e| event_json(setup, e)).collect();
    for e in &events {
        let kind = e["kind"].as_str().unwrap_or_default();
        let so_far = counts.get(kind).and_then(Value::as_u64).unwrap_or(0);
        counts.insert(kind.into(), json!(so_far + 1));
    }
    let mut summary = summary_json(setup, &report.summary);
    summary["event_counts"] = Value::Object(counts);
    let mut trace = trace_json(report);
    trace["sense_names"] = json!(sense_names);
    json!({ "schema": 1, "case": name, "kind": "press", "events": events, "trace": trace, "summary": summary })
}

fn charge_result(setup: &Setup, name: &str, report: &ChargeReport) -> Value {
    let presses: Vec<Value> = report
        .presses
        .iter()
        .map(|p| {
            let mut line = summary_json(setup, &p.summary);
            line["n"] = json!(p.number);
            line["rested_V"] = json!(p.rested.0);
            line
        })
        .collect();
    let events_of = |start: Option<PressStart>| -> Vec<Value> {
        start.map_or_else(Vec::new, |start| {
            let report = press::run(setup, &start, &PressOptions::default());
            report.events.iter().map(|e| event_json(setup, e)).collect()
        })
    };
    let last = report.presses.len().saturating_sub(1);
    json!({
        "schema": 1, "case": name, "kind": "charge",
        "summary": charge_json(setup, report),
        "presses": presses,
        "events_first_press": events_of(charge::press_start(setup, 0)),
        "events_last_press": events_of(charge::press_start(setup, last)),
    })
}
