//! The report as JSON: the same text natively and in the page, to the last digit.
//!
//! Keys carry their unit. Numbers are written in the shortest form that reads back as the same number.

use serde_json::{Value, json};
use strikeline_core::arrangements::{self, Arranged, By, Given, Layer};
use strikeline_core::charge;
use strikeline_core::charger::{self, ChargeRun, ChargeStart, LoadLeftOn};
use strikeline_core::hazard::{self, Circumstances, Hazards};
use strikeline_core::margins::{self, Edge, Map, Margins};
use strikeline_core::press::{self, PressOptions, PressStart};
use strikeline_core::ratings::Band;
use strikeline_core::report::{
    ChargeEnd, ChargeReport, Event, EventKind, Ledger, Limit, Mode, NotFull, PressEnd, PressReport,
    PressSummary, Protector,
};
use strikeline_core::setup::Setup;
use strikeline_core::time_current::{self, Diagram};
use strikeline_core::units::{Amps, Celsius, Seconds};
use strikeline_core::verdict::{self, Overall, Reason, Word};

use crate::check::Checked;

/// Everything that is computed for a design.
#[derive(Debug, Clone, PartialEq)]
pub struct Answers {
    /// One charge with nominal parts.
    pub charge: ChargeReport,
    /// One charge with weak parts.
    pub weak: ChargeReport,
    /// The first press of the nominal charge.
    pub press: PressReport,
    /// A press of the nominal parts from half charge, rested.
    pub half: PressReport,
    /// The verdict from both charges and the hazards.
    pub verdict: Overall,
    /// One charge with nominal parts in the coldest surroundings of use, to its first press that is not full; `None`: no
    /// colder than ambient.
    pub cold: Option<ChargeReport>,
    /// What was found that can harm.
    pub hazards: Hazards,
}

/// What is computed beside the answers, and takes as long again.
#[derive(Debug, Clone, PartialEq)]
pub struct Further {
    /// What each of the four arrangements keeps and loses.
    pub arrangements: [Arranged; 4],
    /// Margins over the charge at ambient temperature, and in the coldest surroundings where those are colder.
    pub margins: Vec<Margins>,
    /// What a press does over charge and temperature.
    pub map: Map,
    /// The time–current diagram.
    pub diagram: Diagram,
    /// The next charge by the charger; `None`: there is no charger.
    pub charging: Option<Charging>,
}

/// How the charger fills the nominal cell from where its charge ended.
#[derive(Debug, Clone, PartialEq)]
pub struct Charging {
    /// State of charge it begins at: after the last full press, or where the charge ended without one.
    pub soc: f64,
    /// In the coldest and the hottest surroundings in which it is charged.
    pub runs: [ChargeRun; 2],
    /// What the load left on does, from the charger's figures.
    pub left_on: LoadLeftOn,
}

/// Rows of the margins.
const MARGIN_ROWS: usize = 41;
/// Columns of the map: states of charge.
pub const MAP_SOCS: [f64; 20] = [
    1.0, 0.95, 0.9, 0.85, 0.8, 0.75, 0.7, 0.65, 0.6, 0.55, 0.5, 0.45, 0.4, 0.35, 0.3, 0.25, 0.2, 0.15, 0.1,
    0.05,
];
/// Rows of the map, warmest first.
pub const MAP_TEMPERATURES: [f64; 9] = [50.0, 40.0, 30.0, 20.0, 10.0, 5.0, 0.0, -10.0, -20.0];

/// Computes everything for a checked design.
pub fn answer(checked: &Checked) -> Answers {
    let nominal = &checked.nominal;
    let charge = charge::run(nominal);
    let weak = charge::run(&checked.weak);
    let usage = &nominal.usage;
    let start = PressStart::relaxed(nominal, 1.0, usage.ambient);
    let options = PressOptions { samples: press::sample_times(usage.press), ..PressOptions::default() };
    let press = press::run(nominal, &start, &options);
    let half = PressStart::relaxed(nominal, 0.5, usage.ambient);
    let half = press::run(nominal, &half, &options);
    let coldest = checked.ratings.keeping.cold;
    let cold = (coldest < usage.ambient).then(|| {
        let mut there = nominal.clone();
        there.usage.ambient = coldest;
        charge::run_full_presses(&there)
    });
    let corners = corners(checked);
    let ratings = &checked.ratings;
    let hazards = hazard::hazards(&Circumstances {
        corners,
        weak: &checked.weak,
        charge: &charge,
        weak_charge: Some(&weak),
        cold_charge: cold.as_ref(),
        ratings,
    });
    let verdict = verdict::weigh(verdict::judge(&charge, &weak), &hazards);
    Answers { charge, weak, press, half, verdict, cold, hazards }
}

fn corners(checked: &Checked) -> margins::Corners<'_> {
    margins::Corners { low: &checked.low, typical: &checked.nominal, high: &checked.high }
}

/// Computes the margins, the map and the time–current diagram.
pub fn further(checked: &Checked, answers: &Answers) -> Further {
    let (nominal, ratings) = (&checked.nominal, &checked.ratings);
    let corners = corners(checked);
    let mut temperatures = vec![nominal.usage.ambient];
    temperatures.extend(answers.cold.as_ref().map(|_| ratings.keeping.cold));
    let margins = temperatures.into_iter().map(|t| margins::margins(corners, t, MARGIN_ROWS)).collect();
    let map = margins::map(nominal, &MAP_SOCS, &MAP_TEMPERATURES.map(Celsius));
    let diagram = time_current::diagram(corners, ratings, &answers.press);
    let charging = ratings.charger.map(|fitted| {
        let charge = &answers.charge;
        let full = charge.presses.iter().rfind(|p| p.summary.not_full.is_none());
        let soc = full.map_or(charge.soc_left, |p| p.summary.soc_end);
        let load = fitted.load_while_charging;
        let run = |ambient| charger::simulate(nominal, &fitted, &ChargeStart { soc, ambient, load });
        let runs = [run(fitted.ambient.0), run(fitted.ambient.1)];
        Charging { soc, runs, left_on: charger::load_left_on(&fitted, load) }
    });
    let arrangements = arrangements::compare(&Given { corners, charge: &answers.charge, ratings });
    Further { arrangements, margins, map, diagram, charging }
}

/// What a report holds beside verdict and summaries.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Extras {
    /// The events of the first press.
    pub events: bool,
    /// The trace of the first press.
    pub trace: bool,
    /// A line for every press of the charge.
    pub presses: bool,
    /// The rows of the margins.
    pub margins: bool,
}

/// The report of a design.
pub fn json(name: &str, checked: &Checked, answers: &Answers, further: &Further, extras: Extras) -> Value {
    let setup = &checked.nominal;
    let mut press = summary_json(setup, &answers.press.summary);
    if extras.events {
        press["events"] = answers.press.events.iter().map(|e| event_json(setup, e)).collect();
    }
    if extras.trace {
        press["trace"] = trace_json(&answers.press);
    }
    let mut charge = charge_json(setup, &answers.charge);
    if extras.presses {
        charge["presses_list"] = answers
            .charge
            .presses
            .iter()
            .map(|p| {
                let mut line = summary_json(setup, &p.summary);
                line["number"] = json!(p.number);
                line["rested_V"] = json!(p.rested.0);
                line
            })
            .collect();
    }
    json!({
        "report": 1,
        "name": name,
        "verdict": verdict_json(setup, &answers.verdict),
        "press": press,
        "charge": charge,
        "charge_weak_parts": charge_json(&checked.weak, &answers.weak),
        "hazards": hazards_json(&answers.hazards),
        "wiring": further.arrangements.iter().map(|a| arranged_json(setup, a)).collect::<Vec<_>>(),
        "margins": further.margins.iter().map(|m| margins_json(setup, m, extras.margins)).collect::<Vec<_>>(),
        "charging": further.charging.as_ref().map(|c| charging_json(checked, c)),
    })
}

fn charging_json(checked: &Checked, charging: &Charging) -> Value {
    let (cold, hot) = checked.ratings.charger.map_or_else(Default::default, |c| c.ambient);
    let runs: Vec<Value> = charging
        .runs
        .iter()
        .zip([cold, hot])
        .map(|(run, ambient)| {
            let l = &run.ledger;
            json!({
                "ambient_C": ambient.0, "ended": charger_end_name(run.end), "time_s": run.time.0,
                "to_80_percent_s": run.to_mostly.map(|t| t.0), "put_in_Ah": run.charge.0, "soc_end": run.soc,
                "trickle_s": run.phases[0].0, "constant_current_s": run.phases[1].0,
                "constant_voltage_s": run.phases[2].0, "T_cell_max_C": run.cell_temperature_max.0,
                "charger_heat_max_W": run.dissipation_max.0,
                "energy_J": {
                    "output": l.output.0, "load": l.load.0, "stored": l.stored.0, "entropic": l.entropic.0,
                    "cell_ohmic": l.ohmic.0, "cell_polarisation": l.polarisation.0, "path": l.path.0,
                },
                "ledger_residual_rel": l.residual(), "steps": run.steps,
            })
        })
        .collect();
    let left = &charging.left_on;
    json!({
        "soc_start": charging.soc, "runs": runs,
        "load_left_on": {
            "cell_at_constant_current_A": left.in_constant_current.0, "cell_in_trickle_A": left.in_trickle.0,
            "terminates": left.terminates,
        },
    })
}

/// The name of what ended a charge by the charger.
pub fn charger_end_name(end: charger::End) -> &'static str {
    match end {
        charger::End::Terminated => "terminated",
        charger::End::NeverTerminates => "never_terminates",
        charger::End::NeverRecovers => "never_recovers",
        charger::End::DischargesWhileCharging => "discharges_while_charging",
        charger::End::BeyondFull => "beyond_full",
        charger::End::WorkLimit => "work_limit",
    }
}

fn verdict_json(setup: &Setup, overall: &Overall) -> Value {
    let verdict = &overall.works;
    let word = match overall.word {
        Word::Holds => "holds",
        Word::Borderline => "borderline",
        Word::Fails => "fails",
    };
    let parts = match verdict.parts {
        verdict::Parts::Nominal => "nominal",
        verdict::Parts::Weak => "weak",
    };
    let reason = match verdict.reason {
        Reason::RunsDown(end) => format!("runs_down:{}", end_name(setup, end)),
        Reason::NoFullPress(why) => format!("no_full_press:{}", not_full_name(setup, why)),
        Reason::StopsEarly(end) => format!("stops_early:{}", end_name(setup, end)),
    };
    json!({ "word": word, "decided_with_parts": parts, "reason": reason, "stop_hazards": overall.stops })
}

/// The name of a variant, as a key: `NuisanceTrip { … }` is `nuisance_trip`.
fn key_of(shown: &str) -> String {
    let mut key = String::new();
    for c in shown.chars().take_while(char::is_ascii_alphanumeric) {
        if c.is_ascii_uppercase() && !key.is_empty() {
            key.push('_');
        }
        key.push(c.to_ascii_lowercase());
    }
    key
}

fn hazards_json(hazards: &Hazards) -> Value {
    let findings: Vec<Value> = hazards
        .findings
        .iter()
        .map(|f| {
            let level = key_of(&format!("{:?}", f.level));
            json!({ "level": level, "kind": key_of(&format!("{:?}", f.kind)), "source": hazard::source(&f.kind) })
        })
        .collect();
    let missing: Vec<String> = hazards.not_judged.iter().map(|n| key_of(&format!("{n:?}"))).collect();
    json!({ "checks_made": hazards.checks_made, "findings": findings, "not_judged": missing })
}

fn arranged_json(setup: &Setup, a: &Arranged) -> Value {
    let band = |b: &Option<Band>| b.map(|b| [b.low, b.typical, b.high]);
    let layers = |list: &[Layer]| -> Vec<Value> {
        list.iter()
            .map(|l| {
                let by = match l.by {
                    By::Stage(p, k) => limit_name(setup, Limit::Stage(p, k)),
                    By::OverDischarge(p) => limit_name(setup, Limit::OverDischarge(p)),
                    By::OverCharge(Protector::Board) => "over_charge".into(),
                    By::OverCharge(Protector::Second) => "second:over_charge".into(),
                    By::ChargeOverCurrent(Protector::Board) => "charge_over_current".into(),
                    By::ChargeOverCurrent(Protector::Second) => "second:charge_over_current".into(),
                    By::Fuse => "fuse".into(),
                };
                json!({ "by": by, "full_A": band(&l.full), "empty_A": band(&l.empty), "delay_s": band(&l.delay) })
            })
            .collect()
    };
    let seconds = |t: Option<Seconds>| t.map(|t| t.0);
    json!({
        "wired": key_of(&format!("{:?}", a.arrangement)),
        "over_current": layers(&a.over_current),
        "short_circuit": layers(&a.short_circuit),
        "over_discharge": layers(&a.over_discharge),
        "over_charge": layers(&a.over_charge),
        "charge_over_current": layers(&a.charge_over_current),
        "short_full_A": a.short_full.current.0,
        "short_empty_A": a.short_empty.current.0,
        "cell_K_per_s": a.short_full.cell_k_per_s,
        "lead_limits_s": a.short_full.leads.iter().map(|l| l.limit.0).collect::<Vec<_>>(),
        "held_to_3_0_V_s": seconds(a.held.to_3_0),
        "held_to_2_5_V_s": seconds(a.held.to_2_5),
        "held_to_2_0_V_s": seconds(a.held.to_2_0),
        "standby_s": seconds(a.standby),
    })
}

fn margins_json(setup: &Setup, margins: &Margins, with_rows: bool) -> Value {
    let amps = |i: Option<Amps>| i.map(|i| i.0);
    let rows: Vec<Value> = margins
        .rows
        .iter()
        .map(|row| {
            let trips: serde_json::Map<String, Value> = row
                .trips
                .iter()
                .map(|t| {
                    let band = json!({ "earliest_A": amps(t.low), "typical_A": amps(t.typical), "latest_A": amps(t.high) });
                    (limit_name(setup, t.limit), band)
                })
                .collect();
            json!({
                "soc": row.soc,
                "open_circuit_V": row.open_circuit.0,
                "load_unlit_V": row.unlit.map(|s| s.load.0),
                "load_lit_end_V": row.lit.map(|s| s.load.0),
                "draw_A": row.lit.map(|s| s.current.0),
                "trip": trips,
                "strikes_up_to_ohm": row.strikes_up_to.0,
                "holds_up_to_ohm": row.holds_up_to.0,
            })
        })
        .collect();
    let crossings: Vec<Value> = margins
        .crossings
        .iter()
        .map(|c| {
            let name = match c.edge {
                Edge::Strike => "strike_lost".to_string(),
                Edge::Hold => "hold_lost".to_string(),
                Edge::TripEarliest(l) => format!("earliest_board_trips:{}", limit_name(setup, l)),
                Edge::TripTypical(l) => format!("typical_board_trips:{}", limit_name(setup, l)),
                Edge::TripLatest(l) => format!("latest_board_trips:{}", limit_name(setup, l)),
                Edge::OverDischarge(p) => limit_name(setup, Limit::OverDischarge(p)),
            };
            json!({ "what": name, "soc": c.soc })
        })
        .collect();
    let mut out = json!({ "temperature_C": margins.temperature.0, "crossings": crossings });
    if with_rows {
        out["rows"] = rows.into();
    }
    out
}

/// The name of a limit: a stage's own, or `over_discharge`; `second:` in front for the second protector.
pub fn limit_name(setup: &Setup, limit: Limit) -> String {
    let (Limit::Stage(protector, _) | Limit::OverDischarge(protector)) = limit;
    let (front, board) = match protector {
        Protector::Board => ("", setup.board.as_ref()),
        Protector::Second => ("second:", setup.second_protector.as_ref()),
    };
    let name = match limit {
        Limit::Stage(_, k) => board.and_then(|b| b.stages.get(k)).map_or("stage", |s| s.name.as_str()),
        Limit::OverDischarge(_) => "over_discharge",
    };
    format!("{front}{name}")
}

/// The name of a reason for a press that is not full.
pub fn not_full_name(setup: &Setup, why: NotFull) -> String {
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

/// The name of what ended a charge.
pub fn end_name(setup: &Setup, end: ChargeEnd) -> String {
    match end {
        ChargeEnd::NoLitTime(why) => format!("no_lit_time:{}", not_full_name(setup, why)),
        ChargeEnd::Opened(limit) => format!("opened:{}", limit_name(setup, limit)),
        ChargeEnd::OpenedInRest(limit) => format!("opened_in_rest:{}", limit_name(setup, limit)),
        ChargeEnd::CellEmpty => "cell_empty".into(),
        ChargeEnd::EmptyInRest => "in_rest:cell_empty".into(),
        ChargeEnd::PressLimit => "press_limit".into(),
        ChargeEnd::WorkLimit => "work_limit".into(),
    }
}

/// The name of a state of the load.
pub fn mode_name(mode: Mode) -> &'static str {
    match mode {
        Mode::Stalled => "stalled",
        Mode::Pinned => "pinned",
        Mode::Unlit => "unlit",
        Mode::Lit => "lit",
    }
}

/// An event.
pub fn event_json(setup: &Setup, e: &Event) -> Value {
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

/// The energy ledger.
pub fn ledger_json(l: &Ledger) -> Value {
    json!({
        "source": l.source.0, "cell_ohmic": l.cell_ohmic.0, "cell_polarisation": l.cell_polarisation.0,
        "second_protector": l.second_protector.0, "ahead": l.ahead.0, "pair": l.pair.0, "shunt": l.shunt.0,
        "after": l.after.0, "esr": l.esr.0, "c_in_left": l.capacitor_left.0, "load_lit": l.load_lit.0,
        "load_unlit": l.load_unlit.0, "load_stalled": l.load_stalled.0, "standby": l.standby.0,
    })
}

/// A press in numbers.
pub fn summary_json(setup: &Setup, s: &PressSummary) -> Value {
    let (ended, opened_by) = match s.end {
        PressEnd::Released => ("released", None),
        PressEnd::Opened(limit) => ("opened", Some(limit)),
        PressEnd::CellEmpty => ("cell_empty", None),
        PressEnd::EventLimit => ("event_limit", None),
    };
    let v_end: Vec<f64> = s.branches_end.iter().take(setup.cell.branches.len()).map(|v| v.0).collect();
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

/// The trace of a press, column by column.
pub fn trace_json(report: &PressReport) -> Value {
    let trace = &report.trace;
    let column =
        |f: &dyn Fn(&strikeline_core::report::Sample) -> Value| trace.iter().map(f).collect::<Vec<_>>();
    json!({
        "t_s": column(&|s| json!(s.time.0)), "mode": column(&|s| json!(mode_name(s.mode))),
        "V_load_V": column(&|s| json!(s.load.0)), "V_board_V": column(&|s| json!(s.board.0)),
        "V_cell_V": column(&|s| json!(s.cell.0)), "I_A": column(&|s| json!(s.current.0)),
        "I_load_A": column(&|s| json!(s.load_current.0)), "v_C_V": column(&|s| json!(s.capacitor.0)),
        "soc": column(&|s| json!(s.soc)),
        "v_V": column(&|s| json!(s.branches.iter().map(|v| v.0).collect::<Vec<_>>())),
        "T_cell_C": column(&|s| json!(s.cell_temperature.0)),
        "T_switch_C": column(&|s| json!(s.switch_temperature.0)),
        "R_pair_ohm": column(&|s| json!(s.pair.0)), "sense": column(&|s| json!(s.sense)),
    })
}

/// A charge in numbers.
pub fn charge_json(setup: &Setup, report: &ChargeReport) -> Value {
    let v = |x: Option<strikeline_core::units::Volts>| x.map(|v| v.0);
    json!({
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
        "ended": end_name(setup, report.end), "clock_s": report.clock.0, "T_cell_max_C": report.cell_temperature_max.0,
        "T_switch_max_C": report.switch_temperature_max.0, "T_switch2_max_C": report.second_temperature_max.0,
        "steps": report.steps,
    })
}
