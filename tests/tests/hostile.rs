//! Laws for what cannot be trusted: texts in fields, design files, links.
//!
//! The texts are drawn from a fixed seed out of pieces that parsers trip over, so a fault found once is
//! found again.

use fastrand::Rng;
use strikeline_core::charge;
use strikeline_core::press::PressOptions;
use strikeline_core::report::ChargeEnd;
use strikeline_design::catalogue::{FIELDS, Field, Kind, When, field};
use strikeline_design::check::{self, check};
use strikeline_design::design::Design;
use strikeline_design::quantity::Unit;
use strikeline_design::{file, link, quantity};

/// Draws for each kind of input.
const DRAWS: usize = 100_000;

const PIECES: &[&str] = &[
    "0",
    "1",
    "9",
    "-",
    "+",
    ".",
    ",",
    "e",
    "E",
    "e308",
    "e-400",
    "1e999",
    "NaN",
    "inf",
    "-0",
    "0x1",
    " ",
    "\t",
    "\n",
    "\r",
    "\0",
    "\u{a0}",
    "\u{2009}",
    "\u{202f}",
    "\u{feff}",
    "\u{2212}",
    "±",
    "+/-",
    "…",
    "...",
    "%",
    "m",
    "µ",
    "μ",
    "u",
    "k",
    "M",
    "V",
    "A",
    "Ω",
    "\u{2126}",
    "ohm",
    "Ah",
    "F",
    "s",
    "min",
    "h",
    "°C",
    "mm²",
    "mm2",
    "AWG",
    "awg#",
    "K/W",
    "1/K",
    "J/mol",
    "/",
    ";",
    "#",
    "\"",
    "\\",
    "{",
    "}",
    "[",
    "]",
    ":",
    "null",
    "true",
    "🔥",
    "\u{301}",
    "é",
    "٣",
    "½",
    "999999999999999999999999",
    "0.0000000000001",
    "yes",
    "table",
];

fn garbage(rng: &mut Rng) -> String {
    let count = rng.usize(0..9);
    let mut text = String::new();
    for _ in 0..count {
        match rng.u8(0..8) {
            0 => text.push(rng.char(..)),
            _ => text.push_str(PIECES[rng.usize(0..PIECES.len())]),
        }
    }
    text
}

/// A design in which every choice is one of its list, so that every field comes to matter in some draw.
fn with_drawn_choices(rng: &mut Rng) -> Design {
    let mut design = Design::default();
    for f in FIELDS {
        if let Kind::Choice(list) = f.kind {
            design.set(f.key, list[rng.usize(0..list.len())].0);
        }
    }
    design
}

/// A design in which a field matters.
fn where_it_matters(f: &Field) -> Design {
    let mut design = Design::default();
    let mut when = f.when;
    while let When::Is(key, values) = when {
        design.set(key, values[0]);
        when = field(key).expect("a field decides").when;
    }
    assert!(design.matters(f), "{}", f.key);
    design
}

#[test]
fn law_a_field_that_cannot_be_read_is_named() {
    for f in FIELDS {
        let mut design = where_it_matters(f);
        design.set(f.key, "no number § at all");
        let faults = check(&design).expect_err(f.key);
        let own = faults.iter().find(|fault| fault.key == f.key);
        let own = own.unwrap_or_else(|| panic!("{}: not named in {faults:?}", f.key));
        assert!(!own.message.is_empty() && !own.message.contains('\n'), "{}: {}", f.key, own.message);
    }
}

#[test]
fn law_every_faulty_field_is_named_at_once() {
    let mut design = Design::default();
    for f in FIELDS.iter().filter(|f| f.when == When::Always && !matches!(f.kind, Kind::Choice(_))) {
        design.set(f.key, "no number § at all");
    }
    let faults = check(&design).expect_err("all of it is wrong");
    for f in FIELDS.iter().filter(|f| f.when == When::Always && !matches!(f.kind, Kind::Choice(_))) {
        assert!(faults.iter().any(|fault| fault.key == f.key), "{} is not named", f.key);
    }
}

/// Every draw puts a text into every field, so each field gets as many texts as there are draws.
#[test]
fn law_drawn_texts_in_every_field() {
    let mut rng = Rng::with_seed(1);
    let mut refused = 0;
    for draw in 0..DRAWS {
        let mut design = with_drawn_choices(&mut rng);
        for f in FIELDS {
            if !matches!(f.kind, Kind::Choice(_)) || rng.u8(0..16) == 0 {
                design.set(f.key, &garbage(&mut rng));
            }
        }
        match check(&design) {
            Ok(_) => {}
            Err(faults) => {
                refused += 1;
                assert!(!faults.is_empty(), "draw {draw}: refused without a reason");
                for fault in &faults {
                    assert!(FIELDS.iter().any(|f| f.key == fault.key), "draw {draw}: {fault:?}");
                    assert!(!fault.message.is_empty(), "draw {draw}: {fault:?}");
                    assert!(!fault.message.chars().any(char::is_control), "draw {draw}: {fault:?}");
                }
            }
        }
    }
    assert!(refused > DRAWS / 2, "{refused} of {DRAWS} refused: the draws are too tame");
}

/// Drawn texts for every choice, many of them close to a key.
#[test]
fn law_a_drawn_choice_is_one_of_its_list_or_refused() {
    let mut rng = Rng::with_seed(7);
    for f in FIELDS {
        let Kind::Choice(list) = f.kind else { continue };
        let (mut chosen, mut refused) = (0, 0);
        for _ in 0..DRAWS {
            let key = list[rng.usize(0..list.len())].0;
            let text = match rng.u8(0..4) {
                0 => altered(&mut rng, key),
                1 => format!("{key}{}", garbage(&mut rng)),
                _ => garbage(&mut rng),
            };
            match check::chosen(list, &text) {
                Ok(got) => {
                    chosen += 1;
                    assert!(text.contains(got) && list.iter().any(|(key, _)| *key == got), "{text:?}: {got}");
                    assert!(text.replace(got, "").trim().is_empty(), "{text:?} taken as {got}");
                }
                Err(message) => {
                    refused += 1;
                    assert!(one_sentence(&message) && message.contains(list[0].0), "{text:?}: {message}");
                }
            }
        }
        assert!(chosen > DRAWS / 200 && refused > DRAWS / 2, "{}: {chosen} chosen, {refused} refused", f.key);
    }
}

/// One field at a time in a sound design: a text that is no quantity of the field is a fault at that field.
#[test]
fn law_a_drawn_text_in_one_field_is_a_fault_there_or_a_number() {
    let mut rng = Rng::with_seed(2);
    let mut faults_seen = 0;
    for draw in 0..DRAWS {
        let f = &FIELDS[rng.usize(0..FIELDS.len())];
        let Kind::Quantity { shown, optional, tolerance, .. } = f.kind else { continue };
        let text = garbage(&mut rng);
        let readable = match tolerance {
            Some(usual) => quantity::parse_toleranced(&text, &shown, usual).is_ok(),
            None => quantity::parse(&text, &shown).is_ok(),
        };
        if readable || (optional && text.trim().is_empty()) {
            continue;
        }
        let mut design = where_it_matters(f);
        design.set(f.key, &text);
        let faults = check(&design).expect_err("not a quantity");
        assert!(faults.iter().any(|x| x.key == f.key), "draw {draw}: {text:?} in {}: {faults:?}", f.key);
        faults_seen += 1;
    }
    assert!(faults_seen > DRAWS / 4, "{faults_seen}");
}

#[test]
fn law_a_quantity_that_is_read_is_finite_and_formats_back_to_itself() {
    let mut rng = Rng::with_seed(3);
    for f in FIELDS {
        let Kind::Quantity { shown, min, max, .. } = f.kind else { continue };
        for _ in 0..2000 {
            let x = if rng.bool() {
                min + (max - min) * rng.f64()
            } else {
                (min.abs() + 1e-9) * 10f64.powf(4.0 * rng.f64())
            };
            let text = quantity::format(x, &shown);
            let back = quantity::parse(&text, &shown).unwrap_or_else(|e| panic!("{}: {text}: {e}", f.key));
            assert_eq!(back.to_bits(), x.to_bits(), "{}: {x:e} as {text}", f.key);
        }
    }
}

#[test]
fn law_a_default_is_within_its_own_range() {
    for f in FIELDS {
        let Kind::Quantity { shown, min, max, optional, tolerance } = f.kind else { continue };
        if optional && f.default.is_empty() {
            continue;
        }
        let value = quantity::parse_toleranced(f.default, &shown, tolerance.unwrap_or(0.0));
        let value = value.unwrap_or_else(|e| panic!("{}: {e}", f.key)).typical;
        assert!((min..=max).contains(&value), "{}: {value} outside {min} to {max}", f.key);
    }
}

/// The text of a sound design file with a few bytes replaced, cut or repeated.
fn altered(rng: &mut Rng, sound: &str) -> String {
    let mut bytes = sound.as_bytes().to_vec();
    for _ in 0..rng.usize(1..4) {
        let at = rng.usize(0..bytes.len());
        match rng.u8(0..5) {
            0 => bytes[at] = rng.u8(..),
            1 => bytes.truncate(at.max(1)),
            2 => {
                bytes.remove(at);
                if bytes.is_empty() {
                    bytes.push(b'{');
                }
            }
            3 => {
                let piece = PIECES[rng.usize(0..PIECES.len())].as_bytes();
                bytes.splice(at..at, piece.iter().copied());
            }
            _ => {
                let end = (at + rng.usize(0..40)).min(bytes.len());
                let part = bytes[at..end].to_vec();
                bytes.splice(at..at, part);
            }
        }
    }
    String::from_utf8_lossy(&bytes).into_owned()
}

fn one_sentence(message: &str) -> bool {
    !message.is_empty() && !message.chars().any(char::is_control) && message.len() < 400
}

#[test]
fn law_drawn_files() {
    let mut rng = Rng::with_seed(4);
    let short = r#"{"strikeline": 1, "name": "a", "cell": {"capacity": 2.28}, "load": {"table": [[3, 2.5], [4, 2.7]]}}"#;
    let long = file::to_json(&Design::demo());
    let mut refused = 0;
    for draw in 0..DRAWS {
        let text = match draw % 8 {
            0 => garbage(&mut rng),
            1 => altered(&mut rng, &long),
            _ => altered(&mut rng, short),
        };
        match file::from_json(&text) {
            Ok(design) => assert_eq!(file::from_json(&file::to_json(&design)), Ok(design), "{text}"),
            Err(error) => {
                refused += 1;
                assert!(one_sentence(&error.to_string()), "{text:?}: {error:?}");
            }
        }
    }
    assert!(refused > DRAWS / 2 && refused < DRAWS, "{refused}");
}

#[test]
fn exact_hostile_files_are_refused_with_the_field() {
    let said = |text: &str| file::from_json(text).expect_err(text).to_string();
    for (text, names) in [
        (r#"{"strikeline": 1, "name": 5}"#, "name"),
        (r#"{"strikeline": 1, "note": {}}"#, "note"),
        (r#"{"strikeline": 1, "cell": 5}"#, "cell"),
        (r#"{"strikeline": 1, "sell": {}}"#, "sell"),
        (r#"{"strikeline": 1, "cell": {"capacity": null}}"#, "cell.capacity"),
        (r#"{"strikeline": 1, "cell": {"capacity": true}}"#, "cell.capacity"),
        (r#"{"strikeline": 1, "load": {"table": [[1, "NaN"]]}}"#, "load.table"),
        (r#"{"strikeline": 1, "load": {"table": [[1, 2, 3]]}}"#, "load.table"),
        (r#"{"strikeline": "1"}"#, "strikeline"),
        (r#"{"strikeline": 1.5}"#, "strikeline"),
        (r#"{"strikeline": 0}"#, "strikeline"),
        (r#"{"strikeline": -1}"#, "strikeline"),
        (r#"{"strikeline": 99999999999999}"#, "version 99999999999999"),
        (r#"{"name": "no version"}"#, "strikeline"),
        (r#"{"strikeline": [1]}"#, "strikeline"),
        (r#"{"strikeline": 1, "cell": {"capacity": 1, "capacity": 1}}"#, "cell.capacity"),
        (r#"{"strikeline": 1, "cell": {"capacity": {"a": 1, "a": 1}}}"#, "cell.capacity.a"),
        (r#"{"strikeline": 1, "use": {}, "use": {}}"#, "use"),
        (r#"{"strikeline": 1, "strikeline": 2}"#, "strikeline"),
    ] {
        let message = said(text);
        assert!(message.contains(names) && one_sentence(&message), "{text}: {message}");
        assert!(!message.contains("version is missing") || !text.contains("strikeline"), "{text}: {message}");
    }
    assert!(said(&format!("{{\"strikeline\": 1, \"a\": {}", "[".repeat(500_000))).len() < 400);
    assert!(said(&" ".repeat(10_000_000)).contains("10000000 bytes"));
    let deep =
        format!(r#"{{"strikeline": 1, "cell": {{"capacity": {}{}}}}}"#, "[".repeat(120), "]".repeat(120));
    assert!(said(&deep).contains("cell.capacity"));
}

/// A link whose checksum is right, whatever it holds.
fn signed(version: u32, plain: &[u8]) -> String {
    let mut bytes = crc32fast::hash(plain).to_le_bytes().to_vec();
    bytes.extend(miniz_oxide::deflate::compress_to_vec(plain, 1));
    format!("#{version}.{}", data_encoding::BASE64URL_NOPAD.encode(&bytes))
}

#[test]
fn law_drawn_links() {
    let mut rng = Rng::with_seed(5);
    let mut design = Design::demo();
    design.set("cell.capacity", "2,8 Ah");
    let sound = link::encode(&design);
    let inner = r#"{"n":"a","t":"b","f":[["cell.capacity","2 Ah"],["load.strike","3,3 V"]]}"#;
    let (mut refused, mut opened) = (0, 0);
    for draw in 0..DRAWS {
        let text = match draw % 4 {
            0 => garbage(&mut rng),
            1 => format!("#{}.{}", rng.u8(0..3), garbage(&mut rng)),
            2 => altered(&mut rng, &sound),
            _ => signed(rng.u32(1..=link::VERSION), altered(&mut rng, inner).as_bytes()),
        };
        match link::decode(&text) {
            Ok(design) => {
                opened += 1;
                assert_eq!(link::decode(&link::encode(&design)), Ok(design), "{text}");
            }
            Err(error) => {
                refused += 1;
                assert!(one_sentence(&error.to_string()), "{text:?}: {error:?}");
            }
        }
    }
    assert!(refused > DRAWS / 2 && opened > 100, "{refused} refused, {opened} opened");
}

/// Stored links of every version, with the text of every field. They open to these for ever: the files are only
/// added to, with the fields that a later version brings.
const STORED: &[&str] = &[
    include_str!("../data/links/1-changed.json"),
    include_str!("../data/links/1-defaults.json"),
    include_str!("../data/links/2-changed.json"),
    include_str!("../data/links/2-defaults.json"),
];

#[test]
fn golden_links_of_every_version_open() {
    let mut seen = Vec::new();
    for text in STORED {
        let stored: serde_json::Value = serde_json::from_str(text).expect("a stored link");
        let link = stored["link"].as_str().expect("a link");
        let design = link::decode(link).expect(link);
        assert_eq!(
            (design.name.as_str(), design.note.as_str()),
            (stored["name"].as_str().expect("a text"), stored["note"].as_str().expect("a text"),),
            "{link}"
        );
        let fields = stored["fields"].as_object().expect("a text for every field");
        for f in FIELDS {
            let held = fields.get(f.key).and_then(|t| t.as_str());
            assert_eq!(Some(design.get(f.key)), held, "{}: {link}", f.key);
        }
        assert_eq!(fields.len(), FIELDS.len(), "{link}");
        seen.push(link.split('.').next().expect("a version").trim_start_matches('#').to_string());
    }
    for version in 1..=link::VERSION {
        assert!(seen.contains(&version.to_string()), "no link of version {version}");
    }
}

/// A file of version 1 leaves out the same as a link of version 1.
#[test]
fn law_file_and_link_of_a_version_leave_out_the_same() {
    for version in 1..=link::VERSION {
        let plain = br#"{"n":"a","f":[["load.strike","3,35 V"]]}"#;
        let linked = link::decode(&signed(version, plain)).expect("a link");
        let file = format!(r#"{{"strikeline": {version}, "name": "a", "load": {{"strike": "3,35 V"}}}}"#);
        assert_eq!(file::from_json(&file), Ok(linked), "version {version}");
    }
}

/// What an older design lacked is filled in so that its presses stay what they were.
#[test]
fn law_an_older_version_lights_the_same() {
    let of = |version: u32| {
        let file = format!(r#"{{"strikeline": {version}, "second": {{"fitted": "yes"}}}}"#);
        check(&file::from_json(&file).expect("a file")).expect("sound")
    };
    let newest = of(link::VERSION);
    for version in 1..link::VERSION {
        let older = of(version);
        assert_eq!((&older.nominal, &older.weak), (&newest.nominal, &newest.weak), "version {version}");
    }
}

#[test]
fn exact_a_link_with_a_field_twice_is_damaged() {
    let plain = br#"{"f":[["use.press","1 s"],["use.press","2 s"]]}"#;
    assert_eq!(link::decode(&signed(2, plain)), Err(link::LinkError::Damaged));
}

/// A value anywhere in the field's range, often at its very ends.
fn drawn_value(rng: &mut Rng, min: f64, max: f64) -> f64 {
    match rng.u8(0..6) {
        0 => min,
        1 => max,
        2 => min + (max - min) * rng.f64(),
        _ if min > 0.0 => (min * (max / min).powf(rng.f64())).clamp(min, max),
        _ => min + (max - min) * rng.f64().powi(4),
    }
}

/// What passes the checks ends in a stated outcome, in numbers, within the bound on work.
#[test]
fn law_a_checked_design_is_answered() {
    let mut rng = Rng::with_seed(6);
    let (mut answered, mut limited) = (0, 0);
    // Most draws contradict themselves somewhere and are refused at once.
    for draw in 0..4000 {
        let mut design = with_drawn_choices(&mut rng);
        for f in FIELDS {
            if let Kind::Quantity { shown, min, max, .. } = f.kind
                && rng.u8(0..6) == 0
                && f.key != "use.presses"
            {
                let value = drawn_value(&mut rng, min, max);
                let value = if shown.unit == Unit::Count { value.round() } else { value };
                design.set(f.key, &quantity::format(value, &shown));
            }
        }
        design.set("use.presses", "2");
        let Ok(checked) = check(&design) else { continue };
        for setup in [&checked.nominal, &checked.weak] {
            let report = charge::run(setup);
            let numbers = [report.ledger.residual(), report.soc_left, report.clock.0, report.lit.0];
            let whole = numbers.iter().all(|n| n.is_finite());
            assert!(whole, "draw {draw}: {numbers:?}\n{}", link::encode(&design));
            // The bound is looked at between presses, so one press may go past it, by its own bound.
            let bound = charge::MAX_STEPS + 200 * u64::from(PressOptions::default().max_events);
            assert!(report.steps <= bound, "draw {draw}: {} steps", report.steps);
            limited += usize::from(report.end == ChargeEnd::WorkLimit);
        }
        answered += 1;
    }
    println!("{answered} answered, {limited} ended at the bound on work");
    assert!(answered > 100, "{answered}");
}

/// The documentation of the design file is the catalogue's own, so it cannot fall behind.
#[test]
fn law_the_readme_lists_every_field() {
    let readme = include_str!("../../README.md");
    for line in file::field_table().lines() {
        assert!(readme.contains(line), "README.md lacks this line, or has an older one: {line}");
    }
}
