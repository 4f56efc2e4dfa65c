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
use strikeline_core::report::{
    ChargeEnd, ChargeReport, Event, EventKind, Ledger, Limit, Mode, NotFull, PressEnd, PressReport,
    PressSummary, Protector,
};
use strikeline_core::setup::{Arrangement, Path, Setup, Use};
use strikeline_core::units::{AmpHours, Amps, Celsius, Farads, Ohms, Seconds, Volts, Watts};

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
        let report = charge::run_from(&setup, &start);
        Ok(charge_result(&setup, &self.name, &report))
    }
}

fn mode_name(mode: Mode) -> &'static str {
    match mode {
        Mode::Stalled => "stalled",
        Mode::Pinned => "pinned",
        Mode::Unlit => "unlit",
        Mode::Lit => "lit",
    }
}

fn limit_name(setup: &Setup, limit: Limit) -> String {
    let (protector, board) = match limit {
        Limit::Stage(p, _) | Limit::OverDischarge(p) => match p {
            Protector::Board => ("", setup.board.as_ref()),
            Protector::Second => ("second:", setup.second_protector.as_ref()),
        },
    };
    let name = match limit {
        Limit::Stage(_, k) => board.and_then(|b| b.stages.get(k)).map_or("?", |s| s.name.as_str()),
        Limit::OverDischarge(_) => "over_discharge",
    };
    format!("{protector}{name}")
}

fn not_full_name(setup: &Setup, why: NotFull) -> String {
    match why {
        NotFull::Opened(limit) => format!("opened:{}", limit_name(setup, limit)),
        NotFull::CellEmpty => "cell_empty".into(),
        NotFull::EventLimit => "event_limit".into(),
        NotFull::SagBelowHold => "dropped:sag_below_hold".into(),
        NotFull::NoOperatingPoint => "dropped:no_operating_point".into(),
        NotFull::NotStarted => "not_started".into(),
        NotFull::StrikeVoltageNotReached => "strike_voltage_not_reached".into(),
        NotFull::StrikeTimeNotCompleted => "strike_time_not_completed".into(),
    }
}

fn event_json(setup: &Setup, e: &Event) -> Value {
    let (kind, detail) = match e.kind {
        EventKind::Closed => ("closed", None),
        EventKind::Over(limit) => ("over", Some(limit)),
        EventKind::Under(limit) => ("under", Some(limit)),
        EventKind::StartReached => ("start_reached", None),
        EventKind::Runs => ("runs", None),
        EventKind::PinnedAtStart => ("pinned_at_start", None),
        EventKind::Stalls => ("stalls", None),
        EventKind::StrikeReached => ("strike_reached", None),
        EventKind::StrikeLost => ("strike_lost", None),
        EventKind::Lit => ("lit", None),
        EventKind::Drop => ("drop", None),
        EventKind::Opened(limit) => ("opened", Some(limit)),
        EventKind::CellEmpty => ("cell_empty", None),
        EventKind::Released => ("released", None),
        EventKind::EventLimit => ("event_limit", None),
    };
    json!({
        "t_s": e.time.0, "kind": kind, "detail": detail.map(|l| limit_name(setup, l)), "mode": mode_name(e.mode),
        "V_load_V": e.load.0, "I_A": e.current.0, "V_board_V": e.board.0, "V_cell_V": e.cell.0, "soc": e.soc,
    })
}

fn ledger_json(l: &Ledger) -> Value {
    json!({
        "source": l.source.0, "cell_ohmic": l.cell_ohmic.0, "cell_polarisation": l.cell_polarisation.0,
        "second_protector": l.second_protector.0, "ahead": l.ahead.0, "pair": l.pair.0, "shunt": l.shunt.0,
        "after": l.after.0, "esr": l.esr.0, "c_in_left": l.capacitor_left.0, "load_lit": l.load_lit.0,
        "load_unlit": l.load_unlit.0, "load_stalled": l.load_stalled.0, "standby": l.standby.0,
    })
}

fn summary_json(setup: &Setup, s: &PressSummary, branches: usize) -> Value {
    let (ended, opened_by) = match s.end {
        PressEnd::Released => ("released", None),
        PressEnd::Opened(limit) => ("opened", Some(limit)),
        PressEnd::CellEmpty => ("cell_empty", None),
        PressEnd::EventLimit => ("event_limit", None),
    };
    let v_end: Vec<f64> = s.branches_end.iter().take(branches).map(|v| v.0).collect();
    json!({
        "full": s.not_full.is_none(), "why_not_full": s.not_full.map(|w| not_full_name(setup, w)),
        "ended": ended, "opened_by": opened_by.map(|l| limit_name(setup, l)), "t_end_s": s.end_time.0,
        "lit_s": s.lit.0, "first_lit_s": s.first_lit.map(|t| t.0), "drops": s.drops, "started": s.start.is_some(),
        "start_s": s.start.map(|t| t.0), "end_mode": mode_name(s.end_mode), "V_load_end_V": s.load_end.0,
        "I_end_A": s.current_end.0, "V_board_end_V": s.board_end.0, "V_cell_end_V": s.cell_end.0,
        "R_pair_end_ohm": s.pair_end.0, "peak_I_A": s.peak_current.0, "lowest_lit_V": s.lowest_lit.map(|v| v.0),
        "soc_start": s.soc_start, "soc_end": s.soc_end, "v_end_V": v_end,
        "T_cell_end_C": s.cell_temperature_end.0, "T_switch_end_C": s.switch_temperature_end.0,
        "T_switch2_end_C": s.second_temperature_end.0, "T_cell_max_C": s.cell_temperature_max.0,
        "T_switch_max_C": s.switch_temperature_max.0, "T_switch2_max_C": s.second_temperature_max.0,
        "energy_J": ledger_json(&s.ledger), "ledger_residual_rel": s.ledger.residual(), "charge_As": s.charge_as,
        "i2t_A2s": s.i2t_a2s, "steps": s.steps,
    })
}

fn press_result(setup: &Setup, name: &str, report: &PressReport) -> Value {
    let trace = &report.trace;
    let column =
        |f: &dyn Fn(&strikeline_core::report::Sample) -> Value| trace.iter().map(f).collect::<Vec<_>>();
    let sense_names: Vec<&str> =
        setup.board_in_path().map(|b| b.stages.iter().map(|s| s.name.as_str()).collect()).unwrap_or_default();
    let mut counts = serde_json::Map::new();
    let events: Vec<Value> = report.events.iter().map(|e| event_json(setup, e)).collect();
    for e in &events {
        let kind = e["kind"].as_str().unwrap_or_default();
        let so_far = counts.get(kind).and_then(Value::as_u64).unwrap_or(0);
        counts.insert(kind.into(), json!(so_far + 1));
    }
    let mut summary = summary_json(setup, &report.summary, setup.cell.branches.len());
    summary["event_counts"] = Value::Object(counts);
    json!({
        "schema": 1, "case": name, "kind": "press", "events": events,
        "trace": {
            "t_s": column(&|s| json!(s.time.0)), "mode": column(&|s| json!(mode_name(s.mode))),
            "V_load_V": column(&|s| json!(s.load.0)), "V_board_V": column(&|s| json!(s.board.0)),
            "V_cell_V": column(&|s| json!(s.cell.0)), "I_A": column(&|s| json!(s.current.0)),
            "I_load_A": column(&|s| json!(s.load_current.0)), "v_C_V": column(&|s| json!(s.capacitor.0)),
            "soc": column(&|s| json!(s.soc)),
            "v_V": column(&|s| json!(s.branches.iter().map(|v| v.0).collect::<Vec<_>>())),
            "T_cell_C": column(&|s| json!(s.cell_temperature.0)),
            "T_switch_C": column(&|s| json!(s.switch_temperature.0)),
            "R_pair_ohm": column(&|s| json!(s.pair.0)), "sense": column(&|s| json!(s.sense)),
            "sense_names": sense_names,
        },
        "summary": summary,
    })
}

fn charge_result(setup: &Setup, name: &str, report: &ChargeReport) -> Value {
    let ended = match report.end {
        ChargeEnd::NoLitTime(why) => format!("no_lit_time:{}", not_full_name(setup, why)),
        ChargeEnd::Opened(limit) => format!("opened:{}", limit_name(setup, limit)),
        ChargeEnd::OpenedInRest(limit) => format!("opened_in_rest:{}", limit_name(setup, limit)),
        ChargeEnd::CellEmpty => "cell_empty".into(),
        ChargeEnd::EmptyInRest => "in_rest:cell_empty".into(),
        ChargeEnd::PressLimit => "press_limit".into(),
        ChargeEnd::WorkLimit => "work_limit".into(),
    };
    let presses: Vec<Value> = report
        .presses
        .iter()
        .map(|p| {
            let s = &p.summary;
            json!({
                "n": p.number, "full": s.not_full.is_none(),
                "why_not_full": s.not_full.map(|w| not_full_name(setup, w)), "rested_V": p.rested.0,
                "soc_start": s.soc_start, "soc_end": s.soc_end, "lit_s": s.lit.0,
                "first_lit_s": s.first_lit.map(|t| t.0), "drops": s.drops, "t_end_s": s.end_time.0,
                "V_load_end_V": s.load_end.0, "I_end_A": s.current_end.0, "V_board_end_V": s.board_end.0,
                "T_cell_end_C": s.cell_temperature_end.0, "T_switch_end_C": s.switch_temperature_end.0,
                "peak_I_A": s.peak_current.0,
            })
        })
        .collect();
    let events_of = |start: Option<PressStart>| -> Vec<Value> {
        start.map_or_else(Vec::new, |start| {
            let report = press::run(setup, &start, &PressOptions::default());
            report.events.iter().map(|e| event_json(setup, e)).collect()
        })
    };
    let last = report.presses.len().saturating_sub(1);
    let v = |x: Option<Volts>| x.map(|v| v.0);
    json!({
        "schema": 1, "case": name, "kind": "charge",
        "summary": {
            "presses": report.presses.len(), "full_presses": report.full_presses, "lit_s": report.lit.0,
            "energy_delivered_J": report.ledger.load_lit.0, "energy_J": ledger_json(&report.ledger),
            "ledger_residual_rel": report.ledger.residual(), "recharge_mark_V": v(report.recharge_mark),
            "mark_relaxed_before_V": v(report.mark_relaxed_before),
            "mark_in_use_before_V": v(report.mark_in_use_before), "mark_in_use_after_V": v(report.mark_in_use_after),
            "soc_left": report.soc_left, "charge_left_Ah": report.charge_left.0,
            "first_imperfect": report.first_imperfect.map(|k| {
                let p = &report.presses[k];
                json!({
                    "n": p.number, "why": p.summary.not_full.map(|w| not_full_name(setup, w)),
                    "t_end_s": p.summary.end_time.0,
                })
            }),
            "ended": ended, "clock_s": report.clock.0, "T_cell_max_C": report.cell_temperature_max.0,
            "T_switch_max_C": report.switch_temperature_max.0, "T_switch2_max_C": report.second_temperature_max.0,
            "steps": report.steps,
        },
        "presses": presses,
        "events_first_press": events_of(charge::press_start(setup, 0)),
        "events_last_press": events_of(charge::press_start(setup, last)),
    })
}
