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
