//! The time–current diagram, log–log, and what it says in words.

use strikeline_core::math::{ln, powf};
use strikeline_core::ratings::LeadRating;
use strikeline_core::setup::Setup;
use strikeline_core::time_current::{ADIABATIC_UP_TO, AtCurrent, Diagram, Opener, fuse_times};
use strikeline_core::units::Amps;
use strikeline_core::wiring;

use crate::number::{amps, escaped, time};
use crate::sentences;

/// Where the frame stands, in px.
const LEFT: f64 = 62.0;
const RIGHT: f64 = 12.0;
const TOP: f64 = 14.0;
const BOTTOM: f64 = 42.0;
/// Shortest and longest time shown, in s.
const TIMES: (f64, f64) = (1e-6, 1e3);

fn opener(setup: &Setup, what: Opener) -> String {
    match what {
        Opener::Stage(limit) => sentences::limit(setup, limit),
        Opener::Fuse => "the fuse".into(),
    }
}

/// A decade of time.
fn tick(t: f64) -> String {
    let (scale, unit) = if t < 0.9e-3 {
        (1e6, "µs")
    } else if t < 0.9 {
        (1e3, "ms")
    } else {
        (1.0, "s")
    };
    format!("{:.0} {unit}", t * scale)
}

struct Frame {
    width: f64,
    height: f64,
    currents: (f64, f64),
}

impl Frame {
    fn x(&self, i: f64) -> f64 {
        let (low, high) = self.currents;
        let part = ln(i.clamp(low, high) / low) / ln(high / low);
        LEFT + part * (self.width - LEFT - RIGHT)
    }

    fn y(&self, t: f64) -> f64 {
        let (low, high) = TIMES;
        let part = ln(high / t.clamp(low, high)) / ln(high / low);
        TOP + part * (self.height - TOP - BOTTOM)
    }

    fn path(&self, points: &[(f64, f64)]) -> String {
        points
            .iter()
            .enumerate()
            .map(|(k, (i, t))| {
                format!("{}{:.1} {:.1}", if k == 0 { 'M' } else { 'L' }, self.x(*i), self.y(*t))
            })
            .collect()
    }
}

/// Names beside lines, each moved down until it covers none before it.
struct Names(Vec<(f64, f64, f64)>, String, f64);

impl Names {
    fn put(&mut self, x: f64, y: f64, class: &str, text: &str, end: bool) {
        let wide = 7.2 * text.chars().count() as f64;
        // What would leave the frame at the right ends there.
        let (x, end) = if !end && x + wide > self.2 { (self.2, true) } else { (x, end) };
        let left = if end { x - wide } else { x };
        let mut y = y;
        while self.0.iter().any(|(l, r, at)| left < *r && left + wide > *l && (y - at).abs() < 15.0) {
            y += 15.0;
        }
        self.0.push((left, left + wide, y));
        self.1 += &format!(
            "<text class=\"name {class}\" x=\"{x:.1}\" y=\"{y:.1}\" text-anchor=\"{}\">{}</text>",
            if end { "end" } else { "start" },
            escaped(text)
        );
    }
}

/// The diagram, `width` px wide.
pub fn svg(setup: &Setup, d: &Diagram, width: f64) -> String {
    let most = d.prospective[0].current.0.max(d.draw.0 * 4.0) * 1.6;
    let peak = d.envelope.last().map_or(0.0, |p| p.0.0);
    let least = (d.draw.0 * 0.3).min(most * 0.05).max(most * 1e-4);
    let f =
        Frame { width, height: (0.62 * width).clamp(300.0, 460.0), currents: (least, most.max(peak * 1.2)) };
    let (low, high) = f.currents;
    let foot = f.height - BOTTOM;
    let mut out = format!(
        "<svg class=\"chart tc\" id=\"time-current\" width=\"{width}\" height=\"{h}\" viewBox=\"0 0 {width} {h}\" role=\"img\" aria-label=\"{}\">",
        "Time over current, both logarithmic: what opens when. The same is said in words below.",
        h = f.height
    );
    let mut decade = TIMES.0;
    while decade <= TIMES.1 * 1.01 {
        let y = f.y(decade);
        out += &format!(
            "<path class=\"grid\" d=\"M{LEFT} {y:.1}H{:.1}\"/><text class=\"axis\" x=\"{}\" y=\"{y:.1}\" dy=\"4\" text-anchor=\"end\">{}</text>",
            width - RIGHT,
            LEFT - 6.0,
            tick(decade)
        );
        decade *= 10.0;
    }
    let mut decade = 1e-3;
    while decade < high {
        for step in [1.0, 2.0, 5.0] {
            let i = decade * step;
            if i > low && i < high {
                out += &format!(
                    "<path class=\"grid\" d=\"M{x:.1} {TOP}V{foot}\"/><text class=\"axis\" x=\"{x:.1}\" y=\"{}\" text-anchor=\"middle\">{}</text>",
                    foot + 16.0,
                    if i >= 1.0 { format!("{i:.0}") } else { format!("{i}") },
                    x = f.x(i)
                );
            }
        }
        decade *= 10.0;
    }
    out += &format!(
        "<text class=\"axis\" x=\"{}\" y=\"{}\" text-anchor=\"end\">current, A</text>",
        width - RIGHT,
        f.height - 6.0
    );
    let mut names = Names(Vec::new(), String::new(), width - RIGHT);
    for stage in &d.stages {
        let Some(from) = stage.low else { continue };
        let sure = stage.high.map_or(high, |i| i.0);
        let (quick, slow) = (stage.delay.low.max(TIMES.0), stage.delay.high.max(TIMES.0));
        let band =
            [(from.0, TIMES.1), (from.0, quick), (high, quick), (high, slow), (sure, slow), (sure, TIMES.1)];
        out += &format!("<path class=\"band\" d=\"{}Z\"/>", f.path(&band));
        if let Some(typical) = stage.typical {
            let line = [(typical.0, TIMES.1), (typical.0, stage.delay.typical), (high, stage.delay.typical)];
            out += &format!("<path class=\"line near\" d=\"{}\"/>", f.path(&line));
        }
        names.put(
            f.x(high) - 4.0,
            f.y(slow) - 5.0,
            "near",
            &sentences::capital(&sentences::limit(setup, stage.limit)),
            true,
        );
    }
    if let Some(fuse) = &d.fuse {
        let steps: Vec<f64> = (0..=60).map(|k| low * powf(high / low, f64::from(k) / 60.0)).collect();
        let (mut earliest, mut latest) = (Vec::new(), Vec::new());
        for i in steps {
            let (first, last) = fuse_times(fuse, Amps(i));
            earliest.extend(first.map(|t| (i, t.0)));
            latest.extend(last.map(|t| (i, t.0)));
        }
        for edge in [&earliest, &latest] {
            out += &format!("<path class=\"line fuse\" d=\"{}\"/>", f.path(edge));
        }
        if let Some((i, t)) = latest.first() {
            names.put(f.x(*i) + 5.0, f.y(*t) + 12.0, "soft", "Fuse, earliest and latest", false);
        }
    }
    let same =
        |a: &LeadRating, b: &LeadRating| (a.area_mm2, a.initial, a.last) == (b.area_mm2, b.initial, b.last);
    let alike = d.leads.len() == 2 && same(&d.leads[0], &d.leads[1]);
    for lead in d.leads.iter().take(if alike { 1 } else { 2 }) {
        let k = wiring::adiabatic_k(lead.initial, lead.last);
        let limit = wiring::let_through_a2s(k, lead.area_mm2);
        let at = |t: f64| (limit / t).sqrt();
        let line = [(at(ADIABATIC_UP_TO.0), ADIABATIC_UP_TO.0), (at(TIMES.0), TIMES.0)];
        if line[0].0 < high {
            out += &format!(
                "<path class=\"line harm\" d=\"{}\"/>",
                f.path(&[line[0], (high, (limit / high / high).max(TIMES.0))])
            );
            names.put(
                f.x(line[0].0) + 5.0,
                f.y(line[0].1) - 4.0,
                "fails",
                match (alike, lead.cell_side) {
                    (true, _) => "Leads: harmed",
                    (false, true) => "Lead, cell to board: harmed",
                    (false, false) => "Lead, board to load: harmed",
                },
                false,
            );
        }
    }
    let load: Vec<(f64, f64)> = d.envelope.iter().map(|(i, t)| (i.0, t.0)).collect();
    out += &format!("<path class=\"line volt\" d=\"{}\"/>", f.path(&load));
    names.put(f.x(d.draw.0) - 4.0, f.y(setup.usage.press.0) + 16.0, "volt", "Load", true);
    if let Some((pulse, for_time)) = d.pulse {
        let mut line = vec![(pulse.0, TIMES.0), (pulse.0, for_time.0)];
        line.extend(d.continuous.map(|i| (i.0, for_time.0)));
        line.extend(d.continuous.map(|i| (i.0, TIMES.1)));
        out += &format!("<path class=\"line soft\" d=\"{}\"/>", f.path(&line));
        names.put(f.x(pulse.0) + 4.0, f.y(TIMES.0) - 20.0, "soft", "Cell's rating", false);
    } else if let Some(i) = d.continuous {
        out += &format!("<path class=\"line soft\" d=\"{}\"/>", f.path(&[(i.0, TIMES.0), (i.0, TIMES.1)]));
        names.put(f.x(i.0) + 4.0, f.y(TIMES.0) - 20.0, "soft", "Cell's rating", false);
    }
    for (k, p) in d.prospective.iter().enumerate() {
        let x = f.x(p.current.0);
        out += &format!("<path class=\"level\" d=\"M{x:.1} {TOP}V{foot}\"/>");
        names.put(
            x - 4.0,
            TOP + 12.0 + 16.0 * k as f64,
            "levelname",
            if k == 0 { "short, full" } else { "short, nearly empty" },
            true,
        );
    }
    out + &names.1 + "</svg>"
}

/// What happens at one current, in words.
fn happens(setup: &Setup, at: &AtCurrent) -> String {
    let sure: Vec<_> = at.openings.iter().filter(|o| o.latest.is_some()).collect();
    let cleared = sure.first().and_then(|o| o.latest).map(|t| t.0);
    let mut text = match (sure.first(), at.openings.first()) {
        (Some(first), _) => format!(
            "{} opens first, after {} to {}",
            opener(setup, first.what),
            time(first.earliest.0),
            time(first.latest.map_or(f64::NAN, |t| t.0))
        ),
        (None, Some(first)) => format!(
            "with some parts, or at some charge, {} opens after {} at the earliest; with others nothing does",
            opener(setup, first.what),
            time(first.earliest.0)
        ),
        (None, None) => "nothing opens".into(),
    };
    let never: Vec<String> = at.never.iter().map(|o| opener(setup, *o)).collect();
    if !never.is_empty() && !at.openings.is_empty() {
        text += &format!("; {} never", never.join(" and "));
    }
    text += ".";
    let harmed = at.leads.iter().flatten().map(|t| t.0).reduce(f64::min);
    text += &match (harmed, cleared) {
        (Some(t), Some(c)) if c < t => {
            format!(" Until then the leads stay below their limit, which comes after {}.", time(t))
        }
        (Some(t), Some(_)) => format!(" ▲ A lead is at its limit before, after {}.", time(t)),
        (Some(t), None) => {
            format!(" ▲ A lead is at its limit after {}, and nothing is sure to open.", time(t))
        }
        (None, Some(_)) | (None, None) if at.leads.is_empty() => {
            " The leads are not judged: their insulation is not entered.".into()
        }
        (None, _) => " No lead reaches its short-time limit within 5 s.".into(),
    };
    text += match at.cell_safe {
        Some(true) => " The cell stays within its rating until then.",
        Some(false) => " ▲ The cell is over its rating.",
        None => " The cell is not judged: no current rating is entered.",
    };
    sentences::capital(&text)
}

/// The section, `width` px wide.
pub fn section(setup: &Setup, d: &Diagram, width: f64) -> String {
    let lines: String = [
        (format!("At the load's own draw, {}", amps(d.draw.0)), d.draw),
        (format!("At twice the draw, {}", amps(2.0 * d.draw.0)), Amps(2.0 * d.draw.0)),
        (
            format!("At a dead short, nearly empty cell, {}", amps(d.prospective[1].current.0)),
            d.prospective[1].current,
        ),
        (
            format!("At a dead short, full cell, {}", amps(d.prospective[0].current.0)),
            d.prospective[0].current,
        ),
    ]
    .iter()
    .map(|(head, i)| format!("<dt>{head}</dt><dd>{}</dd>", escaped(&happens(setup, &d.at(*i)))))
    .collect();
    let most = d.prospective[0].current.0;
    let silent: Vec<String> = d
        .stages
        .iter()
        .filter(|s| s.low.is_none_or(|i| i.0 > most))
        .map(|s| sentences::limit(setup, s.limit))
        .collect();
    let silent = if silent.is_empty() {
        String::new()
    } else {
        format!(
            "<p>▲ {} would never open: no current that this cell gives through these leads meets it.</p>",
            escaped(&sentences::capital(&silent.join(" and ")))
        )
    };
    format!(
        "<h2 id=\"time-and-current\">Time and current</h2><figure><figcaption>What opens when<span>each stage as a band from the earliest board, warm and nearly empty, to the latest, cool and full; the load's own press as the longest time it stays above a current</span></figcaption>{}</figure><dl class=\"happens\">{lines}</dl>{silent}",
        svg(setup, d, width)
    )
}
