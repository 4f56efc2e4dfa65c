//! Hazards in words: what was found, what to do about it, and where the rule comes from.
//!
//! No sentence here may read as leave to do without protection: what is said to do always keeps the board.

use strikeline_core::arrangements::{By, Held};
use strikeline_core::hazard::{
    self, Case, ContactPart, Finding, Hazards, Kind, Layers, Level, NotJudged, StoredTier,
};
use strikeline_core::report::{Limit, Protector};
use strikeline_core::setup::{Arrangement, Setup};
use strikeline_core::units::{Amps, Seconds};

use crate::number::{amps, degrees, escaped, fixed, percent, time, volts};
use crate::sentences;

/// A finding in words.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Said {
    /// In a few words.
    pub title: String,
    /// What was found, with its numbers.
    pub found: String,
    /// What to do.
    pub todo: String,
}

fn said(title: impl Into<String>, found: String, todo: impl Into<String>) -> Said {
    Said { title: title.into(), found, todo: todo.into() }
}

/// A level in a word, with its shape.
pub fn level(level: Level) -> (&'static str, &'static str) {
    match level {
        Level::Stop => ("▲ Stop", "stop"),
        Level::Look => ("◆ Look", "look"),
        Level::Note => ("● Note", "know"),
    }
}

/// How the load is wired, as it follows "the load is".
pub fn wired(arrangement: Arrangement) -> &'static str {
    match arrangement {
        Arrangement::ThroughBoard => "wired through the board",
        Arrangement::LoadAtCell => "taken at the cell",
        Arrangement::SwitchBridged => "wired past the board's bridged switch",
        Arrangement::NoBoard => "wired without a board",
    }
}

fn whose(protector: Protector) -> &'static str {
    match protector {
        Protector::Board => "the board's",
        Protector::Second => "the cell's own protector's",
    }
}

/// What opens, in words.
pub fn by(setup: &Setup, by: By) -> String {
    match by {
        By::Stage(p, k) => sentences::limit(setup, Limit::Stage(p, k)),
        By::OverDischarge(p) => sentences::limit(setup, Limit::OverDischarge(p)),
        By::OverCharge(p) => format!("{} over-charge limit", whose(p)),
        By::ChargeOverCurrent(p) => format!("{} charge over-current limit", whose(p)),
        By::Fuse => "the fuse".into(),
    }
}

fn at(case: Case) -> &'static str {
    match case {
        Case::Ambient => "at the temperature of use",
        Case::Cold => "in the cold",
    }
}

fn contact(part: ContactPart) -> &'static str {
    match part {
        ContactPart::Button => "push button",
        ContactPart::Connector => "connector",
    }
}

fn or_never(t: Option<Seconds>) -> String {
    t.map_or_else(|| "not surely".into(), |t| format!("after {}", time(t.0)))
}

/// Minutes and hours until a held button has emptied the cell.
pub fn held(h: &Held) -> String {
    if let Some((_, t)) = h.opened {
        return format!("over-discharge detection opens after {}", long(t.0));
    }
    let steps: Vec<String> = [("3.0 V", h.to_3_0), ("2.5 V", h.to_2_5), ("2.0 V", h.to_2_0)]
        .iter()
        .filter_map(|(v, t)| t.map(|t| format!("{v} after {}", long(t.0))))
        .collect();
    if steps.is_empty() { "it goes on, and nothing ends it".into() } else { steps.join(", ") }
}

/// A long time in minutes, hours or days.
pub fn long(s: f64) -> String {
    if s < 60.0 {
        format!("{} s", fixed(s, 0))
    } else if s < 5400.0 {
        format!("{} min", fixed(s / 60.0, if s < 600.0 { 1 } else { 0 }))
    } else if s < 172_800.0 {
        format!("{} h", fixed(s / 3600.0, 0))
    } else {
        format!("{} days", fixed(s / 86_400.0, 0))
    }
}

fn layers_lost(left: &Layers, with: &Layers) -> String {
    let pairs = [
        ("over-current", left.over_current, with.over_current),
        ("short circuit", left.short_circuit, with.short_circuit),
        ("over-discharge by the load", left.over_discharge, with.over_discharge),
        ("over-charge", left.over_charge, with.over_charge),
        ("charge over-current", left.charge_over_current, with.charge_over_current),
    ];
    let bare: Vec<&str> = pairs.iter().filter(|(_, left, _)| *left == 0).map(|(name, ..)| *name).collect();
    let thinner: Vec<String> = pairs
        .iter()
        .filter(|(_, left, with)| *left > 0 && left < with)
        .map(|(name, left, with)| format!("{left} of {with} against {name}"))
        .collect();
    let mut said = Vec::new();
    if !bare.is_empty() {
        said.push(format!("nothing is left against {}", bare.join(", ")));
    }
    if !thinner.is_empty() {
        said.push(format!("of the layers there were, {} are left", thinner.join(", ")));
    }
    if said.is_empty() { "the board no longer opens for the load".into() } else { said.join("; ") }
}

/// A finding in words.
pub fn finding(setup: &Setup, kind: &Kind) -> Said {
    const KEEP: &str = "Wire the load through a board that can carry it; the remedies are a second switch pair, a higher \
                        threshold, a lower draw or less resistance.";
    match kind {
        Kind::ShortUnprotected { arrangement, full, weakest, lead_limit, fuse_clears, quick_fuse } => {
            let lead = lead_limit
                .map_or_else(String::new, |t| format!(" A lead is at its limit after {}.", time(t.0)));
            let fuse = match (fuse_clears, quick_fuse) {
                (Some(t), _) => {
                    format!(" The fuse clears the weakest short after {} at the latest.", time(t.0))
                }
                (None, Some((low, high))) => format!(
                    " Beside the board, a quick fuse of {} to {} would carry the draw and still clear a short.",
                    amps(low.0),
                    amps(high.0)
                ),
                (None, None) => " No fuse both carries the draw and clears the weakest short in time.".into(),
            };
            said(
                "A short circuit is not switched off",
                format!(
                    "The load is {}: no electronic protection opens on a short at the load. {} flow from a full cell, {} from an empty one; the cell warms by {} K/s.{lead}{fuse}",
                    wired(*arrangement),
                    amps(full.current.0),
                    amps(weakest.0),
                    fixed(full.cell_k_per_s, 1)
                ),
                KEEP,
            )
        }
        Kind::NeverTripsOnShort { case, soc, prospective, trip, instead, fuse_clears } => {
            let trip = trip.map_or_else(
                || "it has no stage".into(),
                |i| format!("the least that trips a late one is {}", amps(i.0)),
            );
            let instead = match (instead, fuse_clears) {
                (Some(b), _) => {
                    format!(" {} opens instead, by the sagging voltage.", sentences::capital(&by(setup, *b)))
                }
                (None, Some(t)) => format!(" The fuse clears after {} at the latest.", time(t.0)),
                (None, None) => " Nothing else opens either.".into(),
            };
            said(
                "The protector may never see a short",
                format!(
                    "At {} charge, {}, a short at the load draws only {}; {trip}.{instead}",
                    percent(*soc),
                    at(*case),
                    amps(prospective.0)
                ),
                "Shorten or thicken the leads, take a stronger cell, or a board with a lower threshold that still carries the draw.",
            )
        }
        Kind::OverDischargeUnprotected { arrangement, held: h, standby } => {
            let shelf = standby.map_or_else(String::new, |t| {
                format!(" On the shelf the standby drain empties it in {}.", long(t.0))
            });
            said(
                "Nothing ends the discharge",
                format!(
                    "The load is {}: with the button held after the last press the cell goes to {}.{shelf} A cell below 2.0 V is damaged and may short inside when it is charged again.",
                    wired(*arrangement),
                    held(h)
                ),
                "Keep over-discharge detection in the load's path. A cell found below 2.0 V is not charged again.",
            )
        }
        Kind::ArrangementLoses { arrangement, left, through_board } => said(
            "The board is not in the load's path",
            format!("The load is {}: {}.", wired(*arrangement), layers_lost(left, through_board)),
            KEEP,
        ),
        Kind::NoOverChargeLayer { float, input, .. } => said(
            "The charger alone stands against over-charge",
            format!(
                "If it fails, the cell gets its supply of {}; nothing ends the charge. Its own float voltage may reach {}.",
                volts(input.0),
                volts(float.0)
            ),
            "Charge through a board with over-charge detection, or a cell with a protector of its own.",
        ),
        Kind::FloatAboveCell { float, limit } => said(
            "Float voltage above the cell's limit",
            format!(
                "The charger holds {} to {}, {} typically; the cell allows {}.",
                volts(float.low),
                volts(float.high),
                volts(float.typical),
                volts(limit.0)
            ),
            "Measure the float voltage, or take a charger with 1 % or better.",
        ),
        Kind::OverChargeTooHigh { threshold, limit } => said(
            "Over-charge detection comes too late",
            format!(
                "The lowest of the latest detects at {}; the cell allows {}.",
                volts(threshold.0),
                volts(limit.0)
            ),
            "Take a protector made for this kind of cell.",
        ),
        Kind::ChargeAboveLimit { current, limit } => said(
            "Charged faster than the cell allows",
            format!(
                "Each cell gets {}, up to {}; allowed is {}.",
                amps(current.typical),
                amps(current.high),
                amps(limit.0)
            ),
            "Lower the charge current: on most charger boards one resistor sets it.",
        ),
        Kind::ChargeAboveIt { rate } => said(
            "Charged above 1 It",
            format!(
                "The charge current is {} times the current that empties the cell in an hour.",
                fixed(*rate, 1)
            ),
            "Lower the charge current: on most charger boards one resistor sets it. 0.5 It is kind to most cells.",
        ),
        Kind::ChargeTemperature { ambient, window } => said(
            "Charged outside the cell's temperatures",
            format!(
                "It is charged at {} to {}; the cell allows {} to {}. Below, lithium plates and the cell is ruined without a sign.",
                degrees(ambient.0.0),
                degrees(ambient.1.0),
                degrees(window.0.0),
                degrees(window.1.0)
            ),
            "Charge indoors, or with a charger that senses the cell's temperature.",
        ),
        Kind::StoredEnergy { tier, voltage, capacitance, charge, energy } => {
            let limit = match tier {
                StoredTier::Capacitance => "0.1 µF, from 42.4 to 450 V",
                StoredTier::Charge => "45 µC, from 450 V to 15 kV",
                StoredTier::Energy => "350 mJ, above 15 kV",
            };
            said(
                "Stored charge above the limit for touch",
                format!(
                    "{} nF at {} kV hold {} µC and {} mJ after release; parts that can be touched may hold {limit}.",
                    fixed(capacitance.0 * 1e9, 1),
                    fixed(voltage.0 * 1e-3, 1),
                    fixed(charge.0 * 1e6, 0),
                    fixed(energy.0 * 1e3, 0)
                ),
                "Bleed it within a second, and keep every live part out of reach.",
            )
        }
        Kind::CellOverRating { draw, effective, continuous, pulse, lasts } => {
            let rated = |name: &str, i: &Option<Amps>| {
                i.map_or_else(String::new, |i| format!(" {name} {}.", amps(i.0)))
            };
            said(
                "More current than the cell is rated for",
                format!(
                    "One cell gives {} for {}, {} effective over press and rest.{}{}",
                    amps(draw.0),
                    long(lasts.0),
                    amps(effective.0),
                    rated("Rated for good:", continuous),
                    rated("Rated as a pulse:", pulse)
                ),
                "Take a cell rated for it, a second one in parallel, a smaller draw or shorter presses.",
            )
        }
        Kind::CellHot { charge, held, limit } => said(
            "The cell gets too hot",
            format!(
                "{} in use{}; its window ends at {}.",
                degrees(charge.0),
                held.map_or_else(String::new, |t| format!(", {} with the button held", degrees(t.0))),
                degrees(limit.0)
            ),
            "Longer rests, a cell of less resistance, or a second one in parallel.",
        ),
        Kind::DischargeTemperature { ambient, window } => said(
            "Used outside the cell's temperatures",
            format!(
                "It is used at {} to {}; the cell allows {} to {}.",
                degrees(ambient.0.0),
                degrees(ambient.1.0),
                degrees(window.0.0),
                degrees(window.1.0)
            ),
            "Keep it in an inside pocket, or take a cell made for it.",
        ),
        Kind::CellBelowWindow { lowest, limit } => said(
            "The cell is drawn below its lowest voltage",
            format!("{} at the end of a press; its sheet allows {}.", volts(lowest.0), volts(limit.0)),
            "A higher over-discharge threshold, a higher hold voltage, or recharging earlier.",
        ),
        Kind::SwitchHot { protector, charge, held, runs_away } => said(
            "The switch pair gets too hot",
            format!(
                "{} pair reaches {} in use{}.",
                sentences::capital(whose(*protector)),
                degrees(charge.0),
                if *runs_away {
                    "; with the button held it never settles".into()
                } else {
                    held.map_or_else(String::new, |t| format!(", {} with the button held", degrees(t.0)))
                }
            ),
            "A second pair in parallel, more copper around it, a lower draw or longer rests.",
        ),
        Kind::LeadHot { cell_side, settled, limit, density } => said(
            "A lead gets too hot",
            format!(
                "The leads {} carry {} A/mm² and {}; their insulation stands {} for good.",
                if *cell_side { "from cell to board" } else { "from board to load" },
                fixed(*density, 1),
                settled.map_or_else(|| "never settle".into(), |t| format!("settle at {}", degrees(t.0))),
                degrees(limit.0)
            ),
            "Take a thicker lead.",
        ),
        Kind::Touch { surface } => said(
            "Too hot to hold",
            format!(
                "The cell's surface reaches {}; the case in the hand is taken to be as warm.",
                degrees(surface.0)
            ),
            "Longer rests, more surface, or insulation between cell and hand.",
        ),
        Kind::ContactCurrent { part, draw, rating } => said(
            format!("The {} is over its rating", contact(*part)),
            format!(
                "{} flow; it is rated for {} d.c. Contacts weld, and a welded button stays on.",
                amps(draw.0),
                amps(rating.0)
            ),
            "Take one rated for the draw at d.c., or switch the current with a transistor.",
        ),
        Kind::ContactSurge { part, peak, rating } => said(
            format!("Surge through the {}", contact(*part)),
            format!("{} for a moment; it is rated for {} d.c.", amps(peak.0), amps(rating.0)),
            "A smaller input capacitor, a pre-charge resistor, or a contact made for it.",
        ),
        Kind::ContactVoltage { part, voltage, rating } => said(
            format!("The {} is not made for this voltage", contact(*part)),
            format!("{} from a full cell; it is rated for {} d.c.", volts(voltage.0), volts(rating.0)),
            "Take one that is.",
        ),
        Kind::FuseBreaking { prospective, breaking } => said(
            "The fuse cannot break the short",
            format!(
                "{} can flow; it breaks {} at most, and may burn on.",
                amps(prospective.0),
                amps(breaking.0)
            ),
            "Take a fuse with a higher breaking capacity.",
        ),
        Kind::FuseTooSlow { prospective, latest, lead_limit } => said(
            "The fuse is too slow to help",
            format!(
                "At the weakest short of {} it opens {}; a lead is at its limit {}.",
                amps(prospective.0),
                or_never(*latest),
                or_never(*lead_limit)
            ),
            "A quicker fuse of a smaller rating, or thicker leads; the board stays.",
        ),
        Kind::FuseOpensOnLoad { draw, rating, earliest } => said(
            "The fuse may open on the load",
            format!(
                "{} flow in a press; it is rated for {} here{}.",
                amps(draw.0),
                amps(rating.0),
                earliest.map_or_else(String::new, |t| format!(" and may open after {}", time(t.0)))
            ),
            "A rating above the draw, if it still clears a short.",
        ),
        Kind::FuseBackupOnly { protector, fuse } => said(
            "The fuse comes after the protector",
            format!(
                "On a short the protector opens within {}, the fuse not before {}: it guards against a protector that fails closed.",
                time(protector.0),
                time(fuse.0)
            ),
            "Nothing, but do not count it as a first line.",
        ),
        Kind::FuseHeat { power } => said(
            "The fuse gets hot",
            format!("{} W in it at the steady draw.", fixed(power.0, 1)),
            "A higher rating has less resistance; check that it still clears a short.",
        ),
        Kind::NuisanceTrip { limit, case, soc, draw, trip, certain } => said(
            if *certain { "The board cuts the load off" } else { "Some boards cut the load off" },
            format!(
                "From {} charge down, {}, the draw of {} is {} of {}, {} to {}.",
                percent(*soc),
                at(*case),
                amps(draw.0),
                if *certain { "above the whole band" } else { "inside the band" },
                sentences::limit(setup, *limit),
                amps(trip.low),
                amps(trip.high)
            ),
            "A second switch pair, a board with a higher threshold, a lower draw, or a smaller surge. Wiring around the board takes away what stands between a short and a fire.",
        ),
        Kind::LetsThrough { lasting, continuous } => said(
            "The board lets more through than the cell is rated for",
            format!(
                "A late board carries {} for good; the cells are rated for {}.",
                amps(lasting.0),
                amps(continuous.0)
            ),
            "A lower threshold or fewer pairs, as long as the draw is carried; or a stronger cell.",
        ),
        Kind::StandbyDrain { days, storage_days } => said(
            "Empty on the shelf",
            format!(
                "From the recharge mark the standby drain empties the cell in {} days; it is stored for {}.",
                fixed(*days, 0),
                fixed(*storage_days, 0)
            ),
            "Store it half charged, or part the cell from the board.",
        ),
        Kind::TerminationNeverReached { load, termination } => said(
            "The charge never ends",
            format!(
                "The load takes {} while it is charged; the charger ends at {}. The cell is kept at its float voltage for good.",
                amps(load.0),
                amps(termination.0)
            ),
            "Switch the load off while charging, or feed it from the supply and not from the cell.",
        ),
        Kind::TrickleNeverRecovers { load, trickle } => said(
            "An empty cell never recovers on the charger",
            format!(
                "The load takes {} and the trickle gives {}: the cell goes on falling.",
                amps(load.0),
                amps(trickle.0)
            ),
            "Switch the load off while charging.",
        ),
        Kind::PressWhileCharging { cell } => said(
            "A press while charging",
            if cell.0 < 0.0 {
                format!("It draws {} from the cell all the same.", amps(-cell.0))
            } else {
                format!("It leaves {} for the cell.", amps(cell.0))
            },
            "Lock the button while a charger is connected.",
        ),
        Kind::TrickleAboveLimit { rate } => said(
            "Trickle current too high for an empty cell",
            format!("{} It; cell makers ask for 0.1 It or less.", fixed(*rate, 2)),
            "Lower the charge current, of which the trickle is a tenth.",
        ),
        Kind::ChargerHot { power, limit } => said(
            "The charger gets too hot",
            format!("{} W at worst; it can shed {} W.", fixed(power.0, 1), fixed(limit.0, 1)),
            "A lower charge current, more copper, or a lower supply voltage.",
        ),
        Kind::ParallelMismatch { difference, current, limit } => said(
            "Cells joined at different voltages",
            format!(
                "{} mV apart, {} flow between them at first; one cell may be charged with {}.",
                fixed(difference.0 * 1e3, 0),
                amps(current.0),
                amps(limit.0)
            ),
            "Bring the cells to the same voltage before they are joined.",
        ),
        Kind::ReversedCell { current } => said(
            "A cell put in the wrong way round",
            format!("{} flow at first, and a board's parts conduct that way unprotected.", amps(current.0)),
            "A holder or connector that fits one way only; check with a meter before joining.",
        ),
        Kind::HighVoltage { voltage } => said(
            "High voltage can kill",
            voltage.map_or_else(
                || "The output's voltage is not known here.".into(),
                |v| format!("The output reaches {} kV.", fixed(v.0 * 1e-3, 2)),
            ) + " Hand-held arc and high-voltage devices fall under national rules.",
            "Local codes and licensed practice come first. Never open or touch it powered, and let it bleed before you do.",
        ),
        Kind::DetectionBelowWindow { threshold, limit } => said(
            "Over-discharge detection is below the cell's own limit",
            format!("It opens at {}; the cell's sheet ends at {}.", volts(threshold.0), volts(limit.0)),
            "It saves the cell from ruin, not from wear. Recharge at the recharge mark.",
        ),
        Kind::ShortAheadOfBoard { current, lead_limit } => said(
            "A short ahead of the board",
            format!(
                "{} flow, and no board sees it{}.",
                amps(current.0),
                lead_limit
                    .map_or_else(String::new, |t| format!("; a lead is at its limit after {}", time(t.0)))
            ),
            "Keep the leads from cell to board short, fixed and insulated; a fuse at the cell covers them.",
        ),
        Kind::Transport { cell_wh, total_wh } => said(
            "Transport",
            format!(
                "{} Wh a cell, {} Wh in all; the limits of the small-battery rules are 20 Wh a cell and 100 Wh a battery.",
                fixed(*cell_wh, 1),
                fixed(*total_wh, 1)
            ),
            "Look up the packing instruction and the carrier's rules; terminals insulated, at most 30 % charge by air.",
        ),
        Kind::SwellingAndDisposal => said(
            "Swelling and disposal",
            "A swollen, dented or once over-discharged cell is out of use.".into(),
            "Do not press, pierce or charge it. No cell goes into household waste: take it to a collection point.",
        ),
        Kind::LoadEstimated => said(
            "The strike voltage is an estimate",
            "It was computed from turns and gap, and everything here rests on it.".into(),
            "Measure it on a bench supply before anything is soldered.",
        ),
    }
}

/// Which field would let a check be made.
pub fn not_judged(what: NotJudged) -> String {
    let field = |name: &str, label: &str| format!("{name}: enter “{label}”");
    match what {
        NotJudged::CellContinuous => field("Continuous current of the cell", "Continuous current"),
        NotJudged::CellPulse => field("Pulse current of the cell", "Pulse current"),
        NotJudged::CellCharge => field("Charge current of the cell", "Charge current, most"),
        NotJudged::ColdCharge => field("A charge in the cold", "Coldest use"),
        NotJudged::LongPress(case) => {
            format!("A nuisance trip {}: the arc flickers too often to be followed", at(case))
        }
        NotJudged::Leads => field("Heat in the leads", "Insulation"),
        NotJudged::FuseBreaking => field("What the fuse can break", "Fuse, breaking capacity"),
        NotJudged::FuseHeat => field("Heat in the fuse", "Fuse, resistance"),
        NotJudged::ContactCurrent(p) => format!("Current through the {}: enter its rating", contact(p)),
        NotJudged::ContactVoltage(p) => format!("Voltage at the {}: enter its rating", contact(p)),
        NotJudged::Charger => "The charge: enter a charger".into(),
        NotJudged::ChargerPower => field("Heat in the charger", "Power it stands"),
        NotJudged::OutputVoltage => field("Stored charge of the output", "Output voltage, peak"),
        NotJudged::OutputCapacitance => field("Stored charge of the output", "Capacitance on the output"),
        NotJudged::SwitchHeat(p) => format!("Heat in {} switches: enter their thermal resistance", whose(p)),
    }
}

fn item(setup: &Setup, f: &Finding) -> String {
    let (word, class) = level(f.level);
    let text = finding(setup, &f.kind);
    format!(
        "<li class=\"{class}\"><h3><b>{word}</b> {}</h3><p>{}</p><p><b>Do:</b> {}</p><p class=\"source\">{}</p></li>",
        escaped(&text.title),
        escaped(&text.found),
        escaped(&text.todo),
        escaped(hazard::source(&f.kind))
    )
}

/// The section.
pub fn section(setup: &Setup, hazards: &Hazards) -> String {
    let (grave, notes): (Vec<&Finding>, Vec<&Finding>) =
        hazards.findings.iter().partition(|f| f.level != Level::Note);
    let count = |l: Level| hazards.findings.iter().filter(|f| f.level == l).count();
    let summary = format!(
        "{} checks were made: {} at stop, {} to look into, {} to know. Where nothing stands here, it was looked at.",
        hazards.checks_made,
        count(Level::Stop),
        count(Level::Look),
        count(Level::Note)
    );
    let list = |findings: &[&Finding]| -> String { findings.iter().map(|f| item(setup, f)).collect() };
    let folded = |id: &str, title: String, body: String| {
        format!("<details id=\"{id}\"><summary>{title}</summary>{body}</details>")
    };
    let known = if notes.is_empty() {
        String::new()
    } else {
        let body = format!("<ul class=\"hazards\">{}</ul>", list(&notes));
        folded("notes", format!("To know, {}", notes.len()), body)
    };
    let missing = if hazards.not_judged.is_empty() {
        String::new()
    } else {
        let lines: String =
            hazards.not_judged.iter().map(|n| format!("<li>{}</li>", escaped(&not_judged(*n)))).collect();
        let title = format!("Not judged for want of a figure, {}", hazards.not_judged.len());
        folded("not-judged", title, format!("<ul>{lines}</ul>"))
    };
    format!(
        "<h2 id=\"hazards\">Hazards</h2><p>{summary}</p><ul class=\"hazards\">{}</ul>{known}{missing}",
        list(&grave)
    )
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::arrangements;
    use strikeline_design::check::check;
    use strikeline_design::design::Design;
    use strikeline_design::report::{answer, further};

    /// What no sentence may say: words that a reader in a hurry takes as leave.
    const LEAVE: [&str; 12] = [
        "you can bridge",
        "you may bridge",
        "can be bypassed",
        "may be bypassed",
        "bypass it",
        "safe to",
        "is safe",
        "is fine",
        "no danger",
        "harmless",
        "without a board is",
        "bridge the",
    ];

    fn designs() -> Vec<Design> {
        let mut all = Vec::new();
        for way in ["through_board", "load_at_cell", "switch_bridged", "no_board"] {
            for changes in [
                &[][..],
                &[
                    ("cell.capacity", "0.3 Ah"),
                    ("cell.continuous", "1 A"),
                    ("cell.pulse", "2 A"),
                    ("use.held", "1 h"),
                ],
                &[("leads.fuse", "quick"), ("leads.fuse_rating", "1 A"), ("leads.fuse_breaking", "10 A")],
                &[
                    ("charger.load", "200 mA"),
                    ("charger.current", "2 A"),
                    ("charger.power", "0.5 W"),
                    ("use.cold", "-15 °C"),
                ],
                &[
                    ("load.output", "20 kV"),
                    ("load.output_capacitance", "3 nF"),
                    ("leads.button_current", "0.5 A"),
                ],
                &[("cell.parallel", "2"), ("second.fitted", "yes"), ("leads.load_section", "0.05 mm²")],
                &[("leads.load_length", "15 m"), ("board.stage1", "900 mV"), ("board.stage3", "")],
            ] {
                let mut design = Design::demo();
                design.set("board.arrangement", way);
                for (key, text) in changes {
                    assert!(design.set(key, text), "{key}");
                }
                all.push(design);
            }
        }
        all
    }

    #[test]
    fn exact_without_a_board_nothing_is_said_to_be_kept() {
        let mut design = Design::demo();
        design.set("board.arrangement", "no_board");
        let checked = check(&design).expect("sound");
        let answers = answer(&checked);
        let all = section(&checked.nominal, &answers.hazards);
        assert!(
            all.contains("nothing is left against over-current, short circuit, over-discharge by the load"),
            "{all}"
        );
        let table = arrangements::section(&checked.nominal, &further(&checked, &answers).arrangements);
        // The rows of the ways with a board do not read as if a board kept nothing.
        assert_eq!(table.matches("no board is entered").count(), 3, "{table}");
        assert_eq!(table.matches("✕ nothing").count(), 5, "{table}");
    }

    #[test]
    fn law_every_finding_is_whole_and_gives_no_leave() {
        let mut kinds = Vec::new();
        for design in designs() {
            let Ok(checked) = check(&design) else { panic!("{:?}", check(&design).err()) };
            let answers = answer(&checked);
            for f in &answers.hazards.findings {
                let text = finding(&checked.nominal, &f.kind);
                let name = format!("{:?}", f.kind).split([' ', '{']).next().unwrap_or_default().to_string();
                if !kinds.contains(&name) {
                    kinds.push(name);
                }
                for part in [&text.found, &text.todo] {
                    assert!(part.ends_with('.') && !part.contains("NaN") && !part.contains("inf "), "{part}");
                }
                assert!(!text.title.is_empty() && !hazard::source(&f.kind).is_empty());
            }
            let all = section(&checked.nominal, &answers.hazards)
                + &arrangements::section(&checked.nominal, &further(&checked, &answers).arrangements);
            let small = all.to_lowercase();
            for leave in LEAVE {
                assert!(!small.contains(leave), "“{leave}” in {design:?}");
            }
            assert!(!all.contains("NaN") && !all.contains(">inf"));
        }
        println!("{} kinds of hazard in words: {kinds:?}", kinds.len());
        assert!(kinds.len() >= 24, "{kinds:?}");
    }
}
