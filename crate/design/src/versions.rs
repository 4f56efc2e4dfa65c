//! What a stored design leaves out, version by version.
//!
//! A link holds only what differs from the defaults, and a file may leave out what it likes. Were that filled in
//! from today's defaults, another default would change every old design without a word. So each version's
//! fields and defaults stand here and never change again. Another default or a new field is a new step at the
//! end; a stored design is given what every step after its own version declares. A test holds the newest version and the
//! catalogue together.

use crate::design::Design;

/// The version that is written, of links and of files.
pub const VERSION: u32 = 2;

/// Fields and defaults of version 1.
const FIRST: &[(&str, &str)] = &[
    ("cell.chemistry", "lco_pouch"),
    ("cell.capacity", "1.1 Ah"),
    ("cell.route", "typical"),
    ("cell.r_10s", ""),
    ("cell.sag_rested", ""),
    ("cell.sag_loaded", ""),
    ("cell.sag_current", ""),
    ("cell.sag_time", "10 s"),
    ("cell.continuous", ""),
    ("cell.parallel", "1"),
    ("cell.health", "100 %"),
    ("cell.growth", "1"),
    ("cell.tolerance", "25 %"),
    ("cell.r0", ""),
    ("cell.r1", ""),
    ("cell.tau1", "1.5 s"),
    ("cell.r2", ""),
    ("cell.tau2", "30 s"),
    ("cell.r3", ""),
    ("cell.tau3", "250 s"),
    ("cell.ocv", ""),
    ("cell.entropy", ""),
    ("cell.r0_shape", ""),
    ("cell.branch_shape", ""),
    ("cell.r0_activation", ""),
    ("cell.branch_activation", ""),
    ("cell.heat", ""),
    ("cell.cooling", ""),
    ("board.arrangement", "through_board"),
    ("board.stage1", "150 ± 30 mV"),
    ("board.delay1", "10 ± 4 ms"),
    ("board.pair", "50 ± 10 mΩ"),
    ("board.pairs", "1"),
    ("board.stage2", ""),
    ("board.delay2", "2.2 ms"),
    ("board.stage3", "1 V"),
    ("board.delay3", "0.3 ms"),
    ("board.limit4", ""),
    ("board.delay4", "10 ms"),
    ("board.od", "2.4 ± 0.1 V"),
    ("board.od_delay", "40 ms"),
    ("board.release", "load_removed"),
    ("board.retry", "1 s"),
    ("board.sense", "pair"),
    ("board.shunt", "0 mΩ"),
    ("board.on", ""),
    ("board.alpha", "0.4 %/K"),
    ("board.thermal", "60 K/W"),
    ("board.thermal_time", "8 s"),
    ("board.supply", "5 µA"),
    ("leads.cell_length", "0.05 m"),
    ("leads.cell_section", "0.75 mm²"),
    ("leads.load_length", "0.1 m"),
    ("leads.load_section", "0.75 mm²"),
    ("leads.conductor", "flexible"),
    ("leads.temperature", "20 °C"),
    ("leads.cell_joints", "4 mΩ"),
    ("leads.load_joints", "4 mΩ"),
    ("leads.switch", "10 mΩ"),
    ("load.law", "table"),
    ("load.table", "3.0 2.45\n3.3 2.55\n3.6 2.65\n3.9 2.72\n4.2 2.78"),
    ("load.current", "2.5 A"),
    ("load.power", "9 W"),
    ("load.resistance", "1.4 Ω"),
    ("load.strike", "3.3 V"),
    ("load.hold", "3 V"),
    ("load.start", "2.4 V"),
    ("load.strike_time", "2 ms"),
    ("load.unlit", "8 Ω"),
    ("load.stall", ""),
    ("load.surge", "0 A"),
    ("load.surge_time", "1 ms"),
    ("load.capacitance", "100 µF"),
    ("load.esr", "0 mΩ"),
    ("load.peak", "1"),
    ("use.press", "4 s"),
    ("use.rest", "8 s"),
    ("use.ambient", "20 °C"),
    ("use.presses", "5000"),
    ("second.fitted", "no"),
    ("second.stage1", "150 ± 30 mV"),
    ("second.delay1", "10 ± 4 ms"),
    ("second.pair", "40 ± 8 mΩ"),
    ("second.pairs", "1"),
    ("second.od", "2.8 ± 0.1 V"),
    ("second.od_delay", "100 ms"),
];

/// A field that the version before did not have.
struct Added {
    key: &'static str,
    /// Its default in the version that brought it.
    default: &'static str,
    /// What an older design is given: what leaves it as it was when there was no such field.
    before: &'static str,
}

/// From one version to the next.
struct Step {
    added: &'static [Added],
    /// Fields with another default from here on; an older design keeps the older one.
    changed: &'static [(&'static str, &'static str)],
}

const STEPS: [Step; VERSION as usize - 1] = [Step { added: SECOND, changed: &[] }];

/// What version 2 brought.
const SECOND: &[Added] = &[
    same("cell.pulse", ""),
    same("cell.pulse_time", "10 s"),
    same("cell.charge", ""),
    same("cell.voltage_max", ""),
    same("cell.voltage_min", ""),
    same("cell.discharge_cold", "-20 °C"),
    same("cell.discharge_hot", "60 °C"),
    same("cell.charge_cold", "0 °C"),
    same("cell.charge_hot", "45 °C"),
    same("cell.mismatch", "0 V"),
    Added { key: "board.oc", default: "4.3 ± 0.05 V", before: "" },
    same("board.charge_sense", ""),
    Added { key: "leads.insulation", default: "pvc", before: "unknown" },
    same("leads.fuse", "none"),
    same("leads.fuse_rating", "4 A"),
    same("leads.fuse_cold", "17 mΩ"),
    same("leads.fuse_i2t", ""),
    same("leads.fuse_breaking", ""),
    same("leads.ptc_trip", ""),
    same("leads.ptc_time", "20 s"),
    same("leads.ptc_at", ""),
    same("leads.button_current", ""),
    same("leads.button_voltage", ""),
    same("leads.connector_current", ""),
    same("leads.connector_voltage", ""),
    same("load.known", "measured"),
    same("load.primary", "4"),
    same("load.secondary", "600"),
    same("load.gap", "1.5 mm"),
    same("load.electrodes", "points"),
    same("load.altitude", "0 m"),
    same("load.tank", "unknown"),
    same("load.tank_capacitance", ""),
    same("load.tank_inductance", ""),
    same("load.tank_alone", ""),
    same("load.tank_with", ""),
    same("load.output", ""),
    same("load.output_capacitance", ""),
    Added { key: "use.per_day", default: "20", before: "0" },
    Added { key: "use.storage", default: "180 d", before: "0 d" },
    Added { key: "use.held", default: "1 h", before: "0 h" },
    Added { key: "use.cold", default: "0 °C", before: "" },
    Added { key: "use.case", default: "closed", before: "open" },
    same("charger.fitted", "no"),
    same("charger.current", "1 A"),
    same("charger.float", "4.2 V"),
    same("charger.termination", ""),
    same("charger.trickle_below", "2.9 V"),
    same("charger.trickle", ""),
    same("charger.supply", "5 V"),
    same("charger.load", "0 mA"),
    same("charger.cold", "10 °C"),
    same("charger.hot", "30 °C"),
    same("charger.power", ""),
    Added { key: "second.oc", default: "4.28 ± 0.05 V", before: "" },
    same("second.charge_sense", ""),
];

/// A field whose default leaves an older design as it was.
const fn same(key: &'static str, default: &'static str) -> Added {
    Added { key, default, before: default }
}

/// Why the entries of a stored design are refused.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Refused {
    /// No version has such a field.
    Unknown(String),
    /// A later version than the stored one brought it.
    Later {
        /// The field.
        key: String,
        /// The version that brought it.
        since: u32,
    },
    /// A field stands twice.
    Twice(String),
    /// A text is too long.
    TooLong {
        /// The field.
        key: String,
        /// How many bytes it has.
        got: usize,
    },
}

/// Every field of a version, with its default there.
///
/// - `version`: 1 to [`VERSION`].
pub fn defaults(version: u32) -> Vec<(&'static str, &'static str)> {
    let mut all = FIRST.to_vec();
    for step in &STEPS[..version as usize - 1] {
        for (key, default) in step.changed {
            if let Some(field) = all.iter_mut().find(|field| field.0 == *key) {
                field.1 = default;
            }
        }
        all.extend(step.added.iter().map(|a| (a.key, a.default)));
    }
    all
}

/// The version that brought a field.
fn since(key: &str) -> Option<u32> {
    if FIRST.iter().any(|(first, _)| *first == key) {
        return Some(1);
    }
    (2..=VERSION).find(|version| STEPS[*version as usize - 2].added.iter().any(|a| a.key == key))
}

/// The design of a stored version, from the entries that stand in it.
///
/// - `version`: 1 to [`VERSION`].
/// - `entries`: key and text.
///
/// # Errors
/// The first entry that cannot be used.
pub fn open(version: u32, entries: Vec<(String, String)>) -> Result<Design, Refused> {
    let mut design = Design::default();
    for (key, text) in defaults(version) {
        design.set(key, text);
    }
    for step in &STEPS[version as usize - 1..] {
        for field in step.added {
            design.set(field.key, field.before);
        }
    }
    for (k, (key, text)) in entries.iter().enumerate() {
        match since(key) {
            None => return Err(Refused::Unknown(key.clone())),
            Some(since) if since > version => return Err(Refused::Later { key: key.clone(), since }),
            Some(_) => {}
        }
        if entries[..k].iter().any(|(before, _)| before == key) {
            return Err(Refused::Twice(key.clone()));
        }
        if !design.set(key, text) {
            return Err(Refused::TooLong { key: key.clone(), got: text.len() });
        }
    }
    Ok(design)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::catalogue::FIELDS;
    use crate::design::LONGEST_TEXT;

    /// Whoever changes a default or adds a field comes by here: links of the newest version mean its defaults.
    #[test]
    fn law_the_newest_version_is_the_catalogue() {
        let usual = Design::default();
        let newest = defaults(VERSION);
        let in_newest = |key: &str| newest.iter().find(|(k, _)| *k == key).map(|(_, text)| *text);
        for f in FIELDS {
            assert_eq!(in_newest(f.key), Some(usual.get(f.key)), "{}: needs a step in versions.rs", f.key);
        }
        assert_eq!(newest.len(), FIELDS.len(), "versions.rs has a field that the catalogue has not");
    }

    /// An older design is checked like any other, and so is what stands in for fields that it did not have.
    #[test]
    fn law_an_empty_design_of_every_version_is_sound() {
        for version in 1..=VERSION {
            let design = open(version, Vec::new()).expect("no entries");
            assert!(
                crate::check::check(&design).is_ok(),
                "version {version}: {:?}",
                crate::check::check(&design)
            );
        }
    }

    #[test]
    fn exact_entries_are_refused_by_name() {
        let of = |entries: &[(&str, &str)]| {
            open(1, entries.iter().map(|(k, t)| (k.to_string(), t.to_string())).collect())
        };
        assert_eq!(of(&[("cell.sea", "1")]), Err(Refused::Unknown("cell.sea".into())));
        let twice = of(&[("use.press", "1"), ("cell.capacity", "1"), ("use.press", "1")]);
        assert_eq!(twice, Err(Refused::Twice("use.press".into())));
        let long = "1".repeat(LONGEST_TEXT + 1);
        assert_eq!(
            of(&[("use.press", &long)]),
            Err(Refused::TooLong { key: "use.press".into(), got: long.len() })
        );
    }
}
