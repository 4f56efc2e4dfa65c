//! What is drawn below the results, a moment later: hazards, wiring, margins, map, the time–current diagram, charging.

use strikeline_design::check::Checked;
use strikeline_design::report::{Answers, Further};

use crate::results::Results;
use crate::{arrangements, charging, hazards, margins, time_current};

/// The sections for a design, `width` px wide.
pub fn further(checked: &Checked, answers: &Answers, further: &Further, width: f64) -> Results {
    let setup = &checked.nominal;
    let (said, mut charts) = margins::section(setup, &further.margins, width);
    let charging = charging::charging(checked, answers, further.charging.as_ref(), width);
    let markup = [
        hazards::section(setup, &answers.hazards),
        arrangements::section(setup, &further.arrangements),
        said,
        margins::map(setup, &further.map, answers),
        time_current::section(setup, &further.diagram, (width - 34.0).max(240.0)),
        charging.markup,
    ];
    charts.extend(charging.charts);
    Results { markup: markup.concat(), charts }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::{results, sentences};
    use strikeline_design::check::check;
    use strikeline_design::design::Design;
    use strikeline_design::report::{answer, further as compute};

    /// Texts that a form may hold, the ends of what is accepted among them.
    const TEXTS: &[(&str, &[&str])] = &[
        (
            "board.arrangement",
            &["through_board", "through_board", "load_at_cell", "switch_bridged", "no_board"],
        ),
        ("load.law", &["table", "current", "power", "resistance"]),
        ("cell.chemistry", &["lco_pouch", "nmc_pouch", "nmc_cylinder", "lfp_cylinder"]),
        ("cell.capacity", &["0.01 Ah", "0.3 Ah", "2.8 Ah", "500 Ah"]),
        ("cell.parallel", &["1", "2", "20"]),
        ("cell.continuous", &["", "1 A", "5 A"]),
        ("cell.pulse", &["", "3 A"]),
        ("cell.charge", &["", "0.5 A"]),
        ("board.stage1", &["150 ± 30 mV", "", "10 V", "1 mV"]),
        ("board.stage3", &["1 V", ""]),
        ("board.limit4", &["", "6 A"]),
        ("board.od", &["2.4 ± 0.1 V", "", "4 V"]),
        ("board.thermal", &["60 K/W", "0 K/W", "1000 K/W"]),
        ("second.fitted", &["no", "yes"]),
        ("leads.fuse", &["none", "quick", "lag", "ptc"]),
        ("leads.fuse_rating", &["4 A", "0.5 A"]),
        ("leads.insulation", &["pvc", "silicone", "unknown"]),
        ("leads.load_length", &["0.1 m", "0 m", "20 m"]),
        ("leads.load_section", &["0.75 mm²", "0.05 mm²"]),
        ("load.strike", &["3.3 V", "3.6 V", "5 V"]),
        ("load.surge", &["0 A", "5 A", "500 A"]),
        ("load.stall", &["", "0.5 Ω"]),
        ("load.known", &["measured", "measured", "estimated"]),
        ("load.output", &["", "12 kV"]),
        ("load.output_capacitance", &["", "5 nF"]),
        ("load.peak", &["1", "1.5"]),
        ("use.press", &["4 s", "0.05 s", "60 s"]),
        ("use.ambient", &["20 °C", "-20 °C", "60 °C"]),
        ("use.cold", &["0 °C", "", "-40 °C"]),
        ("use.held", &["0 h", "8 h"]),
        ("use.presses", &["40"]),
        ("charger.fitted", &["yes", "no"]),
        ("charger.current", &["1 A", "5 A"]),
        ("charger.load", &["0 mA", "300 mA"]),
    ];

    #[test]
    fn law_every_sound_design_is_told_whole() {
        let mut state = 88_172_645_463_325_252_u64;
        let mut one = |n: usize| {
            state ^= state << 13;
            state ^= state >> 7;
            state ^= state << 17;
            (state >> 33) as usize % n
        };
        let mut sound = 0;
        for _ in 0..140 {
            let mut design = Design::demo();
            for (key, texts) in TEXTS {
                // Half of the fields stand as in the example.
                if *key == "use.presses" || one(2) == 0 {
                    assert!(design.set(key, texts[one(texts.len())]), "{key}");
                }
            }
            let Ok(checked) = check(&design) else { continue };
            sound += 1;
            let answers = answer(&checked);
            let below = compute(&checked, &answers);
            let said = sentences::verdict(&checked.nominal, &answers);
            for width in [320.0, 1100.0] {
                let all = results::results(&checked, &answers, width).markup
                    + &further(&checked, &answers, &below, width).markup
                    + &said.sentence
                    + &said.decided;
                for wrong in ["NaN", ">inf", " inf", "\"inf", "-inf", "∞", ".. ", "  "] {
                    let before = all.split(wrong).next().unwrap_or_default().chars().rev().take(80);
                    let near: String = before.collect::<Vec<char>>().into_iter().rev().collect();
                    assert!(!all.contains(wrong), "“{wrong}” after “{near}” in {design:?}");
                }
            }
        }
        println!("{sound} sound designs told whole");
        assert!(sound > 100, "{sound}");
    }
}
