//! Charts as SVG text, from plain series. Colours and type come from the page's style.

use crate::number::fixed;

/// One line of a chart.
#[derive(Debug, Clone, PartialEq)]
pub struct Line {
    /// Written at its end, and in the reading.
    pub name: String,
    /// Class that colours it: `volt`, `amp`, `soft` or `near`.
    pub class: &'static str,
    /// Values, one per place; NaN where there is none.
    pub values: Vec<f64>,
}

/// A level across a chart.
#[derive(Debug, Clone, PartialEq)]
pub struct Level {
    /// Written beside it.
    pub name: String,
    /// Where.
    pub value: f64,
}

/// A chart of lines over common places.
#[derive(Debug, Clone)]
pub struct Chart {
    /// Name, unique on the page.
    pub id: &'static str,
    /// A sentence for those who do not see it.
    pub summary: String,
    /// Places, rising; above 0 where `log`.
    pub x: Vec<f64>,
    /// Whether places are spaced by their logarithm.
    pub log: bool,
    /// How a place is written, in a reading.
    pub x_text: fn(f64) -> String,
    /// What the places are, under the axis.
    pub x_label: &'static str,
    /// Unit of the values.
    pub unit: &'static str,
    /// The lines.
    pub lines: Vec<Line>,
    /// Levels across.
    pub levels: Vec<Level>,
    /// Values outside are cut off.
    pub limit: Option<(f64, f64)>,
}

/// Where a chart's frame stands, in px.
pub const LEFT: f64 = 46.0;
/// Space at the right.
pub const RIGHT: f64 = 10.0;
const TOP: f64 = 12.0;
const BOTTOM: f64 = 40.0;

/// Round steps for an axis: at most `most` of them from `low` to `high`.
pub fn ticks(low: f64, high: f64, most: usize) -> Vec<f64> {
    let span = high - low;
    if !(span > 0.0 && span.is_finite()) || most == 0 {
        return vec![low];
    }
    let raw = span / most as f64;
    let mut unit = 1.0;
    while unit * 10.0 <= raw {
        unit *= 10.0;
    }
    while unit > raw {
        unit /= 10.0;
    }
    let step = [1.0, 2.0, 5.0, 10.0].into_iter().map(|k| k * unit).find(|s| *s >= raw).unwrap_or(10.0 * unit);
    let first = (low / step).ceil();
    (0..=most).map(|k| (first + k as f64) * step).filter(|t| *t <= high + 1e-9 * span).collect()
}

impl Chart {
    fn range(&self) -> (f64, f64) {
        let values = self.lines.iter().flat_map(|l| l.values.iter().copied()).filter(|v| v.is_finite());
        let values = values.chain(self.levels.iter().map(|l| l.value));
        let (mut low, mut high) =
            values.fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), v| (a.min(v), b.max(v)));
        if let Some((least, most)) = self.limit {
            (low, high) = (low.max(least), high.min(most));
        }
        if !(low.is_finite() && high.is_finite()) {
            return (0.0, 1.0);
        }
        if low >= high {
            (low, high) = (low - 0.5, low + 0.5);
        }
        let room = 0.06 * (high - low);
        (low - room, high + room)
    }

    fn place(&self, x: f64, width: f64) -> f64 {
        let (first, last) = (self.x.first().copied().unwrap_or(0.0), self.x.last().copied().unwrap_or(1.0));
        let part = if self.log {
            let ln = strikeline_core::math::ln;
            (ln(x.max(first)) - ln(first)) / (ln(last) - ln(first)).max(1e-9)
        } else {
            (x - first) / (last - first).max(1e-9)
        };
        LEFT + part.clamp(0.0, 1.0) * (width - LEFT - RIGHT)
    }

    /// The index of the place nearest to a horizontal position, in px.
    pub fn nearest(&self, px: f64, width: f64) -> usize {
        let distance = |k: &usize| (self.place(self.x[*k], width) - px).abs();
        (0..self.x.len()).min_by(|a, b| distance(a).total_cmp(&distance(b))).unwrap_or(0)
    }

    /// Where a place stands, in px.
    pub fn position(&self, index: usize, width: f64) -> f64 {
        self.place(self.x.get(index).copied().unwrap_or(0.0), width)
    }

    /// What stands at a place, in words.
    pub fn reading(&self, index: usize) -> String {
        let mut text = (self.x_text)(self.x.get(index).copied().unwrap_or(0.0));
        for line in &self.lines {
            if let Some(v) = line.values.get(index).filter(|v| v.is_finite()) {
                text += &format!(
                    " · {} {} {}",
                    line.name,
                    fixed(*v, if v.abs() < 10.0 { 3 } else { 1 }),
                    self.unit
                );
            }
        }
        text
    }

    /// The chart, `width` by `height` px.
    pub fn svg(&self, width: f64, height: f64) -> String {
        let (low, high) = self.range();
        let y = |v: f64| TOP + (high - v) / (high - low) * (height - TOP - BOTTOM);
        let mut out = format!(
            "<svg class=\"chart\" id=\"{}\" width=\"{width}\" height=\"{height}\" viewBox=\"0 0 {width} {height}\" role=\"img\" tabindex=\"0\" aria-label=\"{}\">",
            self.id,
            crate::number::escaped(&self.summary)
        );
        let steps = ticks(low, high, 5);
        let digits = if steps.len() > 1 && (steps[1] - steps[0]) < 0.099 {
            2
        } else if steps.len() > 1 && steps[1] - steps[0] < 0.99 {
            1
        } else {
            0
        };
        for step in &steps {
            let at = fixed(y(*step), 1).replace('−', "-");
            out += &format!("<path class=\"grid\" d=\"M{LEFT} {at}H{}\"/>", width - RIGHT);
            out += &format!(
                "<text class=\"axis\" x=\"{}\" y=\"{at}\" dy=\"4\" text-anchor=\"end\">{}</text>",
                LEFT - 6.0,
                fixed(*step, digits)
            );
        }
        out += &format!(
            "<text class=\"axis\" x=\"{}\" y=\"{}\" text-anchor=\"end\">{}</text>",
            LEFT - 6.0,
            height - BOTTOM + 16.0,
            self.unit
        );
        for (x, text) in self.x_ticks(width) {
            out += &format!(
                "<text class=\"axis\" x=\"{x:.1}\" y=\"{}\" text-anchor=\"middle\">{text}</text>",
                height - BOTTOM + 16.0
            );
        }
        out += &format!(
            "<text class=\"axis\" x=\"{}\" y=\"{}\" text-anchor=\"end\">{}</text>",
            width - RIGHT,
            height - 6.0,
            self.x_label
        );
        let mut taken: Vec<f64> = Vec::new();
        for level in &self.levels {
            if level.value < low || level.value > high {
                continue;
            }
            let at = y(level.value);
            out += &format!("<path class=\"level\" d=\"M{LEFT} {at:.1}H{}\"/>", width - RIGHT);
            let text_at = free(&mut taken, at - 5.0);
            out += &format!(
                "<text class=\"levelname\" x=\"{}\" y=\"{text_at:.1}\">{}</text>",
                LEFT + 4.0,
                level.name
            );
        }
        let mut ends: Vec<f64> = Vec::new();
        for line in &self.lines {
            let mut path = String::new();
            let mut pen = 'M';
            for (x, v) in self.x.iter().zip(&line.values) {
                if v.is_finite() {
                    let at = y(v.clamp(low, high));
                    path += &format!("{pen}{:.1} {at:.1}", self.place(*x, width));
                    pen = 'L';
                } else {
                    pen = 'M';
                }
            }
            out += &format!("<path class=\"line {}\" d=\"{path}\"/>", line.class);
            if let Some(last) = line.values.iter().rev().find(|v| v.is_finite()) {
                let at = free(&mut ends, y(last.clamp(low, high)) - 6.0);
                out += &format!(
                    "<text class=\"name {}\" x=\"{}\" y=\"{at:.1}\" text-anchor=\"end\">{}</text>",
                    line.class,
                    width - RIGHT - 2.0,
                    line.name
                );
            }
        }
        out += &format!(
            "<path class=\"cursor\" d=\"M0 {TOP}V{}\" visibility=\"hidden\"/></svg>",
            height - BOTTOM
        );
        out
    }

    fn x_ticks(&self, width: f64) -> Vec<(f64, String)> {
        let (first, last) = (self.x.first().copied().unwrap_or(0.0), self.x.last().copied().unwrap_or(1.0));
        if self.log {
            let wide = width > 520.0;
            return [
                (1e-6, "1 µs"),
                (1e-5, "10 µs"),
                (1e-4, "0.1 ms"),
                (1e-3, "1 ms"),
                (1e-2, "10 ms"),
                (0.1, "0.1 s"),
                (1.0, "1 s"),
                (10.0, "10 s"),
                (100.0, "100 s"),
                (1000.0, "1000 s"),
            ]
            .into_iter()
            .enumerate()
            .filter(|(k, (t, _))| *t >= first * 0.999 && *t <= last * 1.001 && (wide || k % 2 == 1))
            .map(|(_, (t, text))| (self.place(t, width), text.to_string()))
            .filter(|(x, _)| *x < width - RIGHT - 14.0)
            .collect();
        }
        ticks(first, last, if width > 520.0 { 8 } else { 4 })
            .into_iter()
            .map(|t| (self.place(t, width), fixed(t, 0)))
            .collect()
    }
}

/// A height for a label near `wanted` that keeps clear of those taken.
fn free(taken: &mut Vec<f64>, wanted: f64) -> f64 {
    let mut at = wanted.max(TOP + 4.0);
    for _ in 0..6 {
        match taken.iter().find(|t| (**t - at).abs() < 14.0) {
            Some(t) => at = t + 15.0,
            None => break,
        }
    }
    taken.push(at);
    at
}

/// One row of the staircase.
#[derive(Debug, Clone, PartialEq)]
pub struct Stair {
    /// What takes it.
    pub name: String,
    /// Voltage before and after.
    pub from: f64,
    /// Voltage after.
    pub to: f64,
}

/// The staircase: a row for each part that takes voltage, from the open circuit down to the load.
///
/// - `marks`: (name, voltage) of the levels to reach.
pub fn staircase(
    open_circuit: f64,
    stairs: &[Stair],
    load: f64,
    marks: &[(&str, f64)],
    width: f64,
    summary: &str,
) -> String {
    const ROW: f64 = 30.0;
    let label = if width > 520.0 { 170.0 } else { 118.0 };
    let low = marks.iter().map(|m| m.1).fold(load, f64::min) - 0.06;
    let high = open_circuit + 0.02;
    let x = |v: f64| label + (v - low) / (high - low).max(1e-6) * (width - label - 66.0);
    let rows = stairs.len() + 2;
    let height = ROW * rows as f64 + 26.0;
    let mut out = format!(
        "<svg class=\"chart stairs\" width=\"{width}\" height=\"{height}\" viewBox=\"0 0 {width} {height}\" role=\"img\" aria-label=\"{}\">",
        crate::number::escaped(summary)
    );
    for (k, (name, v)) in marks.iter().enumerate() {
        let anchor = if x(*v) > width - 120.0 {
            "end"
        } else if k % 2 == 0 {
            "start"
        } else {
            "end"
        };
        out += &format!("<path class=\"level\" d=\"M{:.1} 4V{}\"/>", x(*v), height - 22.0);
        let shift = if anchor == "start" { 3.0 } else { -3.0 };
        out += &format!(
            "<text class=\"levelname\" x=\"{:.1}\" y=\"{}\" text-anchor=\"{anchor}\">{name} {}</text>",
            x(*v) + shift,
            height - 8.0,
            crate::number::volts(*v)
        );
    }
    let mut row = |k: usize, name: &str, from: f64, to: f64, value: &str, class: &str| {
        let top = ROW * k as f64 + 6.0;
        let (a, b) = (x(to.min(from)), x(to.max(from)));
        out += &format!(
            "<text class=\"stairname\" x=\"0\" y=\"{}\">{}</text>",
            top + 14.0,
            crate::number::escaped(name)
        );
        out += &format!(
            "<rect class=\"{class}\" x=\"{a:.1}\" y=\"{top}\" width=\"{:.1}\" height=\"18\" rx=\"2\"/>",
            (b - a).max(2.0)
        );
        out += &format!(
            "<text class=\"stairvalue\" x=\"{}\" y=\"{}\" text-anchor=\"end\">{value}</text>",
            width,
            top + 14.0
        );
    };
    row(0, "Open circuit", low, open_circuit, &crate::number::volts(open_circuit), "whole");
    for (k, stair) in stairs.iter().enumerate() {
        let value = format!("{} mV", fixed((stair.to - stair.from) * 1e3, 0));
        row(k + 1, &stair.name, stair.from, stair.to, &value, "step");
    }
    row(rows - 1, "At the load", low, load, &crate::number::volts(load), "whole");
    out + "</svg>"
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn exact_ticks_are_round() {
        let near =
            |a: Vec<f64>, b: &[f64]| a.len() == b.len() && a.iter().zip(b).all(|(x, y)| (x - y).abs() < 1e-9);
        assert!(near(ticks(3.01, 4.2, 5), &[3.5, 4.0]));
        assert!(near(ticks(0.0, 100.0, 5), &[0.0, 20.0, 40.0, 60.0, 80.0, 100.0]));
        assert_eq!(ticks(1.0, 1.0, 5), [1.0]);
    }

    #[test]
    fn law_a_chart_of_anything_is_finite_markup() {
        for values in [vec![], vec![1.0], vec![f64::NAN, 2.0], vec![1.0, 1.0], vec![1e9, -1e9]] {
            let chart = Chart {
                id: "c",
                summary: "<x>".into(),
                x: (1..=values.len()).map(|k| k as f64).collect(),
                log: false,
                x_text: |x| format!("{x}"),
                x_label: "",
                unit: "V",
                lines: vec![Line { name: "a".into(), class: "volt", values }],
                levels: vec![],
                limit: None,
            };
            let svg = chart.svg(360.0, 200.0);
            assert!(!svg.contains("NaN") && !svg.contains("inf") && !svg.contains("<x>"), "{svg}");
        }
    }
}
