//! The next charge by the charger: how long, how fast, how warm, and what a load left on does to it.

use strikeline_core::charger::{ChargeRun, End, Phase};
use strikeline_core::hazard::CHARGE_HOT_STOP;
use strikeline_core::ratings::{Charger, Ratings};
use strikeline_design::check::Checked;
use strikeline_design::report::{Answers, Charging};

use crate::chart::{Chart, Level, Line};
use crate::number::{amps, degrees, fixed, percent, time, volts};
use crate::results::Results;

/// The section, `width` px wide.
pub fn charging(checked: &Checked, answers: &Answers, charging: Option<&Charging>, width: f64) -> Results {
    let head = "<h2 id=\"charging\">Charging</h2>";
    let (Some(charging), Some(charger)) = (charging, &checked.ratings.charger) else {
        let said =
            "<p>No charger is entered, so nothing about charging is judged. Enter it under “Charger”.</p>";
        return Results { markup: format!("{head}{said}{}", cautions()), charts: vec![] };
    };
    let inner = (width - 34.0).max(240.0);
    let pair = if width >= 880.0 { (width - 20.0) / 2.0 - 34.0 } else { inner };
    // The one in the colder surroundings takes longer: that is the one to show.
    let run = &charging.runs[0];
    let charts =
        if run.trace.len() > 2 { vec![voltage(run, charger), current(run, charger)] } else { vec![] };
    let figures: String = charts
        .iter()
        .zip(["Voltage while charging", "Current while charging"])
        .map(|(chart, title)| {
            let (id, svg) = (chart.id, chart.svg(pair, 220.0));
            format!(
                "<figure><figcaption>{title}<span>at {}, minutes from the start</span></figcaption>{svg}<p class=\"reading\" id=\"{id}-reading\">Point at the chart, or focus it and use the arrow keys, to read values.</p></figure>",
                degrees(charger.ambient.0.0)
            )
        })
        .collect();
    let items: String = items(&checked.ratings, charger, checked.nominal.cell.parallel, charging)
        .into_iter()
        .map(|text| format!("<li>{text}</li>"))
        .collect();
    let markup = format!(
        "{head}<p>{}</p><ul class=\"judged\">{items}</ul><div class=\"two\">{figures}</div>{}",
        lead(charger, charging, answers.charge.full_presses > 0),
        cautions()
    );
    Results { markup, charts }
}

/// What comes of it, in a sentence or two.
fn lead(charger: &Charger, charging: &Charging, after_full_press: bool) -> String {
    let from = if after_full_press {
        format!("From the recharge mark ({} charge)", percent(charging.soc))
    } else {
        format!("From {} charge", percent(charging.soc))
    };
    let [cold, hot] = &charging.runs;
    let (at_cold, at_hot) = (degrees(charger.ambient.0.0), degrees(charger.ambient.1.0));
    let load = amps(charger.load_while_charging.0);
    match (cold.end, hot.end) {
        (End::Terminated, End::Terminated) => {
            let mostly = cold.to_mostly.map_or(String::new(), |t| format!(", 80 % after {}", duration(t.0)));
            format!(
                "{from} to full: <b>{}</b> at {at_cold}{mostly}, and {} at {at_hot}. {} Ah go in; the constant current lasts {}, the constant voltage {}.",
                duration(cold.time.0),
                duration(hot.time.0),
                fixed(cold.charge.0, 2),
                duration(cold.phases[1].0),
                duration(cold.phases[2].0)
            )
        }
        (end, other) => {
            let worst = if end == End::Terminated { other } else { end };
            let text = match worst {
                End::NeverTerminates => format!(
                    "the charger never ends: the {load} that the device draws keeps its current above {}. The cell stays at the charge voltage for as long as it is connected, which ages it and hides a fault",
                    amps(charger.termination.0)
                ),
                End::NeverRecovers => format!(
                    "the charger never gets beyond its trickle: the {load} that the device draws is the whole {} or more, and a low cell goes on being drained",
                    amps(charger.trickle.0)
                ),
                End::DischargesWhileCharging => format!(
                    "the cell is drained while it is “charged”: the device draws {load}, the charger gives {}",
                    amps(charger.current.typical)
                ),
                End::BeyondFull => format!(
                    "the cell’s voltage curve does not reach {}: this charger does not suit this cell, or the curve is wrong",
                    volts(charger.float.typical)
                ),
                End::WorkLimit | End::Terminated => {
                    "the charge could not be followed to its end with these figures".into()
                }
            };
            format!("<b>▲ Stop.</b> {from}, {text}.")
        }
    }
}

/// A duration in hours and minutes.
fn duration(s: f64) -> String {
    let minutes = (s / 60.0).round();
    if minutes < 100.0 {
        return time(s);
    }
    format!("{} h {} min", fixed((minutes / 60.0).floor(), 0), fixed(minutes % 60.0, 0))
}

/// A judgement in word and shape: of the typical value, and of the worst that the tolerance allows.
fn mark(within: Option<(bool, bool)>) -> &'static str {
    match within {
        Some((true, true)) => "<b>● Within.</b>",
        Some((true, false)) => "<b>◆ Only nearly.</b>",
        Some((false, _)) => "<b>▲ Not within.</b>",
        None => "<b>○ Not judged.</b>",
    }
}

/// The same where nothing has a tolerance.
fn plain(within: bool) -> Option<(bool, bool)> {
    Some((within, within))
}

fn items(ratings: &Ratings, charger: &Charger, parallel: u32, charging: &Charging) -> Vec<String> {
    let cell = &ratings.cell;
    let each = 1.0 / f64::from(parallel);
    let (typical, most) = (charger.current.typical * each, charger.current.high * each);
    let rate = format!("{} It", fixed(typical / cell.it.0, 2));
    let shared = if parallel > 1 { " for each cell" } else { "" };
    let limit = match cell.charge {
        Some(limit) => format!("the cell may have {}", amps(limit.0)),
        None => "the cell’s own limit is not entered".into(),
    };
    let current = format!(
        "{} Charge current {}{shared}, at most {}: {rate}; {limit}.",
        mark(cell.charge.map(|limit| (typical <= limit.0, most <= limit.0))),
        amps(typical),
        amps(most)
    );
    let (cold, hot) = charger.ambient;
    let hottest = charging.runs.iter().map(|r| r.cell_temperature_max.0).fold(f64::NEG_INFINITY, f64::max);
    let window = cell.charge_window;
    let inside = cold >= window.0 && hottest <= window.1.0.min(CHARGE_HOT_STOP.0);
    let temperature = format!(
        "{} Charged from {} to {}, the cell at most {}; it may be charged from {} to {}. Below that lithium plates out, for good and unseen.",
        mark(plain(inside)),
        degrees(cold.0),
        degrees(hot.0),
        degrees(hottest),
        degrees(window.0.0),
        degrees(window.1.0)
    );
    let most = cell.voltage_max.0 + 1e-9;
    let float = format!(
        "{} Charge voltage {} to {}, set to {}; the cell may have {}.",
        mark(Some((charger.float.typical <= most, charger.float.high <= most))),
        volts3(charger.float.low),
        volts3(charger.float.high),
        volts3(charger.float.typical),
        volts3(cell.voltage_max.0)
    );
    vec![current, temperature, float, left_on(charger, charging), heat(charger, &charging.runs)]
}

fn volts3(v: f64) -> String {
    format!("{} V", fixed(v, 3))
}

/// The load that stays on, in each phase.
fn left_on(charger: &Charger, charging: &Charging) -> String {
    let load = charger.load_while_charging.0;
    let left = &charging.left_on;
    if load == 0.0 {
        return format!(
            "{} Nothing draws current meanwhile. From {} on a load would keep the charge from ending.",
            mark(plain(true)),
            amps(charger.termination.0)
        );
    }
    let fine = left.terminates && left.in_trickle.0 > 0.0 && left.in_constant_current.0 > 0.0;
    format!(
        "{} The device draws {} meanwhile: the cell gets {} at constant current and {} in trickle, and the charge {}.",
        mark(plain(fine)),
        amps(load),
        amps(left.in_constant_current.0),
        amps(left.in_trickle.0),
        if left.terminates { "can end" } else { "never ends" }
    )
}

/// Heat in a linear charger over the charge.
fn heat(charger: &Charger, runs: &[ChargeRun; 2]) -> String {
    let most = runs.iter().map(|r| r.dissipation_max.0).fold(0.0, f64::max);
    let run = &runs[1];
    let given = run.charge.0 * 3600.0 + charger.load_while_charging.0 * run.time.0;
    let mean = if run.time.0 > 0.0 {
        let joules = charger.input.0 * given - run.ledger.output.0;
        format!(", {} W on average over the charge", fixed(joules / run.time.0, 2))
    } else {
        String::new()
    };
    let limit = match charger.power_limit {
        Some(limit) => format!("it stands {} W as it is mounted", fixed(limit.0, 2)),
        None => "what it stands is not entered".into(),
    };
    format!(
        "{} A linear charger at {} turns at most {} W into heat{mean}; {limit}.",
        mark(charger.power_limit.and_then(|limit| plain(most <= limit.0))),
        volts(charger.input.0),
        fixed(most, 2)
    )
}

fn cautions() -> String {
    "<p><b>Whenever it is charged</b> (common practice, no source): stay with it, on a surface that does not burn, with nothing that burns near it. \
     Stop and take it outside if the cell swells, smells, hisses or gets hot to the touch. \
     Never charge a cell that is swollen, dented, wet, below 0 °C or has been below 2 V. \
     Do not press the button while it is charged. Keep the board’s over-charge protection in the path: a charger can fail.</p>"
        .into()
}

fn chart(id: &'static str, run: &ChargeRun, unit: &'static str) -> Chart {
    Chart {
        id,
        summary: String::new(),
        x: run.trace.iter().map(|p| p.time.0 / 60.0).collect(),
        log: false,
        x_text: |x| format!("after {} min", fixed(x, 0)),
        x_label: "minutes",
        unit,
        lines: vec![],
        levels: vec![],
        log_values: None,
        named_left: false,
        marks: phases(run),
    }
}

/// Where each phase begins after the first.
fn phases(run: &ChargeRun) -> Vec<(f64, String)> {
    run.trace
        .windows(2)
        .filter(|w| w[0].phase != w[1].phase)
        .map(|w| {
            let name = match w[1].phase {
                Phase::Trickle => "trickle",
                Phase::ConstantCurrent => "constant current",
                Phase::ConstantVoltage => "constant voltage",
            };
            (w[1].time.0 / 60.0, name.into())
        })
        .collect()
}

fn voltage(run: &ChargeRun, charger: &Charger) -> Chart {
    let mut chart = chart("charging-volts", run, "V");
    let trace = &run.trace;
    chart.lines = vec![
        Line { name: "charger".into(), class: "soft", values: trace.iter().map(|p| p.output.0).collect() },
        Line { name: "cell".into(), class: "volt", values: trace.iter().map(|p| p.cell.0).collect() },
    ];
    let float = charger.float.typical;
    chart.levels = vec![Level { name: format!("charge voltage, {}", volts(float)), value: float }];
    chart.summary =
        format!("Voltage of cell and charger over {}, up to {}.", duration(run.time.0), volts(float));
    chart
}

fn current(run: &ChargeRun, charger: &Charger) -> Chart {
    let mut chart = chart("charging-amps", run, "A");
    chart.lines = vec![Line {
        name: "into the cell".into(),
        class: "amp",
        values: run.trace.iter().map(|p| p.current.0).collect(),
    }];
    let ends = charger.termination.0;
    chart.named_left = true;
    chart.levels = vec![Level { name: format!("ends at {}", amps(ends)), value: ends }];
    chart.summary =
        format!("Current into the cell over {}; it ends at {}.", duration(run.time.0), amps(ends));
    chart
}

#[cfg(test)]
mod tests {
    use super::*;
    use strikeline_design::{check, design::Design, report};

    fn said(fields: &[(&str, &str)]) -> Results {
        let mut design = Design::demo();
        for (key, text) in fields {
            design.set(key, text);
        }
        let checked = check::check(&design).expect("a sound design");
        let answers = report::answer(&checked);
        let further = report::further(&checked, &answers);
        charging(&checked, &answers, further.charging.as_ref(), 1000.0)
    }

    #[test]
    fn exact_without_a_charger_nothing_is_judged() {
        let said = said(&[("charger.fitted", "no")]);
        assert!(said.markup.contains("No charger is entered") && said.charts.is_empty());
        assert!(!said.markup.contains("Within"));
    }

    #[test]
    fn exact_every_ending_has_its_words() {
        let of = |load: &str| said(&[("charger.fitted", "yes"), ("charger.load", load)]).markup;
        let fine = of("0 mA");
        // 4.2 V ± 1.5 % on a cell of 4.2 V: its typical value is within, its highest not.
        assert!(fine.contains("◆ Only nearly.</b> Charge voltage 4.137 V to 4.263 V"), "{fine}");
        assert!(fine.contains("to full: <b>") && !fine.contains("NaN"), "{fine}");
        assert!(of("150 mA").contains("never ends"));
        assert!(of("3 A").contains("▲ Stop."));
        for part in ["It;", "lithium", "Charge voltage", "Nothing draws", "linear charger", "surface"] {
            assert!(fine.contains(part), "{part} is missing in {fine}");
        }
    }
}
