//! Boards to start from, for a board that is known by its looks only, and how to know it better.
//!
//! A class is a set of field texts with least, typical and most value; choosing one writes them into the fields, where
//! they can be changed. Figures of a data sheet that prints a range to order from are ours within that range.

use crate::design::Design;

/// A kind of board.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct BoardClass {
    /// How it is named in commands.
    pub key: &'static str,
    /// How the page names it.
    pub label: &'static str,
    /// What it is, in one line.
    pub about: &'static str,
    /// The fields it sets, with their texts.
    pub fields: &'static [(&'static str, &'static str)],
}

/// What every class of board says of the rest, so that nothing of another board is left over.
macro_rules! board {
    ($($key:literal $text:literal),* $(,)?) => {
        &[
            $(($key, $text),)*
            ("board.limit4", ""),
            ("board.sense", "pair"),
            ("board.shunt", "0 mΩ"),
            ("board.on", ""),
            // Load removed, or more than 500 kΩ between the outputs: functional description of the two-level family.
            ("board.release", "load_removed"),
        ]
    };
}

/// Two-level protector with `$pairs` pairs of two switches.
macro_rules! two_level {
    ($pairs:literal) => {
        board![
            // Discharge over-current 150 ± 30 mV: DW01A data sheet, H&M Semiconductor.
            "board.stage1" "120/150/180 mV",
            // Delay 10 ms typical, 20 ms most, no least: electrical characteristics quoted in a public design note.
            "board.delay1" "10 (20) ms",
            // Two switches of 20 mΩ (S8205A-type sheet, typical at 4.5 V), of 25 mΩ (common practice, no source), and of
            // 31 mΩ (FS8205A rev. 1.8: most 28 mΩ at 4.5 V and 37 mΩ at 2.5 V, straight line to 3.8 V).
            "board.pair" "40/50/62 mΩ",
            "board.pairs" $pairs,
            "board.stage2" "",
            "board.delay2" "2.2 ms",
            // Three sheets of the family differ: 1.00 ± 0.30 V, 1.0/1.2/1.4 V, 1.35 V.
            "board.stage3" "0.7/1/1.4 V",
            // 5 µs typical, 50 µs most: the same note as for the delay.
            "board.delay3" "0.005 (0.05) ms",
            // 2.40 ± 0.10 V: DW01A data sheet. Delay 40 ms typical, 200 ms most: the same note.
            "board.od" "2.3/2.4/2.5 V",
            "board.od_delay" "40 (200) ms",
            // 4.300 ± 0.050 V and 3 µA: DW01A data sheet. No charge over-current.
            "board.oc" "4.25/4.3/4.35 V",
            "board.charge_sense" "",
            "board.supply" "3 µA",
        ]
    };
}

const CLASSES: &[BoardClass] = &[
    BoardClass {
        key: "two_level",
        label: "150 mV, two levels, one pair",
        about: "The small board with one six-legged and one eight-legged part; about 3 A. Its short-circuit delay of \
                microseconds may take the inrush of an input capacitor for a short.",
        fields: two_level!("1"),
    },
    BoardClass {
        key: "two_level_two_pairs",
        label: "150 mV, two levels, two pairs",
        about: "The same with two eight-legged parts side by side; about 6 A.",
        fields: two_level!("2"),
    },
    BoardClass {
        key: "low_resistance",
        label: "100 mV, low resistance",
        about: "A newer board with one flat switch of less than 25 mΩ; about 5.5 A.",
        fields: board![
            // 0.05–0.32 V ± 15 mV, delays ± 20 %: AP9101C data sheet, DS37771 rev. 7-2. 100 mV, 10 ms: ours.
            "board.stage1" "85/100/115 mV",
            "board.delay1" "8/10/12 ms",
            // 12.5/18/23 mΩ source to source at 3.8 V: FC4B22270L1 data sheet, TT4-ZZ-02012 rev. 1.
            "board.pair" "12.5/18/23 mΩ",
            "board.pairs" "1",
            "board.stage2" "",
            "board.delay2" "2.2 ms",
            // 0.45–0.70 V ± 100 mV: AP9101C. 0.5 V, 0.3 ms: ours.
            "board.stage3" "0.4/0.5/0.6 V",
            "board.delay3" "0.24/0.3/0.36 ms",
            // 2.0–3.4 V ± 35 mV: AP9101C. 2.4 V, 40 ms: ours.
            "board.od" "2.365/2.4/2.435 V",
            "board.od_delay" "32/40/48 ms",
            // 3.5–4.5 V ± 25 mV, charge over-current 0.05–0.2 V ± 15 mV, 3.0 µA: AP9101C. 4.3 V, 100 mV: ours.
            "board.oc" "4.275/4.3/4.325 V",
            "board.charge_sense" "85/100/115 mV",
            "board.supply" "3 µA",
        ],
    },
    BoardClass {
        key: "three_level",
        label: "150 mV, three levels",
        about: "A protector with a second over-current level at 0.5 V that is faster than the first; about 3 A.",
        fields: board![
            // 0.05–0.30 V ± 15 mV: S-8261 data sheet rev. 5.4. 150 mV: ours. Delays: the same, rev. 1.9, table 9.
            "board.stage1" "135/150/165 mV",
            "board.delay1" "7.2/9/11 ms",
            // As for the two-level classes.
            "board.pair" "40/50/62 mΩ",
            "board.pairs" "1",
            // 0.50 ± 0.10 V: S-8261.
            "board.stage2" "0.4/0.5/0.6 V",
            "board.delay2" "1.8/2.24/2.7 ms",
            // 1.2 V; its least and most are those from −40 to 85 °C, rev. 1.9, table 6.
            "board.stage3" "0.7/1.2/1.7 V",
            "board.delay3" "0.22/0.32/0.38 ms",
            // 2.0–3.0 V ± 50 mV: S-8261. 2.4 V: ours.
            "board.od" "2.35/2.4/2.45 V",
            "board.od_delay" "115/144/173 ms",
            // 3.9–4.5 V ± 25 mV and 3.5 µA: S-8261. 4.3 V: ours.
            "board.oc" "4.275/4.3/4.325 V",
            "board.charge_sense" "",
            "board.supply" "3.5 µA",
        ],
    },
    BoardClass {
        key: "wrap",
        label: "The cell's own protector, in its wrap",
        about: "The strip under the tape at the tabs of a pouch cell; it fills the second protector, the board stays.",
        fields: &[
            ("second.fitted", "yes"),
            // As for the two-level classes.
            ("second.stage1", "120/150/180 mV"),
            ("second.delay1", "10 (20) ms"),
            // Two switches of 17.5 (22) mΩ at 4.5 V and 25 (30) mΩ at 2.5 V, straight line to 3.8 V: GF6968A data sheet.
            ("second.pair", "40 (50) mΩ"),
            ("second.pairs", "1"),
            ("second.od", "2.3/2.4/2.5 V"),
            ("second.od_delay", "40 (200) ms"),
            // 4.28 ± 0.05 V: another sheet of the two-level family.
            ("second.oc", "4.23/4.28/4.33 V"),
            ("second.charge_sense", ""),
        ],
    },
    BoardClass {
        key: "none",
        label: "No board",
        about: "Nothing opens on a short, on an empty cell or on an over-charged one.",
        fields: &[("board.arrangement", "no_board")],
    },
];

/// The kinds of board to start from, in the order of the page.
pub fn board_classes() -> &'static [BoardClass] {
    CLASSES
}

/// Writes a class into the fields; whether there is such a class.
///
/// A design without a board gets it into the load's path; any other way of wiring stays.
pub fn apply(design: &mut Design, class_key: &str) -> bool {
    let Some(class) = CLASSES.iter().find(|class| class.key == class_key) else { return false };
    let is_board = class.fields.iter().any(|(key, _)| *key == "board.stage1");
    if is_board && design.get("board.arrangement") == "no_board" {
        design.set("board.arrangement", "through_board");
    }
    for (key, text) in class.fields {
        design.set(key, text);
    }
    true
}

/// Which four numbers to copy from data sheets, and where they stand: (field, text).
pub const FOUR_NUMBERS: [(&str, &str); 4] = [
    (
        "board.stage1",
        "Data sheet of the protector (the part with six legs), table of electrical characteristics: discharge \
         over-current detection voltage, with least, typical and most value. Not the short-circuit line below it. If the \
         sheet covers a family, the line with the letters that are printed on the part.",
    ),
    (
        "board.delay1",
        "The same sheet, lines of the delay times: discharge over-current detection delay, typical and most. Some sheets \
         have a table of its own for delays.",
    ),
    (
        "board.pair",
        "Data sheet of the switches (the part with eight legs): static drain-source on-resistance, typical and most. It \
         is printed for 4.5 V and 2.5 V at the gate; 3.8 V lies between, nearer to 4.5 V. Enter it twice, because the \
         current passes two switches; if the sheet says source to source, it is the pair already.",
    ),
    (
        "board.od",
        "Data sheet of the protector, table of electrical characteristics: over-discharge detection voltage, with least, \
         typical and most value.",
    ),
];

/// How to get the pair's resistance without a data sheet, with a bench supply and a meter, step by step.
pub const PAIR_BY_METER: &[&str] = &[
    "Take the cell off the board first and keep it away. On a connected cell a slip of the probe is a short circuit that \
     burns, and a lithium cell may catch fire. Do not bridge the board for this or for anything else.",
    "Set a bench supply to 3.8 V with its current limit at 0.5 A. Connect it in place of the cell, plus to B+ and minus to \
     B−. Check the polarity before: reversed, the board is destroyed.",
    "Connect a resistor of about 10 Ω and at least 5 W from P+ to P−. It draws 0.38 A and gets hot: lay it on something that \
     cannot burn, and do not touch it.",
    "If nothing flows, the protector waits for a charger. Then this way does not work on it; take a class of board with its \
     wide tolerance, and leave the board as it is.",
    "Measure the voltage between B− and P− in the millivolt range, with the probes on the board's own pads and not on the \
     clips, so that the leads do not count.",
    "Divide it by the current: 19 mV at 0.38 A are 50 mΩ. Read within a few seconds, before the switches get warm.",
    "What you measured is all pairs together. With two eight-legged parts in parallel enter twice that, and 2 as the \
     number of pairs. If the board has a shunt between the same pads, subtract it.",
];

#[cfg(test)]
mod tests {
    use super::*;
    use crate::catalogue::{Kind, field};
    use crate::check::check;
    use crate::quantity::parse_toleranced;

    #[test]
    fn law_every_class_is_sound_and_leaves_nothing_of_another() {
        for class in board_classes() {
            let mut alone = Design::default();
            assert!(apply(&mut alone, class.key));
            assert!(check(&alone).is_ok(), "{}: {:?}", class.key, check(&alone));
            for before in board_classes().iter().filter(|c| !["wrap", "none"].contains(&c.key)) {
                let mut after = Design::default();
                for (key, text) in
                    [("board.limit4", "3 A"), ("board.sense", "shunt"), ("board.shunt", "5 mΩ")]
                {
                    after.set(key, text);
                }
                apply(&mut after, "none");
                apply(&mut after, before.key);
                apply(&mut after, class.key);
                if !["wrap", "none"].contains(&class.key) {
                    assert_eq!(after, alone, "{} after {}", class.key, before.key);
                }
            }
        }
        assert!(!apply(&mut Design::default(), "another"));
    }

    #[test]
    fn law_a_class_sets_fields_of_the_catalogue_and_their_tolerance() {
        for class in board_classes() {
            assert!(!class.about.contains('\n') && class.about.ends_with('.'), "{}", class.key);
            for (key, text) in class.fields {
                let f = field(key).unwrap_or_else(|| panic!("{}: {key}", class.key));
                let Kind::Quantity { shown, tolerance: Some(_), .. } = f.kind else { continue };
                // Without its level, a delay means nothing.
                let no_level = class.fields.contains(&("board.stage2", ""));
                if text.is_empty() || (*key == "board.delay2" && no_level) {
                    continue;
                }
                // Without a usual tolerance to fall back on, most must still be above typical.
                let got = parse_toleranced(text, &shown, 0.0).expect(text);
                assert!(got.max > got.typical, "{}: {key} {text} has no tolerance", class.key);
            }
        }
    }

    #[test]
    fn exact_a_wrap_leaves_the_board_and_a_board_leaves_the_wiring() {
        let mut design = Design::default();
        let board = design.get("board.stage1").to_string();
        design.set("board.arrangement", "load_at_cell");
        apply(&mut design, "wrap");
        assert_eq!((design.get("board.stage1"), design.get("second.fitted")), (board.as_str(), "yes"));
        apply(&mut design, "three_level");
        assert_eq!((design.get("board.arrangement"), design.get("second.fitted")), ("load_at_cell", "yes"));
        apply(&mut design, "none");
        assert!(check(&design).expect("sound").nominal.board.is_none());
        apply(&mut design, "two_level");
        assert_eq!(design.get("board.arrangement"), "through_board");
    }

    #[test]
    fn law_the_four_numbers_are_fields() {
        assert!(FOUR_NUMBERS.iter().all(|(key, text)| field(key).is_some() && text.ends_with('.')));
    }
}
