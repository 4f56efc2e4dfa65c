//! Drawn garbage for every field, file and link: no panic, no hang, a message that names the field.

use strikeline_design::catalogue::FIELDS;
use strikeline_design::check::check;
use strikeline_design::design::Design;
use strikeline_design::{file, link};

/// A small generator, so that a failure can be drawn again: xorshift of 64 bits.
struct Draw(u64);

impl Draw {
    fn next(&mut self) -> u64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        self.0
    }

    fn below(&mut self, n: usize) -> usize {
        (self.next() % n as u64) as usize
    }

    fn text(&mut self) -> String {
        const PIECES: [&str; 40] = [
            "1", "0", "-", "+", ".", ",", "e", "E", "9999", "1e308", "1e-320", "nan", "inf", " ", "\u{a0}",
            "±", "…", "%", "mV", "V", "A", "Ω", "mΩ", "µ", "AWG", "mm²", "s", "\n", "\t", ";", "\"", "<",
            "{", "[", "}", "\u{0}", "𝄞", "٣", "m", "k",
        ];
        (0..self.below(8)).map(|_| PIECES[self.below(PIECES.len())]).collect()
    }
}

#[test]
fn law_garbage_in_a_field_is_a_fault_that_names_it_or_a_sound_design() {
    let mut draw = Draw(0x5eed_0001);
    let sound = Design::demo();
    let mut faults_seen = 0;
    for round in 0..100_000 {
        let f = &FIELDS[round % FIELDS.len()];
        let mut design = sound.clone();
        let text = draw.text();
        design.set(f.key, &text);
        if let Err(faults) = check(&design) {
            faults_seen += 1;
            assert!(!faults.is_empty(), "{}: {text:?}", f.key);
            for fault in &faults {
                assert!(FIELDS.iter().any(|f| f.key == fault.key) && !fault.message.is_empty());
                assert!(fault.message.len() < 400, "{}: {}", fault.key, fault.message);
            }
            // A garbled field may break a rule with another, but itself or a neighbour of its part is named.
            let part = f.key.split('.').next();
            assert!(
                faults.iter().any(|fault| fault.key.split('.').next() == part),
                "{}: {text:?}: {faults:?}",
                f.key
            );
        }
    }
    assert!(faults_seen > 50_000, "only {faults_seen} faults: the garbage is too tame");
}

#[test]
fn law_a_damaged_link_is_one_sentence() {
    let mut draw = Draw(0x5eed_0002);
    let whole = link::encode(&Design::demo());
    for _ in 0..100_000 {
        let mut bytes = whole.clone().into_bytes();
        for _ in 0..=draw.below(3) {
            let at = draw.below(bytes.len());
            bytes[at] = 33 + (draw.next() % 94) as u8;
        }
        bytes.truncate(1 + draw.below(bytes.len()));
        let text = String::from_utf8(bytes).expect("ascii");
        if let Err(error) = link::decode(&text) {
            let said = error.to_string();
            assert!(!said.is_empty() && !said.contains('\n') && said.len() < 200);
        }
    }
}

#[test]
fn law_a_damaged_file_is_one_sentence() {
    let mut draw = Draw(0x5eed_0003);
    let whole = file::to_json(&Design::demo());
    for _ in 0..100_000 {
        let mut bytes = whole.clone().into_bytes();
        for _ in 0..=draw.below(4) {
            let at = draw.below(bytes.len());
            bytes[at] = 32 + (draw.next() % 95) as u8;
        }
        if draw.below(4) == 0 {
            bytes.truncate(draw.below(bytes.len()));
        }
        if let Err(error) = file::from_json(&String::from_utf8_lossy(&bytes)) {
            let said = error.to_string();
            assert!(!said.is_empty() && said.len() < 400, "{said}");
        }
    }
}
