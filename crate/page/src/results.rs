//! The right-hand side as markup: verdict, facts, staircase, one press, one charge.

use strikeline_core::board::{SensePoint, Stage, Threshold};
use strikeline_core::driver;
use strikeline_core::report::{EventKind, Mode, PressReport};
use strikeline_core::setup::Setup;
use strikeline_core::units::Volts;
use strikeline_core::verdict::{self, Part};
use strikeline_design::check::{Checked, Estimate};
use strikeline_design::report::Answers;

use crate::chart::{self, Chart, Level, Line, Stair};
use crate::number::{amps, escaped, fixed, percent, time, volts};
use crate::sentences;

/// Markup with the charts that stand in it, for the cursor.
pub struct Results {
    /// The verdict and all sections.
    pub markup: String,
    /// The charts, by their id.
    pub charts: Vec<Chart>,
}

/// Everything for a design, `width` px wide.
pub fn results(checked: &Checked, answers: &Answers, width: f64) -> Results {
    let setup = &checked.nominal;
    let said = sentences::verdict(setup, answers);
    let inner = (width - 34.0).max(240.0);
    // As the style has it: two figures side by side from twice 430 px and a gap.
    let pair = if width >= 880.0 { (width - 20.0) / 2.0 - 34.0 } else { inner };
    let charts = vec![
        press_volts(setup, answers),
        press_amps(setup, answers),
        press_sense(setup, answers),
        charge_volts(setup, answers),
        charge_amps(setup, answers),
    ];
    let figure = |k: usize, title: &str, note: &str, wide: f64| {
        let svg = charts[k].svg(wide, if wide > pair { 290.0 } else { 260.0 });
        format!(
            "<figure><figcaption>{title}<span>{note}</span></figcaption>{svg}<p class=\"reading\" id=\"{}-reading\">Point at the chart, or focus it and use the arrow keys, to read values.</p></figure>",
            charts[k].id
        )
    };
    let sense = if charts[2].lines.is_empty() {
        String::new()
    } else {
        figure(2, "What the board senses", &sense_note(setup), pair)
    };
    let press_note = "first press of a full cell; time from switch closing, each decade as wide as the last";
    let markup = format!(
        "<div class=\"verdict {tone}\"><h1 class=\"word\">{word}</h1><p class=\"sentence\">{sentence}</p><p class=\"decided\">{decided}</p>{estimate}</div>\
         {facts}\
         <figure><figcaption>Where the voltage goes<span>{stairs_note}</span></figcaption>{stairs}</figure>\
         <h2 id=\"one-press\">One press</h2>{f0}<div class=\"two\">{f1}{sense}</div>{events}\
         <h2 id=\"one-charge\">One charge</h2><p>{charge_sentence}</p><div class=\"two\">{f2}{f3}</div>{energy}",
        tone = said.tone,
        word = said.word,
        sentence = escaped(&said.sentence),
        decided = escaped(&said.decided),
        estimate = checked.estimate.as_ref().map(estimate).unwrap_or_default(),
        facts = facts(setup, answers),
        stairs_note = stairs_note(answers),
        stairs = stairs(setup, answers, inner),
        f0 = figure(0, "Voltage", press_note, inner),
        f1 = figure(1, "Current", "the same press; each step up is three times as much", pair),
        events = events(setup, &answers.press),
        charge_sentence = escaped(&charge_sentence(setup, answers)),
        f2 = figure(
            3,
            "Voltage, press by press",
            "rested before each press, and at the load at its end",
            pair
        ),
        f3 = figure(
            4,
            "Draw against the board's trip",
            "at the end of each press; the trip from the switch as warm and as hard driven as it is then",
            pair
        ),
        energy = energy(answers),
    );
    Results { markup, charts }
}

/// What the strike voltage rests on where it is an estimate.
fn estimate(e: &Estimate) -> String {
    let kv = |v: f64| format!("{} kV", fixed(v * 1e-3, 1));
    let full = Volts(4.2);
    let tank = e.tank.map_or_else(String::new, |t| {
        let flow =
            e.tank_current(full).map_or_else(String::new, |i| format!(", {} in its capacitors", amps(i.0)));
        format!(" The tank runs at {} kHz{flow}.", fixed(t.frequency.0 * 1e-3, 0))
    });
    format!(
        "<p class=\"estimate\"><b>◆ Estimated, not measured.</b> The gap breaks down at {} to {} peak; by turns alone that takes {} to {} at the load. A winding peaks at {} from {} (π times).{tank} Turn a bench supply up slowly and measure the strike voltage before anything is soldered.</p>",
        kv(e.gap.low.0),
        kv(e.gap.high.0),
        volts(e.strike.low.0),
        volts(e.strike.high.0),
        volts(driver::winding_peak(full).0),
        volts(full.0)
    )
}

fn fact(name: &str, value: &str, note: &str) -> String {
    format!("<div><dt>{name}</dt><dd class=\"value\">{value}</dd><dd class=\"note\">{note}</dd></div>")
}

fn facts(setup: &Setup, answers: &Answers) -> String {
    let charge = &answers.charge;
    let weak = answers.weak.full_presses;
    let mark = charge.recharge_mark.map_or("—".into(), |v| volts(v.0));
    let mark_note = match charge.mark_in_use_after {
        Some(v) => format!("rested for hours; {} read between presses", volts(v.0)),
        None => "there is no full press to recharge after".into(),
    };
    let (spare, spare_note) = match at_strike(answers) {
        Some(v) => {
            let over = fixed((v - setup.load.strike.0) * 1e3, 0);
            let held = lit_end(answers).map_or("the arc does not stay lit".into(), |v| {
                format!("{} mV over the hold voltage when lit", fixed((v - setup.load.hold.0) * 1e3, 0))
            });
            (format!("{over} mV"), format!("before the arc lights, at half charge; {held}"))
        }
        None => ("—".into(), "it does not run at half charge".into()),
    };
    let (trip, trip_note) = match trip_margin(setup, answers) {
        Some((ratio, i, limit)) => (
            format!("{} ×", fixed(ratio, 2)),
            format!(
                "of the draw, at the tightest full press: trips above {}, draws {}",
                amps(limit),
                amps(i)
            ),
        ),
        None => ("—".into(), "nothing limits the current".into()),
    };
    format!(
        "<dl class=\"facts\">{}{}{}{}</dl>",
        fact(
            "Full presses per charge",
            &charge.full_presses.to_string(),
            &format!("{weak} with weak parts; {} of arc time", time(charge.lit.0))
        ),
        fact("Recharge when a meter reads", &mark, &mark_note),
        fact("Over the strike voltage", &spare, &spare_note),
        fact("Board's trip over draw", &trip, &trip_note),
    )
}

/// Highest voltage at the load while it runs without an arc, in the press from half charge.
fn at_strike(answers: &Answers) -> Option<f64> {
    answers.half.trace.iter().filter(|s| s.mode == Mode::Unlit).map(|s| s.load.0).reduce(f64::max)
}

/// Voltage at the load at the end of the press from half charge, if it is lit then.
fn lit_end(answers: &Answers) -> Option<f64> {
    let summary = &answers.half.summary;
    (summary.end_mode == Mode::Lit).then_some(summary.load_end.0)
}

/// The current above which the board's first stage trips when its pair has the resistance `pair`.
fn trip_current(setup: &Setup, pair: f64) -> Option<f64> {
    let board = setup.board_in_path()?;
    board
        .stages
        .iter()
        .map(|stage| match (stage.threshold, board.sense) {
            (Threshold::Current(i), _) => i.0,
            (Threshold::Sense(v), SensePoint::Pair) => v.0 / pair,
            (Threshold::Sense(v), SensePoint::Shunt) => v.0 / board.shunt.0,
        })
        .reduce(f64::min)
}

/// The least trip current over the draw among full presses: ratio, draw, trip.
fn trip_margin(setup: &Setup, answers: &Answers) -> Option<(f64, f64, f64)> {
    let peak = setup.load.peak_factor;
    answers
        .charge
        .presses
        .iter()
        .map(|p| &p.summary)
        .filter(|s| s.not_full.is_none())
        .filter_map(|s| {
            let (i, limit) = (s.current_end.0 * peak, trip_current(setup, s.pair_end.0)?);
            Some((limit / i, i, limit))
        })
        .reduce(|a, b| if b.0 < a.0 { b } else { a })
}

/// The sample the staircase is drawn from: the last lit one of the press from half charge, else its last.
fn stairs_sample(answers: &Answers) -> Option<&strikeline_core::report::Sample> {
    let trace = &answers.half.trace;
    trace.iter().rev().find(|s| s.mode == Mode::Lit).or(trace.last())
}

fn stairs_note(answers: &Answers) -> String {
    stairs_sample(answers).map_or_else(String::new, |s| {
        let state = if s.mode == Mode::Lit { "lit" } else { "not lit" };
        format!(
            "half charge, rested before; {} after closing, {state}, {}",
            time(s.time.0),
            amps(s.current.0)
        )
    })
}

fn stairs(setup: &Setup, answers: &Answers, width: f64) -> String {
    let Some(sample) = stairs_sample(answers) else { return String::new() };
    let case = verdict::staircase(setup, sample);
    let mut level = case.open_circuit.0;
    let mut steps = Vec::new();
    for drop in &case.drops {
        let name = match drop.part {
            Part::CellAtOnce => "Cell, at once",
            Part::CellSlow => "Cell, slowly",
            Part::AheadOfBoard => "Ahead of board",
            Part::BoardSwitch => "Board's switch",
            Part::BoardShunt => "Board's shunt",
            Part::AfterBoard => "Leads and button",
        };
        steps.push(Stair { name: name.into(), from: level, to: level - drop.volts.0 });
        level -= drop.volts.0;
    }
    let summary = format!(
        "From {} open circuit to {} at the load; strikes at {}, holds down to {}.",
        volts(case.open_circuit.0),
        volts(case.load.0),
        volts(setup.load.strike.0),
        volts(setup.load.hold.0)
    );
    let marks = [("strikes", setup.load.strike.0), ("holds", setup.load.hold.0)];
    chart::staircase(case.open_circuit.0, &steps, case.load.0, &marks, width, &summary)
}

fn levels(setup: &Setup) -> Vec<Level> {
    vec![
        Level { name: format!("strikes, {}", volts(setup.load.strike.0)), value: setup.load.strike.0 },
        Level { name: format!("holds, {}", volts(setup.load.hold.0)), value: setup.load.hold.0 },
    ]
}

fn press_chart(id: &'static str, answers: &Answers, unit: &'static str, summary: String) -> Chart {
    let x = answers.press.trace.iter().skip(1).map(|s| s.time.0).collect();
    Chart {
        id,
        summary,
        x,
        log: true,
        x_text: time,
        x_label: "time",
        unit,
        lines: vec![],
        levels: vec![],
        log_values: None,
        named_left: true,
        marks: vec![],
    }
}

fn press_volts(setup: &Setup, answers: &Answers) -> Chart {
    let summary = &answers.press.summary;
    let text = format!(
        "Voltage over the first press; it ends after {} with {} at the load.",
        time(summary.end_time.0),
        volts(summary.load_end.0)
    );
    let mut chart = press_chart("press-volts", answers, "V", text);
    let trace = answers.press.trace.iter().skip(1);
    chart.lines = vec![
        Line { name: "cell".into(), class: "soft", values: trace.clone().map(|s| s.cell.0).collect() },
        Line { name: "board".into(), class: "amp", values: trace.clone().map(|s| s.board.0).collect() },
        Line { name: "load".into(), class: "volt", values: trace.map(|s| s.load.0).collect() },
    ];
    chart.levels = levels(setup);
    chart.named_left = false;
    chart.marks = happenings(answers);
    chart
}

/// What happens in the first press, for the top of its charts.
fn happenings(answers: &Answers) -> Vec<(f64, String)> {
    let mut out: Vec<(f64, String)> = Vec::new();
    for e in &answers.press.events {
        let text = match e.kind {
            EventKind::StartReached => "runs",
            EventKind::StrikeReached => "strike voltage",
            EventKind::Lit => "lit",
            EventKind::Drop => "drops",
            EventKind::Stalls => "stalls",
            EventKind::Opened(_) => "board opens",
            EventKind::Released => "released",
            _ => continue,
        };
        // The first of each kind: a flickering arc would fill the top.
        if !out.iter().any(|(_, t)| t == text) {
            out.push((e.time.0, text.into()));
        }
    }
    out
}

fn press_amps(setup: &Setup, answers: &Answers) -> Chart {
    let summary = &answers.press.summary;
    let text = format!(
        "Current over the first press; its peak is {}, at the end {}.",
        amps(summary.peak_current.0),
        amps(summary.current_end.0)
    );
    let mut chart = press_chart("press-amps", answers, "A", text);
    let trace = answers.press.trace.iter().skip(1);
    chart.lines = vec![Line {
        name: "path".into(),
        class: "amp",
        values: trace.clone().map(|s| s.current.0).collect(),
    }];
    if let Some(trip) = trip_current(setup, summary.pair_end.0) {
        chart.levels.push(Level { name: format!("lowest trip, {}", amps(trip)), value: trip });
    }
    chart.log_values = Some(0.03);
    chart.named_left = false;
    chart
}

/// The sense voltage of the first press against each stage that has one.
fn press_sense(setup: &Setup, answers: &Answers) -> Chart {
    let stages: &[Stage] = setup.board_in_path().map_or(&[], |b| &b.stages);
    let seen = stages.iter().position(|s| matches!(s.threshold, Threshold::Sense(_)));
    let mut chart = press_chart(
        "press-sense",
        answers,
        "mV",
        "The sense voltage over the first press, against each stage.".into(),
    );
    if let Some(k) = seen {
        let values = answers
            .press
            .trace
            .iter()
            .skip(1)
            .map(|s| s.sense.get(k).copied().unwrap_or(f64::NAN) * 1e3)
            .collect();
        chart.lines = vec![Line { name: "sense".into(), class: "near", values }];
        chart.levels = stages
            .iter()
            .filter_map(|s| match s.threshold {
                Threshold::Sense(v) => Some(Level {
                    name: format!("{} mV for {}", fixed(v.0 * 1e3, 0), time(s.delay.0)),
                    value: v.0 * 1e3,
                }),
                Threshold::Current(_) => None,
            })
            .collect();
    }
    chart.log_values = Some(1.0);
    chart.named_left = false;
    chart
}

fn sense_note(setup: &Setup) -> String {
    let over = match setup.board_in_path().map(|b| b.sense) {
        Some(SensePoint::Shunt) => "over the shunt",
        _ => "over the switch pair",
    };
    let peak = if setup.load.peak_factor > 1.0 { ", peaks of the draw included" } else { "" };
    format!("{over}{peak}; it opens where it stays above a level for that level's delay")
}

fn charge_chart(id: &'static str, answers: &Answers, unit: &'static str, summary: String) -> Chart {
    let x = answers.charge.presses.iter().map(|p| f64::from(p.number)).collect();
    Chart {
        id,
        summary,
        x,
        log: false,
        x_text: |n| format!("press {n:.0}"),
        x_label: "press",
        unit,
        lines: vec![],
        levels: vec![],
        log_values: None,
        named_left: true,
        marks: vec![],
    }
}

fn charge_volts(setup: &Setup, answers: &Answers) -> Chart {
    let text = format!("Voltage over {} presses of one charge.", answers.charge.presses.len());
    let mut chart = charge_chart("charge-volts", answers, "V", text);
    let presses = answers.charge.presses.iter();
    let lit_end = |p: &strikeline_core::report::PressLine| {
        if p.summary.end_mode == Mode::Lit { p.summary.load_end.0 } else { f64::NAN }
    };
    chart.lines = vec![
        Line { name: "rested".into(), class: "soft", values: presses.clone().map(|p| p.rested.0).collect() },
        Line { name: "load, lit".into(), class: "volt", values: presses.map(lit_end).collect() },
    ];
    chart.levels = levels(setup);
    if let Some(mark) = answers.charge.recharge_mark {
        chart.levels.push(Level { name: format!("recharge mark, {}", volts(mark.0)), value: mark.0 });
    }
    chart
}

fn charge_amps(setup: &Setup, answers: &Answers) -> Chart {
    let text =
        "The draw at the end of each press against the current above which the board trips.".to_string();
    let mut chart = charge_chart("charge-amps", answers, "A", text);
    let presses = answers.charge.presses.iter();
    let lit = |p: &strikeline_core::report::PressLine| {
        if p.summary.end_mode == Mode::Lit {
            p.summary.current_end.0 * setup.load.peak_factor
        } else {
            f64::NAN
        }
    };
    chart.lines =
        vec![Line { name: "draw, lit".into(), class: "amp", values: presses.clone().map(lit).collect() }];
    if setup.board_in_path().is_some_and(|b| !b.stages.is_empty()) {
        let trips = presses.map(|p| trip_current(setup, p.summary.pair_end.0).unwrap_or(f64::NAN)).collect();
        chart.lines.push(Line { name: "trips above".into(), class: "near", values: trips });
    }
    chart
}

fn events(setup: &Setup, press: &PressReport) -> String {
    const SHOWN: usize = 24;
    let items: String = press
        .events
        .iter()
        .take(SHOWN)
        .map(|e| format!("<li>{}</li>", escaped(&sentences::event(setup, e))))
        .collect();
    let more = press.events.len().saturating_sub(SHOWN);
    let more = if more > 0 { format!("<p>and {more} more, the same again.</p>") } else { String::new() };
    format!(
        "<details class=\"events\" id=\"events\" open><summary>What happens, in order</summary><ol>{items}</ol>{more}</details>"
    )
}

fn charge_sentence(setup: &Setup, answers: &Answers) -> String {
    let charge = &answers.charge;
    let first = charge.first_imperfect.and_then(|k| {
        let press = &charge.presses[k];
        let why = press.summary.not_full?;
        Some(format!(
            "The first press that is not full is number {}: {}. ",
            press.number,
            sentences::not_full(setup, why)
        ))
    });
    let why = sentences::ended(setup, charge.end);
    let heat = format!(
        "The cell reaches {} °C, the board's switch {} °C.",
        fixed(charge.cell_temperature_max.0, 1),
        fixed(charge.switch_temperature_max.0, 1)
    );
    format!(
        "{}The charge ends at press {} because {why}; {} of the charge is left. {heat}",
        first.unwrap_or_default(),
        charge.presses.len(),
        percent(charge.soc_left)
    )
}

fn energy(answers: &Answers) -> String {
    let l = &answers.charge.ledger;
    let source = l.source.0.max(1e-12);
    let rows = [
        ("into the arc", l.load_lit.0),
        ("load without an arc", l.load_unlit.0 + l.load_stalled.0),
        ("cell, at once", l.cell_ohmic.0),
        ("cell, slowly", l.cell_polarisation.0),
        ("cell's own protector", l.second_protector.0),
        ("ahead of the board", l.ahead.0),
        ("board's switch and shunt", l.pair.0 + l.shunt.0),
        ("leads and button", l.after.0),
        ("input capacitor", l.esr.0 + l.capacitor_left.0),
        ("standby", l.standby.0),
    ];
    let body: String = rows
        .iter()
        .filter(|(_, j)| *j > 0.0)
        .map(|(name, j)| {
            format!(
                "<tr><th scope=\"row\">{name}</th><td>{} J</td><td>{}</td><td class=\"bar\"><i style=\"--part:{:.4}\"></i></td></tr>",
                fixed(*j, if *j < 10.0 { 2 } else { 0 }),
                percent(j / source),
                j / source
            )
        })
        .collect();
    format!(
        "<figure><figcaption>Where the energy goes<span>one charge, presses and rests; {} J from the cell</span></figcaption>\
         <table class=\"energy\"><thead><tr><th scope=\"col\">part</th><th scope=\"col\">energy</th><th scope=\"col\">share</th><th scope=\"col\"><span class=\"unseen\">bar</span></th></tr></thead><tbody>{body}</tbody></table></figure>",
        fixed(l.source.0, 0)
    )
}

#[cfg(test)]
mod tests {
    use super::*;
    use strikeline_design::check::check;
    use strikeline_design::design::Design;
    use strikeline_design::report::answer;

    #[test]
    fn law_results_are_whole_for_every_arrangement_and_law() {
        for way in ["through_board", "load_at_cell", "switch_bridged", "no_board"] {
            for law in ["table", "current", "power", "resistance"] {
                let mut design = Design::demo();
                design.set("board.arrangement", way);
                design.set("load.law", law);
                let checked = check(&design).expect("sound");
                let results = results(&checked, &answer(&checked), 390.0);
                assert!(!results.markup.contains("NaN") && !results.markup.contains("inf "), "{way} {law}");
                assert!(results.markup.contains("Full presses per charge"));
            }
        }
    }
}
