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
    /// Whether values are spaced by their logarithm; below the least they are cut off.
    pub log_values: Option<f64>,
    /// Whether the levels are named at the left; else at the right.
    pub named_left: bool,
    /// What happens where, written along the top.
    pub marks: Vec<(f64, String)>,
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
        if let Some(least) = self.log_values {
            low = low.max(least);
            high = high.max(2.0 * low);
            return if low.is_finite() && high.is_finite() {
                (low / 1.3, high * 1.3)
            } else {
                (least, 10.0 * least)
            };
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

    /// Where a value stands, in px from the top.
    fn height_of(&self, v: f64, frame: (f64, f64), top: f64, height: f64) -> f64 {
        let (low, high) = frame;
        let v = v.clamp(low, high);
        let part = if self.log_values.is_some() {
            let ln = strikeline_core::math::ln;
            (ln(high) - ln(v)) / (ln(high) - ln(low))
        } else {
            (high - v) / (high - low)
        };
        top + part * (height - top - BOTTOM)
    }

    /// The values that the axis names.
    fn value_ticks(&self, frame: (f64, f64)) -> Vec<(f64, String)> {
        let (low, high) = frame;
        if self.log_values.is_some() {
            let mut out = Vec::new();
            let mut decade = 1e-6;
            while decade < high {
                for step in [1.0, 3.0] {
                    let v = step * decade;
                    if v >= low && v <= high {
                        let digits = if v < 0.095 {
                            2
                        } else if v < 0.95 {
                            1
                        } else {
                            0
                        };
                        out.push((v, fixed(v, digits)));
                    }
                }
                decade *= 10.0;
            }
            return out;
        }
        let steps = ticks(low, high, 5);
        let step = if steps.len() > 1 { steps[1] - steps[0] } else { 1.0 };
        let digits = if step < 0.099 { 2 } else { usize::from(step < 0.99) };
        steps.into_iter().map(|v| (v, fixed(v, digits))).collect()
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
        let frame = self.range();
        let (low, high) = frame;
        let marks = self.mark_rows(width);
        let top = TOP + 16.0 * marks.iter().map(|m| m.2 + 1).max().unwrap_or(0) as f64;
        let y = |v: f64| self.height_of(v, frame, top, height);
        let mut out = format!(
            "<svg class=\"chart\" id=\"{}\" width=\"{width}\" height=\"{height}\" viewBox=\"0 0 {width} {height}\" role=\"img\" tabindex=\"0\" aria-label=\"{}\">",
            self.id,
            crate::number::escaped(&self.summary)
        );
        for (v, text) in self.value_ticks(frame) {
            let at = y(v);
            out += &format!("<path class=\"grid\" d=\"M{LEFT} {at:.1}H{}\"/>", width - RIGHT);
            out += &format!(
                "<text class=\"axis\" x=\"{}\" y=\"{at:.1}\" dy=\"4\" text-anchor=\"end\">{text}</text>",
                LEFT - 6.0
            );
        }
        let foot = height - BOTTOM + 16.0;
        out += &format!(
            "<text class=\"axis\" x=\"{}\" y=\"{foot}\" text-anchor=\"end\">{}</text>",
            LEFT - 6.0,
            self.unit
        );
        for (x, text) in self.x_ticks(width) {
            // At the ends of the axis inside of it.
            let (x, anchor) = if x < LEFT + 6.0 {
                (LEFT + 1.0, "start")
            } else if x > width - RIGHT - 14.0 {
                (width - RIGHT, "end")
            } else {
                (x, "middle")
            };
            out += &format!(
                "<text class=\"axis\" x=\"{x:.1}\" y=\"{foot}\" text-anchor=\"{anchor}\">{text}</text>"
            );
        }
        out += &format!(
            "<text class=\"axis\" x=\"{}\" y=\"{}\" text-anchor=\"end\">{}</text>",
            width - RIGHT,
            height - 6.0,
            self.x_label
        );
        for (x, text, row) in &marks {
            let at = TOP + 16.0 * *row as f64 + 2.0;
            out += &format!("<path class=\"mark\" d=\"M{x:.1} {:.1}V{}\"/>", at + 3.0, height - BOTTOM);
            let (anchor, shift) = if *x > width - 90.0 { ("end", -3.0) } else { ("start", 3.0) };
            out += &format!(
                "<text class=\"markname\" x=\"{:.1}\" y=\"{at:.1}\" text-anchor=\"{anchor}\">{text}</text>",
                x + shift
            );
        }
        let mut levels: Vec<&Level> =
            self.levels.iter().filter(|l| l.value >= low && l.value <= high).collect();
        levels.sort_by(|a, b| b.value.total_cmp(&a.value));
        let mut above = f64::NEG_INFINITY;
        for level in levels {
            let at = y(level.value);
            out += &format!("<path class=\"level\" d=\"M{LEFT} {at:.1}H{}\"/>", width - RIGHT);
            // Close under another level the name goes below its own line.
            let text_at = if at - above < 20.0 { at + 14.0 } else { at - 5.0 };
            above = at;
            let (x, anchor) =
                if self.named_left { (LEFT + 4.0, "start") } else { (width - RIGHT - 2.0, "end") };
            out += &format!(
                "<text class=\"levelname\" x=\"{x}\" y=\"{text_at:.1}\" text-anchor=\"{anchor}\">{}</text>",
                level.name
            );
        }
        for line in &self.lines {
            let mut path = String::new();
            let mut pen = 'M';
            for (x, v) in self.x.iter().zip(&line.values) {
                if v.is_finite() {
                    path += &format!("{pen}{:.1} {:.1}", self.place(*x, width), y(*v));
                    pen = 'L';
                } else {
                    pen = 'M';
                }
            }
            out += &format!("<path class=\"line {}\" d=\"{path}\"/>", line.class);
        }
        out += &self.line_names(width, y);
        out += &format!(
            "<path class=\"cursor\" d=\"M0 {top}V{}\" visibility=\"hidden\"/></svg>",
            height - BOTTOM
        );
        out
    }

    /// The lines' names, at a place where their lines are furthest apart: the first above its line, the
    /// others below theirs.
    fn line_names(&self, width: f64, y: impl Fn(f64) -> f64) -> String {
        let n = self.x.len();
        if n == 0 {
            return String::new();
        }
        let heights = |k: usize| -> Vec<f64> {
            self.lines
                .iter()
                .filter_map(|l| l.values.get(k).filter(|v| v.is_finite()).map(|v| y(*v)))
                .collect()
        };
        let apart = |k: usize| {
            let mut h = heights(k);
            h.sort_by(f64::total_cmp);
            let lines = h.windows(2).map(|w| w[1] - w[0]).fold(60.0, f64::min);
            // A level's own name stands at its line.
            let levels = self
                .levels
                .iter()
                .flat_map(|l| h.iter().map(|at| (at - y(l.value)).abs()).collect::<Vec<_>>());
            let gap = levels.fold(lines, f64::min);
            // A name wants room at its side, all lines, and the middle rather than an end.
            let x = self.place(self.x[k], width);
            let inside = x > LEFT + 30.0 && x < width - RIGHT - 90.0;
            if h.len() == self.lines.len() && inside { gap } else { -1.0 }
        };
        let best = (0..n).max_by(|a, b| apart(*a).total_cmp(&apart(*b))).unwrap_or(0);
        let mut order: Vec<(f64, &Line)> = self
            .lines
            .iter()
            .filter_map(|l| l.values.get(best).filter(|v| v.is_finite()).map(|v| (y(*v), l)))
            .collect();
        order.sort_by(|a, b| a.0.total_cmp(&b.0));
        let x = self.place(self.x[best], width);
        let mut taken = f64::NEG_INFINITY;
        let mut out = String::new();
        for (k, (at, line)) in order.iter().enumerate() {
            let wanted = if k == 0 { at - 7.0 } else { at + 16.0 };
            let text_at = wanted.max(taken + 14.0);
            taken = text_at;
            out += &format!(
                "<text class=\"name {}\" x=\"{x:.1}\" y=\"{text_at:.1}\">{}</text>",
                line.class, line.name
            );
        }
        out
    }

    /// The marks with the row in which each one's name has room; those that would take a fourth are left out.
    fn mark_rows(&self, width: f64) -> Vec<(f64, &str, usize)> {
        let mut ends: Vec<f64> = Vec::new();
        let mut out = Vec::new();
        for (place, text) in &self.marks {
            let x = self.place(*place, width);
            let row = (0..ends.len()).find(|r| ends[*r] < x).unwrap_or(ends.len());
            if row < 3 {
                // Seven px a letter is what the type takes at most.
                let end = x + 10.0 + 7.0 * text.chars().count() as f64;
                if row == ends.len() {
                    ends.push(end);
                } else {
                    ends[row] = end;
                }
                out.push((x, text.as_str(), row));
            }
        }
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
            .filter(|(x, _)| *x > LEFT + 18.0 && *x < width - RIGHT - 14.0)
            .collect();
        }
        ticks(first, last, if width > 520.0 { 8 } else { 4 })
            .into_iter()
            .map(|t| (self.place(t, width), fixed(t, 0)))
            .collect()
    }
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
    const AXIS: f64 = 18.0;
    let label = if width > 520.0 { 170.0 } else { 118.0 };
    let low = marks.iter().map(|m| m.1).fold(load, f64::min) - 0.06;
    let high = open_circuit + 0.02;
    let x = |v: f64| label + (v - low) / (high - low).max(1e-6) * (width - label - 66.0);
    let rows = stairs.len() + 2;
    let height = ROW * rows as f64 + 26.0 + AXIS;
    let mut out = format!(
        "<svg class=\"chart stairs\" width=\"{width}\" height=\"{height}\" viewBox=\"0 0 {width} {height}\" role=\"img\" aria-label=\"{}\">",
        crate::number::escaped(summary)
    );
    for v in ticks(low, high, if width > 520.0 { 7 } else { 3 }) {
        out += &format!("<path class=\"grid\" d=\"M{:.1} {AXIS}V{}\"/>", x(v), height - 22.0);
        out += &format!(
            "<text class=\"axis\" x=\"{:.1}\" y=\"12\" text-anchor=\"middle\">{}</text>",
            x(v),
            crate::number::volts(v)
        );
    }
    for (k, (name, v)) in marks.iter().enumerate() {
        let anchor = if x(*v) > width - 120.0 {
            "end"
        } else if k % 2 == 0 {
            "start"
        } else {
            "end"
        };
        out += &format!("<path class=\"level\" d=\"M{:.1} {AXIS}V{}\"/>", x(*v), height - 22.0);
        let shift = if anchor == "start" { 3.0 } else { -3.0 };
        out += &format!(
            "<text class=\"levelname\" x=\"{:.1}\" y=\"{}\" text-anchor=\"{anchor}\">{name} {}</text>",
            x(*v) + shift,
            height - 8.0,
            crate::number::volts(*v)
        );
    }
    let mut row = |k: usize, name: &str, from: f64, to: f64, value: &str, class: &str| {
        let top = ROW * k as f64 + 6.0 + AXIS;
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
                log_values: None,
                named_left: true,
                marks: vec![(1.0, "lit".into())],
            };
            let svg = chart.svg(360.0, 200.0);
            assert!(!svg.contains("NaN") && !svg.contains("inf") && !svg.contains("<x>"), "{svg}");
        }
    }
}
