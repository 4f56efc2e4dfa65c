//! What people type, as a number with its unit, and back.
//!
//! A bare number is in the field's own unit (`45` in a field shown in mΩ is 45 mΩ); a bare prefix is one
//! of the base unit (`150m` in a field of volts is 150 mV). Comma and point are both decimal signs.

/// What kind of quantity a text stands for. The number is kept in the base unit.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Unit {
    /// V
    Volt,
    /// A
    Ampere,
    /// Ω
    Ohm,
    /// Ah
    AmpereHour,
    /// F
    Farad,
    /// s
    Second,
    /// W
    Watt,
    /// °C
    Celsius,
    /// m
    Metre,
    /// mm²; AWG is accepted
    Section,
    /// J/K
    HeatCapacity,
    /// W/K
    Cooling,
    /// K/W
    ThermalResistance,
    /// J/mol
    Activation,
    /// 1/K
    PerKelvin,
    /// V/K
    VoltPerKelvin,
    /// A²·s
    SquareAmpereSecond,
    /// Hz
    Hertz,
    /// H
    Henry,
    /// A plain ratio; `%` is accepted
    Ratio,
    /// A whole number
    Count,
}

/// The spellings of a unit with what they are worth in the base unit, the preferred first.
fn spellings(unit: Unit) -> &'static [(&'static str, f64)] {
    match unit {
        Unit::Volt => &[("V", 1.0), ("volt", 1.0), ("volts", 1.0)],
        Unit::Ampere => &[("A", 1.0), ("amp", 1.0), ("amps", 1.0)],
        Unit::Ohm => &[("Ω", 1.0), ("\u{2126}", 1.0), ("ohm", 1.0), ("Ohm", 1.0), ("ohms", 1.0), ("R", 1.0)],
        Unit::AmpereHour => &[("Ah", 1.0), ("AH", 1.0), ("ah", 1.0)],
        Unit::Farad => &[("F", 1.0)],
        Unit::Second => &[("s", 1.0), ("sec", 1.0), ("min", 60.0), ("h", 3600.0), ("d", 86_400.0)],
        Unit::Watt => &[("W", 1.0)],
        Unit::Celsius => &[("°C", 1.0), ("℃", 1.0), ("C", 1.0), ("degC", 1.0), ("deg C", 1.0), ("°", 1.0)],
        Unit::Metre => &[("m", 1.0)],
        Unit::Section => &[("mm²", 1.0), ("mm2", 1.0), ("mm^2", 1.0), ("sqmm", 1.0), ("qmm", 1.0)],
        Unit::HeatCapacity => &[("J/K", 1.0)],
        Unit::Cooling => &[("W/K", 1.0)],
        Unit::ThermalResistance => &[("K/W", 1.0), ("°C/W", 1.0)],
        Unit::Activation => &[("J/mol", 1.0)],
        Unit::PerKelvin => &[("1/K", 1.0), ("/K", 1.0), ("%/K", 0.01), ("%/°C", 0.01)],
        Unit::VoltPerKelvin => &[("V/K", 1.0)],
        Unit::SquareAmpereSecond => {
            &[("A²s", 1.0), ("A²·s", 1.0), ("A² s", 1.0), ("A2s", 1.0), ("A^2s", 1.0), ("A^2 s", 1.0)]
        }
        Unit::Hertz => &[("Hz", 1.0), ("hertz", 1.0)],
        Unit::Henry => &[("H", 1.0)],
        Unit::Ratio => &[("", 1.0), ("%", 0.01), ("×", 1.0), ("x", 1.0)],
        Unit::Count => &[("", 1.0)],
    }
}

/// What a unit measures, for a sentence.
fn noun(unit: Unit) -> &'static str {
    match unit {
        Unit::Volt => "a voltage",
        Unit::Ampere => "a current",
        Unit::Ohm => "a resistance",
        Unit::AmpereHour => "a capacity",
        Unit::Farad => "a capacitance",
        Unit::Second => "a time",
        Unit::Watt => "a power",
        Unit::Celsius => "a temperature",
        Unit::Metre => "a length",
        Unit::Section => "a section",
        Unit::HeatCapacity => "a heat capacity",
        Unit::Cooling => "a cooling in W/K",
        Unit::ThermalResistance => "a thermal resistance",
        Unit::Activation => "an activation energy",
        Unit::PerKelvin => "a temperature coefficient",
        Unit::VoltPerKelvin => "a voltage per kelvin",
        Unit::SquareAmpereSecond => "an I²t",
        Unit::Hertz => "a frequency",
        Unit::Henry => "an inductance",
        Unit::Ratio => "a ratio",
        Unit::Count => "a whole number",
    }
}

const UNITS: [Unit; 19] = [
    Unit::Volt,
    Unit::Ampere,
    Unit::Ohm,
    Unit::AmpereHour,
    Unit::Farad,
    Unit::Second,
    Unit::Watt,
    Unit::Celsius,
    Unit::Metre,
    Unit::Section,
    Unit::HeatCapacity,
    Unit::Cooling,
    Unit::ThermalResistance,
    Unit::Activation,
    Unit::PerKelvin,
    Unit::VoltPerKelvin,
    Unit::SquareAmpereSecond,
    Unit::Hertz,
    Unit::Henry,
];

const PREFIXES: [(&str, f64); 9] = [
    ("p", 1e-12),
    ("n", 1e-9),
    ("µ", 1e-6),
    ("μ", 1e-6),
    ("u", 1e-6),
    ("m", 1e-3),
    ("c", 1e-2),
    ("k", 1e3),
    ("M", 1e6),
];

/// How a field shows its quantity: the unit with a prefix in front.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Shown {
    /// The unit.
    pub unit: Unit,
    /// As it stands behind a number, such as `mΩ`.
    pub text: &'static str,
    /// What one of it is worth in the base unit.
    pub worth: f64,
}

/// Why a text is not a quantity.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum QuantityError {
    /// Nothing there.
    #[error("nothing is entered; accepted is {accepted}")]
    Empty {
        /// What would be accepted.
        accepted: String,
    },
    /// No number at the front.
    #[error("“{text}” does not begin with a number; accepted is {accepted}")]
    NoNumber {
        /// What was typed.
        text: String,
        /// What would be accepted.
        accepted: String,
    },
    /// Both signs are there: one of them would have to be a thousands separator.
    #[error("“{text}” has both comma and point; write one decimal sign and no separators, e.g. 1234.5")]
    Ambiguous {
        /// What was typed.
        text: String,
    },
    /// More than one decimal sign of a kind.
    #[error("“{text}” has more than one decimal sign; write one and no separators, e.g. 1234.5")]
    ManySigns {
        /// What was typed.
        text: String,
    },
    /// One comma with three digits behind it: a decimal sign here, a separator there.
    #[error("“{text}” may mean {decimal} or {thousands}; write one of these")]
    Thousands {
        /// What was typed.
        text: String,
        /// Read with a decimal comma.
        decimal: String,
        /// Read with a thousands separator.
        thousands: String,
    },
    /// A gauge outside the table.
    #[error("“{text}” is not a gauge known here; accepted is AWG 0 to AWG 40, or a section in mm²")]
    Gauge {
        /// What was typed.
        text: String,
    },
    /// A unit of another kind.
    #[error("{text} is {is}; accepted is {accepted}")]
    OtherKind {
        /// What was typed.
        text: String,
        /// What it measures.
        is: &'static str,
        /// What would be accepted.
        accepted: String,
    },
    /// A unit that is none.
    #[error("“{unit}” is not a unit known here; accepted is {accepted}")]
    UnknownUnit {
        /// The part behind the number.
        unit: String,
        /// What would be accepted.
        accepted: String,
    },
    /// The figure in parentheses is the smaller one.
    #[error(
        "“{text}” has a most below its typical value; accepted is the larger in parentheses, e.g. 10 (20)"
    )]
    MostBelowTypical {
        /// What was typed.
        text: String,
    },
    /// Three values that are not in order.
    #[error("“{text}” does not rise; accepted are least, typical and most, e.g. 120/150/180 mV")]
    Unordered {
        /// What was typed.
        text: String,
    },
    /// Not finite.
    #[error("{text} is too large a number")]
    TooLarge {
        /// What was typed.
        text: String,
    },
}

/// A short part of what was typed, for a message.
pub(crate) fn quoted(text: &str) -> String {
    let mut short: String = text.chars().filter(|c| !c.is_control()).take(24).collect();
    if text.chars().count() > 24 {
        short.push('…');
    }
    short
}

fn accepted(shown: &Shown) -> String {
    let noun = noun(shown.unit);
    match shown.unit {
        Unit::Section => "a section in mm² or AWG, e.g. 0.75 mm² or AWG 18".into(),
        // A bare number is in the field's own unit, so 0.8 in a field of percent is 0.8 %.
        Unit::Ratio if shown.text == "%" => "a percentage, e.g. 80 or 80 %".into(),
        Unit::Ratio => "a number or a percentage, e.g. 0.8 or 80 %".into(),
        Unit::Count => "a whole number, e.g. 2".into(),
        _ => format!("{noun} in {}", shown.text),
    }
}

fn prefixed(unit: &str, of: Unit) -> Option<f64> {
    if let Some((_, worth)) = spellings(of).iter().find(|(name, _)| *name == unit) {
        return Some(*worth);
    }
    if matches!(
        of,
        Unit::Celsius
            | Unit::Ratio
            | Unit::Count
            | Unit::Section
            | Unit::PerKelvin
            | Unit::SquareAmpereSecond
    ) {
        return None;
    }
    PREFIXES.iter().find_map(|(prefix, factor)| {
        let rest = unit.strip_prefix(prefix)?;
        let (_, worth) = spellings(of).iter().find(|(name, _)| *name == rest)?;
        Some(factor * worth)
    })
}

/// Splits a text into the number in front and what follows.
fn split(text: &str) -> Option<(f64, &str)> {
    let bytes = text.as_bytes();
    let mut end = 0;
    let mut digits = false;
    if matches!(bytes.first(), Some(b'+' | b'-')) {
        end = 1;
    }
    while end < bytes.len() && (bytes[end].is_ascii_digit() || bytes[end] == b'.') {
        digits |= bytes[end].is_ascii_digit();
        end += 1;
    }
    if !digits {
        return None;
    }
    // An exponent only where digits follow: 3e is 3 of something, not a number.
    if matches!(bytes.get(end), Some(b'e' | b'E')) {
        let mut k = end + 1;
        if matches!(bytes.get(k), Some(b'+' | b'-')) {
            k += 1;
        }
        let from = k;
        while k < bytes.len() && bytes[k].is_ascii_digit() {
            k += 1;
        }
        if k > from {
            end = k;
        }
    }
    let number = text[..end].parse().ok()?;
    Some((number, text[end..].trim()))
}

/// The text with plain spaces, a point as decimal sign and an ASCII minus.
fn plain(text: &str) -> Result<String, QuantityError> {
    let cleaned: String = text
        .trim()
        .chars()
        .map(|c| match c {
            '\u{a0}' | '\u{2009}' | '\u{202f}' | '\t' => ' ',
            '\u{2212}' | '–' => '-',
            c => c,
        })
        .collect();
    let (commas, points) = (cleaned.matches(',').count(), cleaned.matches('.').count());
    if commas > 0 && points > 0 {
        return Err(QuantityError::Ambiguous { text: quoted(text) });
    }
    if commas > 1 || points > 1 {
        return Err(QuantityError::ManySigns { text: quoted(text) });
    }
    if let Some((decimal, thousands)) = thousands(&cleaned) {
        return Err(QuantityError::Thousands { text: quoted(text), decimal, thousands });
    }
    Ok(cleaned.replace(',', "."))
}

/// Both readings of `2,800`; `None` where the comma can only be a decimal sign, as in `2,8` or `0,125`.
fn thousands(cleaned: &str) -> Option<(String, String)> {
    let (front, back) = cleaned.split_once(',')?;
    let whole = front.trim_start_matches(['+', '-']);
    let digits = back.bytes().take_while(u8::is_ascii_digit).count();
    let grouped = (1..=3).contains(&whole.len())
        && whole.bytes().all(|b| b.is_ascii_digit())
        && !whole.starts_with('0')
        && digits == 3;
    grouped.then(|| {
        let back = &back[..3];
        (format!("{front}.{back}"), format!("{front}{back}"))
    })
}

/// The value of a text in the base unit.
///
/// # Errors
/// A sentence that says what was typed and what would be accepted.
pub fn parse(text: &str, shown: &Shown) -> Result<f64, QuantityError> {
    let cleaned = plain(text)?;
    if cleaned.is_empty() {
        return Err(QuantityError::Empty { accepted: accepted(shown) });
    }
    if shown.unit == Unit::Section
        && let Some(area) = awg_text(&cleaned)
    {
        return Ok(area);
    }
    if shown.unit == Unit::Section && cleaned.to_ascii_lowercase().contains("awg") {
        return Err(QuantityError::Gauge { text: quoted(text) });
    }
    let Some((number, unit)) = split(&cleaned) else {
        return Err(QuantityError::NoNumber { text: quoted(text), accepted: accepted(shown) });
    };
    let unit = unit.strip_prefix(' ').unwrap_or(unit);
    let worth = if unit.is_empty() {
        shown.worth
    } else if let Some(worth) = prefixed(unit, shown.unit) {
        worth
    } else if let Some((_, factor)) = PREFIXES.iter().find(|(p, _)| *p == unit && shown.unit != Unit::Metre) {
        let whole = [Unit::Section, Unit::Celsius, Unit::Ratio, Unit::Count, Unit::SquareAmpereSecond];
        if whole.contains(&shown.unit) {
            return Err(other(&cleaned, unit, text, shown));
        }
        *factor
    } else {
        return Err(other(&cleaned, unit, text, shown));
    };
    let value = number * worth;
    if value.is_finite() { Ok(value) } else { Err(QuantityError::TooLarge { text: quoted(text) }) }
}

fn other(cleaned: &str, unit: &str, text: &str, shown: &Shown) -> QuantityError {
    let is = if cleaned.to_ascii_lowercase().contains("awg") {
        Some("a section")
    } else {
        UNITS.iter().find(|u| prefixed(unit, **u).is_some()).map(|u| noun(*u))
    };
    match is {
        Some(is) => QuantityError::OtherKind { text: quoted(text.trim()), is, accepted: accepted(shown) },
        None => QuantityError::UnknownUnit { unit: quoted(unit), accepted: accepted(shown) },
    }
}

/// `AWG 20` or `20 AWG`, as an area in mm²; gauges 0 to 40.
fn awg_text(text: &str) -> Option<f64> {
    let lower = text.to_ascii_lowercase();
    let rest = lower.strip_prefix("awg").or_else(|| lower.strip_suffix("awg"))?;
    let gauge: f64 = rest.trim().trim_start_matches('#').parse().ok()?;
    (0.0..=40.0).contains(&gauge).then(|| strikeline_core::wiring::awg_area_mm2(gauge))
}

/// A value with what it may be off by.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Toleranced {
    /// The value itself, in the base unit.
    pub typical: f64,
    /// The least.
    pub min: f64,
    /// The most.
    pub max: f64,
}

/// A value with its tolerance: `150 ± 30 mV`, `120/150/180 mV` (least, typical, most), `120…180 mV`, `120–180 mV`,
/// `10 ms ± 20 %`, `10 (20) ms`, or a value alone.
///
/// - `usual`: the fraction either way where the text gives none.
///
/// What stands in parentheses is the most, as data sheets print it; the least is then by `usual`.
///
/// # Errors
/// As [`parse`], for either part; a most below the typical value.
pub fn parse_toleranced(text: &str, shown: &Shown, usual: f64) -> Result<Toleranced, QuantityError> {
    let text = text.replace("+/-", "±").replace("+-", "±").replace("...", "…");
    if let Some((value, tolerance)) = text.split_once('±') {
        let (value, tolerance) = (value.trim(), tolerance.trim());
        if let Some(percent) = tolerance.strip_suffix('%') {
            let typical = parse(value, shown)?;
            let ratio = Shown { unit: Unit::Ratio, text: "%", worth: 0.01 };
            let part = parse(percent, &ratio)?.abs();
            return Ok(either_way(typical, typical.abs() * part));
        }
        // A unit behind the tolerance counts for both.
        let unit = plain(tolerance)?;
        let unit = split(&unit).map_or("", |(_, unit)| unit);
        let bare = split(&plain(value)?).is_some_and(|(_, unit)| unit.is_empty());
        let typical = if bare { parse(&format!("{value} {unit}"), shown)? } else { parse(value, shown)? };
        return Ok(either_way(typical, parse(tolerance, shown)?.abs()));
    }
    if let [least, typical, most] = text.split('/').map(str::trim).collect::<Vec<_>>()[..]
        && [least, typical, most].iter().all(|part| part.starts_with(|c: char| c.is_ascii_digit()))
    {
        // A unit behind the last counts for all three.
        let unit = plain(most)?;
        let unit = split(&unit).map_or("", |(_, unit)| unit);
        let read = |part: &str| {
            let bare = split(&plain(part)?).is_some_and(|(_, unit)| unit.is_empty());
            if bare { parse(&format!("{part} {unit}"), shown) } else { parse(part, shown) }
        };
        let (min, typical, max) = (read(least)?, read(typical)?, read(most)?);
        if min > typical || typical > max {
            return Err(QuantityError::Unordered { text: quoted(&text) });
        }
        return Ok(Toleranced { typical, min, max });
    }
    if let Some((typical, rest)) = text.split_once('(')
        && let Some((most, unit)) = rest.split_once(')')
    {
        // A unit behind the parentheses counts for both.
        let unit = unit.trim();
        let with_unit = |part: &str| -> Result<f64, QuantityError> {
            let bare = split(&plain(part)?).is_some_and(|(_, own)| own.is_empty());
            if bare { parse(&format!("{part} {unit}"), shown) } else { parse(part, shown) }
        };
        let (typical, most) = (with_unit(typical)?, with_unit(most)?);
        if most < typical {
            return Err(QuantityError::MostBelowTypical { text: quoted(&text) });
        }
        return Ok(Toleranced { typical, min: typical - typical.abs() * usual, max: most });
    }
    if let Some((low, high)) = text.split_once('…').or_else(|| dash(&text)) {
        let unit = plain(high)?;
        let unit = split(&unit).map_or("", |(_, unit)| unit);
        let bare = split(&plain(low)?).is_some_and(|(_, unit)| unit.is_empty());
        let a = if bare { parse(&format!("{low} {unit}"), shown)? } else { parse(low, shown)? };
        let b = parse(high, shown)?;
        return Ok(Toleranced { typical: 0.5 * (a + b), min: a.min(b), max: a.max(b) });
    }
    let typical = parse(&text, shown)?;
    Ok(either_way(typical, typical.abs() * usual))
}

/// The two ends of a range written with a dash; a minus sign is none: it leads a number or an exponent.
fn dash(text: &str) -> Option<(&str, &str)> {
    text.char_indices().find_map(|(at, c)| {
        let (low, high) = (&text[..at], &text[at + c.len_utf8()..]);
        let before = low.chars().next_back()?;
        let parts = match c {
            '–' => !low.trim().is_empty(),
            '-' => before.is_alphanumeric() && high.starts_with(|c: char| c.is_ascii_digit()),
            _ => false,
        };
        let exponent = matches!(before, 'e' | 'E');
        (parts && !exponent).then_some((low, high))
    })
}

fn either_way(typical: f64, by: f64) -> Toleranced {
    Toleranced { typical, min: typical - by, max: typical + by }
}

/// The shortest text in the field's own unit that reads back as the same number.
pub fn format(value: f64, shown: &Shown) -> String {
    for digits in 0..17 {
        let number = format!("{:.*e}", digits, value / shown.worth);
        if let Ok(n) = number.parse::<f64>()
            && n * shown.worth == value
        {
            let unit = if shown.text.is_empty() { String::new() } else { format!(" {}", shown.text) };
            return format!("{n}{unit}");
        }
    }
    // A bare ratio would be read in the field's own unit, which may be per cent.
    let unit = if shown.unit == Unit::Ratio { "×" } else { base(shown.unit) };
    if unit.is_empty() { value.to_string() } else { format!("{value} {unit}") }
}

fn base(unit: Unit) -> &'static str {
    spellings(unit)[0].0
}

#[cfg(test)]
mod tests {
    use super::*;

    const MILLIOHM: Shown = Shown { unit: Unit::Ohm, text: "mΩ", worth: 1e-3 };
    const VOLT: Shown = Shown { unit: Unit::Volt, text: "V", worth: 1.0 };
    const MILLIVOLT: Shown = Shown { unit: Unit::Volt, text: "mV", worth: 1e-3 };
    const CAPACITY: Shown = Shown { unit: Unit::AmpereHour, text: "Ah", worth: 1.0 };
    const SECTION: Shown = Shown { unit: Unit::Section, text: "mm²", worth: 1.0 };

    #[test]
    fn exact_what_people_type() {
        for (text, shown, want) in [
            ("2.8Ah", CAPACITY, 2.8),
            ("2800 mAh", CAPACITY, 2.8),
            ("45 mΩ", MILLIOHM, 0.045),
            ("45", MILLIOHM, 0.045),
            ("45mOhm", MILLIOHM, 0.045),
            ("150m", MILLIVOLT, 0.15),
            ("150m", VOLT, 0.15),
            ("3,3 V", VOLT, 3.3),
            ("3.3\u{a0}V", VOLT, 3.3),
            ("1e-3", VOLT, 1e-3),
            ("0,75mm2", SECTION, 0.75),
            ("0,125", VOLT, 0.125),
            ("1000,125", VOLT, 1000.125),
        ] {
            let got = parse(text, &shown).expect(text);
            assert!((got - want).abs() <= 1e-12 * want, "{text}: {got}");
        }
        // ASTM B258: AWG 18 has 0.823 mm².
        for text in ["AWG 18", "18 AWG", "awg18", "AWG#18"] {
            assert!((parse(text, &SECTION).expect(text) - 0.823).abs() < 5e-4, "{text}");
        }
    }

    #[test]
    fn exact_refusals_say_what_would_be_accepted() {
        let said = |text: &str, shown: &Shown| parse(text, shown).expect_err(text).to_string();
        assert_eq!(
            said("0.75 m", &SECTION),
            "0.75 m is a length; accepted is a section in mm² or AWG, e.g. 0.75 mm² or AWG 18"
        );
        assert_eq!(said("3.3 A", &VOLT), "3.3 A is a current; accepted is a voltage in V");
        assert!(said("1,234.5", &VOLT).contains("both comma and point"));
        assert_eq!(said("2,800 mAh", &CAPACITY), "“2,800 mAh” may mean 2.800 or 2800; write one of these");
        assert!(said("1.234.567", &VOLT).contains("more than one decimal sign"));
        assert!(said("AWG 50", &SECTION).contains("AWG 0 to AWG 40"));
        assert!(said("much", &VOLT).contains("does not begin with a number"));
        assert!(said("", &VOLT).contains("nothing is entered"));
        assert!(said("1e999", &VOLT).contains("too large"));
    }

    #[test]
    fn exact_tolerances() {
        for text in [
            "150 ± 30 mV",
            "150 mV ± 30 mV",
            "150 +/- 30",
            "150 mV ± 20 %",
            "120…180 mV",
            "150",
            "120–180 mV",
            "120 – 180 mV",
            "120-180mV",
            "0,12–0,18 V",
            "120 mV-180 mV",
            "150 (180) mV",
            "150 mV (180 mV)",
        ] {
            let t = parse_toleranced(text, &MILLIVOLT, 0.2).expect(text);
            let near = |a: f64, b: f64| (a - b).abs() < 1e-12;
            assert!(near(t.typical, 0.15) && near(t.min, 0.12) && near(t.max, 0.18), "{text}: {t:?}");
        }
    }

    #[test]
    fn exact_a_minus_sign_is_no_range() {
        for (text, want) in [("-150 mV", -0.15), ("–150 mV", -0.15), ("1.5e-1 V", 0.15), ("1.5e–1 V", 0.15)]
        {
            let t = parse_toleranced(text, &MILLIVOLT, 0.0).expect(text);
            assert!((t.typical - want).abs() < 1e-12 && t.min == t.max, "{text}: {t:?}");
        }
        let said =
            parse_toleranced("20 (10) mV", &MILLIVOLT, 0.2).expect_err("most below typical").to_string();
        assert!(said.contains("20 (10) mV") && said.contains("larger in parentheses"), "{said}");
    }

    /// A hint must itself be accepted: a bare 0.8 in a field of percent is 0.8 %, far from 80 %.
    #[test]
    fn exact_a_hint_for_percent_reads_as_it_says() {
        let percent = Shown { unit: Unit::Ratio, text: "%", worth: 0.01 };
        let said = parse("much", &percent).expect_err("no number").to_string();
        assert!(said.contains("e.g. 80 or 80 %"), "{said}");
        assert_eq!((parse("80", &percent), parse("80 %", &percent)), (Ok(0.8), Ok(0.8)));
    }

    #[test]
    fn law_a_formatted_number_reads_back_the_same() {
        let mut x: f64 = 0.123_456_789_012_345_68;
        for _ in 0..2000 {
            x = (x * 997.3).fract();
            for shown in [MILLIOHM, VOLT, CAPACITY] {
                let text = format(x, &shown);
                assert_eq!(parse(&text, &shown), Ok(x), "{text}");
            }
        }
        assert_eq!(format(0.045, &MILLIOHM), "45 mΩ");
    }

    #[test]
    fn exact_three_values_as_data_sheets_print_them() {
        let read = |text: &str| parse_toleranced(text, &MILLIOHM, 0.1);
        let close = |t: Toleranced, want: [f64; 3]| {
            [t.min, t.typical, t.max].iter().zip(want).all(|(got, want)| (got - want).abs() < 1e-15)
        };
        for text in ["12.5/18/23 mΩ", "12,5 / 18 / 23", "12.5m/0.018 Ω/23 mΩ"] {
            assert!(close(read(text).expect(text), [12.5e-3, 18e-3, 23e-3]), "{text}: {:?}", read(text));
        }
        assert_eq!(read("18/12/23"), Err(QuantityError::Unordered { text: "18/12/23".into() }));
        assert!(read("12/18").is_err() && read("12//18").is_err() && read("1/2/3 V").is_err());
    }
}
