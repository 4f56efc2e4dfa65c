//! What the page says of the numbers, sentence by sentence.

use strikeline_core::hazard::Level;
use strikeline_core::report::{ChargeEnd, Event, EventKind, Limit, NotFull, Protector};
use strikeline_core::setup::Setup;
use strikeline_core::verdict::{Parts, Reason, Word};
use strikeline_design::report::Answers;

use crate::hazards;
use crate::number::{amps, percent, time, volts};

/// A verdict in words.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Said {
    /// The word.
    pub word: &'static str,
    /// `holds`, `near` or `fails`, for the style.
    pub tone: &'static str,
    /// The sentence.
    pub sentence: String,
    /// What decides it.
    pub decided: String,
}

/// A limit in words.
pub fn limit(setup: &Setup, limit: Limit) -> String {
    let (Limit::Stage(protector, _) | Limit::OverDischarge(protector)) = limit;
    let (whose, board) = match protector {
        Protector::Board => ("the board's", setup.board.as_ref()),
        Protector::Second => ("the cell's own protector's", setup.second_protector.as_ref()),
    };
    let what = match limit {
        Limit::OverDischarge(_) => "over-discharge limit",
        Limit::Stage(_, k) => match board.and_then(|b| b.stages.get(k)).map(|s| s.name.as_str()) {
            Some("short") => "short-circuit limit",
            Some("over_current_2") => "second over-current level",
            Some("over_current_amps") => "limit in amps",
            _ => "over-current limit",
        },
    };
    format!("{whose} {what}")
}

/// Why a press is not full, as the end of "… because".
pub fn not_full(setup: &Setup, why: NotFull) -> String {
    match why {
        NotFull::Opened(l) => format!("{} opens", limit(setup, l)),
        NotFull::CellEmpty => "the cell is empty".into(),
        NotFull::EventLimit => "it flickers more often than is followed here".into(),
        NotFull::SagBelowHold => "the voltage sags below the hold voltage and the arc drops".into(),
        NotFull::NoOperatingPoint => {
            "the path cannot give the lit draw at any voltage and the arc drops".into()
        }
        NotFull::NotStarted => "the load never starts".into(),
        NotFull::StrikeVoltageNotReached => "the strike voltage is not reached".into(),
        NotFull::StrikeTimeNotCompleted => "the strike voltage does not stand long enough".into(),
    }
}

/// What ends a charge, as a clause.
pub fn ended(setup: &Setup, end: ChargeEnd) -> String {
    match end {
        ChargeEnd::NoLitTime(why) => not_full(setup, why),
        ChargeEnd::Opened(l) => format!("{} opens during a press", limit(setup, l)),
        ChargeEnd::OpenedInRest(l) => format!("{} opens in a rest", limit(setup, l)),
        ChargeEnd::CellEmpty => "the cell is empty".into(),
        ChargeEnd::EmptyInRest => "the cell runs empty in a rest".into(),
        ChargeEnd::PressLimit => "the set number of presses is reached".into(),
        ChargeEnd::WorkLimit => "it flickers more often than is followed here".into(),
    }
}

/// The verdict.
pub fn verdict(nominal: &Setup, answers: &Answers) -> Said {
    let (word, tone) = match answers.verdict.word {
        Word::Holds => ("Holds", "holds"),
        Word::Borderline => ("Borderline", "near"),
        Word::Fails => ("Fails", "fails"),
    };
    let charge = &answers.charge;
    let until = format!(
        "{} presses strike and hold, down to {} charge",
        charge.full_presses,
        percent(left_after_full(answers))
    );
    let sentence = match (answers.verdict.works.word, answers.verdict.works.reason) {
        (Word::Holds, _) => format!("{until}; weak parts do too."),
        (Word::Borderline, Reason::NoFullPress(why)) => {
            format!(
                "{until} with parts as entered; with weak ones not a single press: {}.",
                not_full(nominal, why)
            )
        }
        (Word::Borderline, _) => {
            format!(
                "{until} with parts as entered; weak ones stop after {}.",
                presses(answers.weak.full_presses)
            )
        }
        (Word::Fails, Reason::NoFullPress(why)) => format!("Not one full press: {}.", not_full(nominal, why)),
        (Word::Fails, _) => {
            format!(
                "It stops after {} with {} of the charge unused.",
                presses(charge.full_presses),
                percent(charge.soc_left)
            )
        }
    };
    let parts = match answers.verdict.works.parts {
        Parts::Nominal => "parts as entered",
        Parts::Weak => "every tolerance at its unfavourable end at once",
    };
    let reason = match answers.verdict.works.reason {
        Reason::RunsDown(end) => format!("the charge runs down until {}", ended(nominal, end)),
        Reason::NoFullPress(why) => not_full(nominal, why),
        Reason::StopsEarly(end) => ended(nominal, end),
    };
    if let Some(grave) = answers.hazards.findings.iter().find(|f| f.level == Level::Stop) {
        let title = lower(&hazards::finding(nominal, &grave.kind).title);
        let more = match answers.verdict.stops - 1 {
            0 => String::new(),
            1 => ", and one more hazard at stop level".into(),
            n => format!(", and {n} more hazards at stop level"),
        };
        return Said {
            word,
            tone,
            sentence: format!("Do not build it so: {title}."),
            decided: format!("Decided by that{more}. What the current alone would do: {}", lower(&sentence)),
        };
    }
    Said { word, tone, sentence, decided: format!("Decided by: {reason} ({parts}).") }
}

fn presses(n: u32) -> String {
    if n == 1 { "1 full press".into() } else { format!("{n} full presses") }
}

/// Charge left after the last full press, 0 to 1.
pub fn left_after_full(answers: &Answers) -> f64 {
    answers
        .charge
        .presses
        .iter()
        .rev()
        .find(|p| p.summary.not_full.is_none())
        .map_or(1.0, |p| p.summary.soc_end)
}

/// The verdict in a line, for a narrow page.
pub fn brief(said: &Said, answers: &Answers) -> String {
    let mark =
        answers.charge.recharge_mark.map_or(String::new(), |v| format!(" · recharge at {}", volts(v.0)));
    format!("{} · {}{mark}", said.word, presses(answers.charge.full_presses))
}

/// What is said above a result that does not belong to what is entered; empty where it does.
///
/// - `before`: whether there is an earlier result to show.
pub fn stale(faults: usize, before: bool) -> String {
    let who = match faults {
        0 => return String::new(),
        1 => "One field needs you.".to_string(),
        n => format!("{n} fields need you."),
    };
    if before { format!("{who} What stands below is the last good result, not this design's.") } else { who }
}

/// An event as a sentence.
pub fn event(setup: &Setup, e: &Event) -> String {
    let what = match e.kind {
        EventKind::Closed => format!("Switch closed; {} rush into the input capacitor.", amps(e.current.0)),
        EventKind::Over(l) => format!("Past {}: its delay runs.", limit(setup, l)),
        EventKind::Under(l) => format!("Back under {}.", limit(setup, l)),
        EventKind::StartReached => format!("Start voltage reached, {}.", volts(e.load.0)),
        EventKind::Runs => "The load runs.".into(),
        EventKind::PinnedAtStart => {
            "Held at the start voltage: the surge takes all that the path gives.".into()
        }
        EventKind::Stalls => "The load stalls.".into(),
        EventKind::StrikeReached => format!("Strike voltage reached, {}.", volts(e.load.0)),
        EventKind::StrikeLost => "Strike voltage lost again.".into(),
        EventKind::Lit => "The arc lights.".into(),
        EventKind::Drop => format!("The arc drops at {}.", volts(e.load.0)),
        EventKind::Opened(l) => format!("{} opens at {}.", capital(&limit(setup, l)), amps(e.current.0)),
        EventKind::CellEmpty => "The cell is empty.".into(),
        EventKind::Released => {
            format!("Button released; {} at the load, {}.", volts(e.load.0), amps(e.current.0))
        }
        EventKind::EventLimit => "Too many events; not followed further.".into(),
    };
    format!("{}: {what}", time(e.time.0))
}

/// With a small first letter.
fn lower(text: &str) -> String {
    let mut letters = text.chars();
    letters.next().map_or_else(String::new, |first| first.to_lowercase().chain(letters).collect())
}

/// With a capital first letter.
pub fn capital(text: &str) -> String {
    let mut chars = text.chars();
    chars.next().map_or_else(String::new, |c| c.to_uppercase().collect::<String>() + chars.as_str())
}

#[cfg(test)]
mod tests {
    use super::*;
    use strikeline_design::check::check;
    use strikeline_design::design::Design;
    use strikeline_design::report::answer;

    #[test]
    fn exact_the_demo_is_borderline_and_says_why() {
        let checked = check(&Design::demo()).expect("the demo is sound");
        let said = verdict(&checked.nominal, &answer(&checked));
        assert_eq!(said.word, "Borderline");
        assert!(
            said.sentence.contains("weak ones not a single press: the board's over-current limit opens."),
            "{}",
            said.sentence
        );
        assert!(
            said.decided.starts_with("Decided by: the board's over-current limit opens"),
            "{}",
            said.decided
        );
    }

    #[test]
    fn exact_a_bypass_is_told_off() {
        let mut design = Design::demo();
        for way in ["load_at_cell", "switch_bridged", "no_board"] {
            design.set("board.arrangement", way);
            let checked = check(&design).expect("sound");
            let said = verdict(&checked.nominal, &answer(&checked));
            assert_eq!(said.word, "Fails", "{way}");
            assert!(said.sentence.starts_with("Do not build it so: "), "{}", said.sentence);
        }
    }
}
