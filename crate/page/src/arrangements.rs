//! What each way of wiring the load keeps and loses, as a table.
//!
//! It tells what is lost. It never says that something may be done without.

use strikeline_core::arrangements::{Arranged, By, Layer, ShortCircuit};
use strikeline_core::ratings::Band;
use strikeline_core::setup::{Arrangement, Setup};

use crate::hazards;
use crate::number::{amps, escaped, fixed, time, volts};
use crate::sentences;

/// The name of an arrangement.
fn name(arrangement: Arrangement) -> &'static str {
    match arrangement {
        Arrangement::ThroughBoard => "Through the board",
        Arrangement::LoadAtCell => "Load taken at the cell",
        Arrangement::SwitchBridged => "Board's switch bridged",
        Arrangement::NoBoard => "No board",
    }
}

fn band(b: &Band, unit: fn(f64) -> String) -> String {
    if b.low == b.high { unit(b.typical) } else { format!("{} to {}", unit(b.low), unit(b.high)) }
}

/// One thing that opens, with its figures.
fn layer(setup: &Setup, l: &Layer) -> String {
    let mut figures = Vec::new();
    match (l.by, &l.full, &l.threshold) {
        (By::Stage(..) | By::ChargeOverCurrent(_), Some(full), _) => {
            figures.push(match &l.empty {
                Some(empty) if empty.low < full.low => {
                    format!("{} to {}", amps(empty.low), amps(full.high))
                }
                _ => band(full, amps),
            });
        }
        (By::OverDischarge(_) | By::OverCharge(_), _, Some(at)) => figures.push(band(at, volts)),
        _ => {}
    }
    if let Some(delay) = &l.delay
        && delay.high > 0.0
    {
        figures.push(format!("within {}", time(delay.high)));
    }
    let name = sentences::capital(&hazards::by(setup, l.by));
    if figures.is_empty() { name } else { format!("{name}, {}", figures.join(", ")) }
}

fn cell(setup: &Setup, head: &str, layers: &[Layer]) -> String {
    if layers.is_empty() {
        return format!("<td data-head=\"{head}\" class=\"none\"><b>✕ nothing</b></td>");
    }
    let lines: Vec<String> = layers.iter().map(|l| escaped(&layer(setup, l))).collect();
    format!("<td data-head=\"{head}\">{}</td>", lines.join("<br>"))
}

fn short(s: &ShortCircuit) -> String {
    let leads: Vec<String> = s
        .leads
        .iter()
        .map(|l| {
            format!(
                "leads {} by {} K/s, at their limit after {}",
                if l.cell_side { "from cell to board" } else { "from board to load" },
                fixed(l.k_per_s, 0),
                time(l.limit.0)
            )
        })
        .collect();
    let leads = if leads.is_empty() { String::new() } else { format!("; the {}", leads.join("; the ")) };
    format!("{}: the cell warms by {} K/s{leads}", amps(s.current.0), fixed(s.cell_k_per_s, 1))
}

/// The section.
pub fn section(setup: &Setup, all: &[Arranged; 4]) -> String {
    const HEADS: [&str; 5] =
        ["Over-current", "Short circuit", "Over-discharge by the load", "Over-charge", "Charge over-current"];
    let head: String = HEADS.iter().map(|h| format!("<th scope=\"col\">{h}</th>")).collect();
    let rows: String = all
        .iter()
        .map(|a| {
            let own = a.arrangement == setup.arrangement;
            let lists = [
                &a.over_current,
                &a.short_circuit,
                &a.over_discharge,
                &a.over_charge,
                &a.charge_over_current,
            ];
            // Without a board entered nothing can be said of how one would be wired.
            let cells: String = if setup.board.is_none() && a.arrangement != Arrangement::NoBoard {
                "<td colspan=\"5\">no board is entered: start from a class of board to see what it would keep</td>".into()
            } else {
                HEADS.iter().zip(lists).map(|(h, l)| cell(setup, h, l)).collect()
            };
            format!(
                "<tr{}><th scope=\"row\">{}{}</th>{cells}</tr>",
                if own { " class=\"own\"" } else { "" },
                name(a.arrangement),
                if own { "<span>this design</span>" } else { "" }
            )
        })
        .collect();
    // Ways of wiring that lose the same are told together.
    let mut lost: Vec<(Vec<&str>, String)> = Vec::new();
    let told = |a: &&Arranged| match a.arrangement {
        Arrangement::ThroughBoard => false,
        Arrangement::NoBoard => true,
        Arrangement::LoadAtCell | Arrangement::SwitchBridged => setup.board.is_some(),
    };
    for a in all.iter().filter(told) {
        let standby = a.standby.map_or_else(
            || "no standby drain is entered".to_string(),
            |t| format!("the standby drain empties the cell in {}", hazards::long(t.0)),
        );
        let text = format!(
            "A short at the load, full cell, {}; nearly empty, {}. Button held after the last press: {}. Put away at the recharge mark: {standby}.",
            short(&a.short_full),
            amps(a.short_empty.current.0),
            hazards::held(&a.held)
        );
        match lost.iter_mut().find(|(_, said)| *said == text) {
            Some((names, _)) => names.push(name(a.arrangement)),
            None => lost.push((vec![name(a.arrangement)], text)),
        }
    }
    let lost: String =
        lost.iter().map(|(names, text)| format!("<li><b>{}.</b> {text}</li>", names.join(" · "))).collect();
    format!(
        "<h2 id=\"wiring\">What each wiring keeps</h2>\
         <p>What still opens, with the figures of this design. A way of wiring in which nothing opens leaves only luck between a short and a fire.</p>\
         <table class=\"wiring\"><thead><tr><th scope=\"col\">Load</th>{head}</tr></thead><tbody>{rows}</tbody></table>\
         <h3>What is lost without the board in the load's path</h3><ul class=\"lost\">{lost}</ul>\
         <p>None of these is advice. What mends a board that cuts the load off and keeps its protection: a second switch pair, a \
         higher threshold, a lower draw, a smaller surge, less resistance.</p>"
    )
}
