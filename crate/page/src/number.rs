//! Numbers with their unit and sensible digits, and text made safe for markup.

/// A number with `digits` decimals and a true minus sign.
pub fn fixed(value: f64, digits: usize) -> String {
    let text = format!("{value:.digits$}");
    // No −0.00.
    let text = if text.trim_start_matches(['-', '0', '.']).is_empty() { text.replace('-', "") } else { text };
    text.replace('-', "−")
}

/// A voltage in V, to 10 mV.
pub fn volts(v: f64) -> String {
    format!("{} V", fixed(v, 2))
}

/// A current in A, with two or three significant digits.
pub fn amps(i: f64) -> String {
    let size = i.abs();
    if size >= 20.0 {
        format!("{} A", fixed(i, 0))
    } else if size >= 0.1 {
        format!("{} A", fixed(i, if size >= 10.0 { 1 } else { 2 }))
    } else {
        format!("{} mA", fixed(i * 1e3, 1))
    }
}

/// A time, in the unit that suits it.
pub fn time(s: f64) -> String {
    let digits = |x: f64| {
        if x >= 99.5 {
            0
        } else if x >= 9.95 {
            1
        } else {
            2
        }
    };
    if s == 0.0 {
        "0 s".into()
    } else if s < 0.999_5e-3 {
        format!("{} µs", fixed(s * 1e6, digits(s * 1e6)))
    } else if s < 0.999_5 {
        format!("{} ms", fixed(s * 1e3, digits(s * 1e3)))
    } else if s < 600.0 {
        format!("{} s", fixed(s, digits(s)))
    } else if s < 7200.0 {
        format!("{} min", fixed(s / 60.0, 0))
    } else {
        format!("{} h", fixed(s / 3600.0, 1))
    }
}

/// A temperature, such as `20 °C`.
pub fn degrees(t: f64) -> String {
    format!("{} °C", fixed(t, 0))
}

/// A share as a whole percentage.
pub fn percent(x: f64) -> String {
    if x > 0.0 && x < 0.005 { "under 1 %".into() } else { format!("{} %", fixed(100.0 * x, 0)) }
}

/// Text as it may stand in markup.
pub fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\'' => out.push_str("&#39;"),
            c => out.push(c),
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn exact_numbers_as_they_are_read() {
        assert_eq!(volts(3.3049), "3.30 V");
        assert_eq!(
            (amps(2.684), amps(37.2), amps(0.0042)),
            ("2.68 A".into(), "37 A".into(), "4.2 mA".into())
        );
        assert_eq!(
            (time(8.04e-3), time(14.2e-6), time(4.0)),
            ("8.04 ms".into(), "14.2 µs".into(), "4.00 s".into())
        );
        assert_eq!(fixed(-0.001, 2), "0.00");
        assert_eq!(escaped("<b a='1'>"), "&lt;b a=&#39;1&#39;&gt;");
    }
}
