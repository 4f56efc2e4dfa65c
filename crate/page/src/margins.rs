//! The margins over the charge, the map of outcomes, and what can keep the load from starting.

use strikeline_core::margins::{Crossing, Edge, Map, Margins, Outcome, Row, StartUp};
use strikeline_core::report::Limit;
use strikeline_core::setup::Setup;
use strikeline_design::report::Answers;

use crate::chart::{Chart, Level, Line};
use crate::number::{amps, degrees, escaped, fixed, percent, volts};
use crate::sentences;

/// Charts of a temperature: their ids have to be unique on the page.
const IDS: [[&str; 2]; 2] = [["margin-volts", "margin-amps"], ["margin-volts-cold", "margin-amps-cold"]];

fn chart(id: &'static str, m: &Margins, unit: &'static str, summary: String) -> Chart {
    Chart {
        id,
        summary,
        x: m.rows.iter().map(|r| 100.0 * (1.0 - r.soc)).collect(),
        log: false,
        x_text: |used| format!("{:.0} % left", 100.0 - used),
        x_label: "charge used, %",
        unit,
        lines: vec![],
        levels: vec![],
        log_values: None,
        named_left: true,
        marks: vec![],
    }
}

fn volts_chart(setup: &Setup, m: &Margins, id: &'static str) -> Chart {
    let text = format!(
        "Voltage at the load over the charge at {}: before the arc lights, and lit at the end of a press.",
        degrees(m.temperature.0)
    );
    let mut c = chart(id, m, "V", text);
    let of = |pick: fn(&Row) -> Option<f64>| m.rows.iter().map(|r| pick(r).unwrap_or(f64::NAN)).collect();
    c.lines = vec![
        Line { name: "not lit".into(), class: "soft", values: of(|r| r.unlit.map(|s| s.load.0)) },
        Line { name: "lit, at the end".into(), class: "volt", values: of(|r| r.lit.map(|s| s.load.0)) },
    ];
    c.levels = vec![
        Level { name: format!("strikes, {}", volts(setup.load.strike.0)), value: setup.load.strike.0 },
        Level { name: format!("holds, {}", volts(setup.load.hold.0)), value: setup.load.hold.0 },
    ];
    c
}

/// The stage nearest to the draw: the one whose lowest trip is least.
fn nearest(m: &Margins) -> Option<usize> {
    let least = |k: usize| {
        m.rows.iter().filter_map(|r| r.trips.get(k)?.low).map(|i| i.0).fold(f64::INFINITY, f64::min)
    };
    (0..m.rows.first()?.trips.len())
        .filter(|k| least(*k).is_finite())
        .min_by(|a, b| least(*a).total_cmp(&least(*b)))
}

fn amps_chart(setup: &Setup, m: &Margins, id: &'static str) -> Chart {
    let mut c = chart(id, m, "A", String::new());
    let draw = m.rows.iter().map(|r| r.lit.map_or(f64::NAN, |s| s.current.0)).collect();
    c.lines = vec![Line { name: "draw".into(), class: "amp", values: draw }];
    c.summary = format!("Draw at the end of a press over the charge at {}.", degrees(m.temperature.0));
    if let Some(k) = nearest(m) {
        let of = |pick: fn(&strikeline_core::margins::Trip) -> Option<f64>| -> Vec<f64> {
            m.rows.iter().map(|r| pick(&r.trips[k]).unwrap_or(f64::NAN)).collect()
        };
        c.lines.push(Line { name: "earliest".into(), class: "near", values: of(|t| t.low.map(|i| i.0)) });
        c.lines.push(Line {
            name: "typical trip".into(),
            class: "soft",
            values: of(|t| t.typical.map(|i| i.0)),
        });
        c.lines.push(Line { name: "latest".into(), class: "near", values: of(|t| t.high.map(|i| i.0)) });
        c.summary += &format!(
            " Beside it the band in which {} opens.",
            sentences::limit(setup, m.rows[0].trips[k].limit)
        );
    }
    c
}

/// What is crossed, as a sentence.
pub fn crossing(setup: &Setup, crossing: &Crossing) -> String {
    let at = if crossing.soc >= 1.0 {
        "With a full cell already".to_string()
    } else {
        format!("Below {} charge", percent(crossing.soc))
    };
    let what = match crossing.edge {
        Edge::Strike => "the strike voltage is not reached".to_string(),
        Edge::Hold => "the arc does not hold to the end of a press".to_string(),
        Edge::TripEarliest(l) => {
            format!("the draw is inside the band of {}: some boards open", sentences::limit(setup, l))
        }
        Edge::TripTypical(l) => format!("a typical board opens: {}", sentences::limit(setup, l)),
        Edge::TripLatest(l) => format!("every board opens: {}", sentences::limit(setup, l)),
        Edge::OverDischarge(p) => {
            format!("{} is met under load", sentences::limit(setup, Limit::OverDischarge(p)))
        }
    };
    format!("{at}, {what}.")
}

fn start_up(s: &StartUp) -> String {
    let left = format!("At {} charge", percent(s.soc));
    if s.latches {
        format!(
            "▲ {left} the load stays stalled: its stall draw holds it at {}, below its start voltage, and {} go on flowing until the button is released. The source is too soft at switch-on; a lower resistance or a load that draws less before it runs mends it.",
            volts(s.stalled.0.0),
            amps(s.stalled.1.0)
        )
    } else if s.held_by_surge {
        format!(
            "◆ {left} the surge takes all that the path gives at the start voltage: the load is held there, or falls back, until the surge has decayed. A softer start mends it."
        )
    } else {
        format!("{left} it starts: nothing holds it stalled.")
    }
}

fn resistances(m: &Margins) -> String {
    let rows: String = [1.0, 0.5, 0.2]
        .iter()
        .filter_map(|soc| m.rows.iter().min_by(|a, b| (a.soc - soc).abs().total_cmp(&(b.soc - soc).abs())))
        .map(|r| {
            let mohm = |x: f64| if x > 0.0 { format!("{} mΩ", fixed(1e3 * x, 0)) } else { "none".into() };
            let has = r.lit.or(r.unlit).map_or("—".into(), |s| mohm(s.total.0));
            format!(
                "<tr><th scope=\"row\">{}</th><td>{has}</td><td>{}</td><td>{}</td></tr>",
                percent(r.soc),
                mohm(r.strikes_up_to.0),
                mohm(r.holds_up_to.0)
            )
        })
        .collect();
    format!(
        "<table class=\"plain\"><caption>Total resistance, cell's own at once included</caption><thead><tr><th scope=\"col\">charge</th><th scope=\"col\">has</th><th scope=\"col\">strikes up to</th><th scope=\"col\">holds up to</th></tr></thead><tbody>{rows}</tbody></table>"
    )
}

/// The margins of every temperature, `width` px wide, with their charts.
pub fn section(setup: &Setup, all: &[Margins], width: f64) -> (String, Vec<Chart>) {
    let inner = (width - 34.0).max(240.0);
    let pair = if width >= 880.0 { (width - 20.0) / 2.0 - 34.0 } else { inner };
    let (mut out, mut charts) = ("<h2 id=\"margins\">Margins</h2>".to_string(), Vec::new());
    for (m, ids) in all.iter().zip(IDS) {
        let lines: String =
            m.crossings.iter().map(|c| format!("<li>{}</li>", escaped(&crossing(setup, c)))).collect();
        let lines =
            if lines.is_empty() { "<li>No limit is crossed from full to empty.</li>".into() } else { lines };
        let starts: String =
            m.start_up.iter().map(|s| format!("<li>{}</li>", escaped(&start_up(s)))).collect();
        let two = [volts_chart(setup, m, ids[0]), amps_chart(setup, m, ids[1])];
        let figures: String = two
            .iter()
            .zip([("Voltage at the load", "a press from a rested cell, over the charge"), ("Draw against the trip band", "at the end of a press, the switch as warm as it is then")])
            .map(|(c, (title, note))| {
                format!(
                    "<figure><figcaption>{title}<span>{note}</span></figcaption>{}<p class=\"reading\" id=\"{}-reading\">Point at the chart, or focus it and use the arrow keys, to read values.</p></figure>",
                    c.svg(pair, 260.0),
                    c.id
                )
            })
            .collect();
        out += &format!(
            "<h3>At {}</h3><div class=\"two\">{figures}</div><ul>{lines}{starts}</ul>{}",
            degrees(m.temperature.0),
            resistances(m)
        );
        charts.extend(two);
    }
    (out, charts)
}

/// The sign, class and words of an outcome.
fn sign(outcome: Outcome) -> (&'static str, &'static str, &'static str) {
    match outcome {
        Outcome::Holds => ("●", "good", "holds"),
        Outcome::SagsOut => ("▽", "sags", "lights, then sags out"),
        Outcome::DoesNotStrike => ("○", "sags", "does not strike"),
        Outcome::Trips(Limit::Stage(..)) => ("✕", "trips", "a current limit opens"),
        Outcome::Trips(Limit::OverDischarge(_)) => ("⊥", "trips", "an over-discharge limit opens"),
        Outcome::Stalls => ("■", "trips", "does not start"),
        Outcome::Empty => ("–", "sags", "empty before the press ends"),
        Outcome::WorkLimit => ("?", "sags", "not followed to its end"),
    }
}

/// What a row of the map says, from full to empty.
fn row_words(socs: &[f64], row: &[Outcome]) -> String {
    let mut parts: Vec<String> = Vec::new();
    let mut k = 0;
    while k < row.len() {
        let word = sign(row[k]).2;
        let from = k;
        while k < row.len() && sign(row[k]).2 == word {
            k += 1;
        }
        parts.push(if from == 0 && k == row.len() {
            format!("{word} from full to {}", percent(socs[k - 1]))
        } else {
            format!("{word} from {} to {}", percent(socs[from]), percent(socs[k - 1]))
        });
    }
    parts.join(", then ")
}

/// The map of outcomes over charge and temperature.
pub fn map(setup: &Setup, map: &Map, answers: &Answers) -> String {
    let ambient = setup.usage.ambient.0;
    let own = map
        .temperatures
        .iter()
        .enumerate()
        .min_by(|a, b| (a.1.0 - ambient).abs().total_cmp(&(b.1.0 - ambient).abs()))
        .map_or(0, |(k, _)| k);
    let left = sentences::left_after_full(answers);
    let head: String = map
        .socs
        .iter()
        .enumerate()
        .map(|(k, s)| {
            format!(
                "<th scope=\"col\"{}>{}</th>",
                if k % 4 == 0 { "" } else { " class=\"thin\"" },
                fixed(100.0 * s, 0)
            )
        })
        .collect();
    let mut seen: Vec<Outcome> = Vec::new();
    let mut words = String::new();
    let mut rows = String::new();
    for (k, (t, row)) in map.temperatures.iter().zip(&map.outcomes).enumerate() {
        let cells: String = row
            .iter()
            .zip(&map.socs)
            .map(|(o, soc)| {
                if !seen.iter().any(|s| sign(*s).2 == sign(*o).2) {
                    seen.push(*o);
                }
                let here = k == own && *soc >= left;
                let (shape, class, _) = sign(*o);
                format!("<td class=\"{class}{}\">{shape}</td>", if here { " here" } else { "" })
            })
            .collect();
        rows += &format!("<tr><th scope=\"row\">{}</th>{cells}</tr>", degrees(t.0));
        words += &format!("<li>At {}: {}.</li>", degrees(t.0), row_words(&map.socs, row));
    }
    let legend: Vec<String> = seen.iter().map(|o| format!("{} {}", sign(*o).0, sign(*o).2)).collect();
    format!(
        "<figure><figcaption>One press over charge and temperature<span>every place a simulated press from a rested cell, parts as entered; framed: this design, at {} from full to the recharge mark</span></figcaption>\
         <table class=\"map\" aria-hidden=\"true\"><thead><tr><th scope=\"col\">charge, %</th>{head}</tr></thead><tbody>{rows}</tbody></table>\
         <p class=\"legend\">{}</p><ul class=\"unseen\">{words}</ul></figure>",
        degrees(map.temperatures.get(own).map_or(ambient, |t| t.0)),
        legend.join(" · ")
    )
}
