//! What is drawn below the results, a moment later: the margins and the time–current diagram.

use strikeline_core::margins::{Crossing, Edge, Margins};
use strikeline_core::setup::Setup;
use strikeline_design::check::Checked;
use strikeline_design::report::{Answers, Further};

use crate::charging;
use crate::number::{degrees, escaped, percent};
use crate::results::Results;
use crate::sentences;

/// The sections for a design, `width` px wide.
pub fn further(checked: &Checked, answers: &Answers, further: &Further, width: f64) -> Results {
    let setup = &checked.nominal;
    let said: String = further.margins.iter().map(|m| margins(setup, m)).collect();
    let charging = charging::charging(checked, answers, further.charging.as_ref(), width);
    let markup = format!("<h2 id=\"margins\">Margins</h2>{said}{}", charging.markup);
    Results { markup, charts: charging.charts }
}

fn margins(setup: &Setup, margins: &Margins) -> String {
    let lines: String =
        margins.crossings.iter().map(|c| format!("<li>{}</li>", escaped(&crossing(setup, c)))).collect();
    let lines =
        if lines.is_empty() { "<li>Nothing is crossed from full to empty.</li>".into() } else { lines };
    format!("<h3>At {}</h3><ul>{lines}</ul>", degrees(margins.temperature.0))
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
            format!(
                "{} is met under load",
                sentences::limit(setup, strikeline_core::report::Limit::OverDischarge(p))
            )
        }
    };
    format!("{at}, {what}.")
}
