//! The answers without a browser: design files in, reports out.

use std::process::ExitCode;

use serde_json::json;
use strikeline_core::replay::{self, Recorded, ReplayStart};
use strikeline_core::units::{Amps, Celsius, Seconds};
use strikeline_design::check::{self, Checked};
use strikeline_design::design::Design;
use strikeline_design::report::{self, Extras};
use strikeline_design::{file, link, shipped};

const USAGE: &str = "\
strikeline-batch [--events] [--trace] [--presses] [--margins] [--board CLASS] design.json …
    one JSON report per design, a line each; what cannot be used is named on standard error
strikeline-batch replay design.json log.csv [--soc X] [--temperature T] [--json]
    the design's cell under a recorded current (columns time_s, current_A; optional voltage_V, temperature_C)
strikeline-batch link design.json
    the design's link, from # on
strikeline-batch open '#2.…'
    the design file of a link
strikeline-batch boards
    the classes of board that --board puts in place of the design's own
strikeline-batch demo
    the worked example as a design file
strikeline-batch fields
    every field of a design file, with unit, range and default, as a table";

fn main() -> ExitCode {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let said = match run(&arguments) {
        Ok(said) => said,
        Err(message) => Said { out: String::new(), refused: vec![message] },
    };
    // A reader that has gone away is no fault of ours.
    let _ = std::io::Write::write_all(&mut std::io::stdout(), said.out.as_bytes());
    for message in &said.refused {
        eprintln!("{message}");
    }
    if said.refused.is_empty() { ExitCode::SUCCESS } else { ExitCode::from(2) }
}

/// What a command has to say.
struct Said {
    /// For standard output.
    out: String,
    /// What could not be used, and why.
    refused: Vec<String>,
}

impl From<String> for Said {
    fn from(out: String) -> Self {
        Self { out, refused: Vec::new() }
    }
}

fn run(arguments: &[String]) -> Result<Said, String> {
    let words: Vec<&str> = arguments.iter().map(String::as_str).collect();
    match words.as_slice() {
        [] => Err(USAGE.into()),
        ["--help" | "-h"] => Ok((USAGE.to_string() + "\n").into()),
        ["demo"] => Ok((file::to_json(&Design::demo()) + "\n").into()),
        ["boards"] => {
            let line = |c: &shipped::BoardClass| format!("{}: {}. {}\n", c.key, c.label, c.about);
            Ok(shipped::board_classes().iter().map(line).collect::<String>().into())
        }
        ["fields"] => Ok(file::field_table().into()),
        ["link", path] => Ok((link::encode(&design(path)?) + "\n").into()),
        ["open", fragment] => {
            let design = link::decode(fragment).map_err(|e| e.to_string())?;
            Ok((file::to_json(&design) + "\n").into())
        }
        ["replay", rest @ ..] => replay_command(rest).map(Said::from),
        _ => reports(&words),
    }
}

fn reports(words: &[&str]) -> Result<Said, String> {
    let mut extras = Extras::default();
    let mut class = None;
    let mut paths = Vec::new();
    let mut words = words.iter();
    while let Some(word) = words.next() {
        match *word {
            "--board" => {
                let key = words.next().ok_or("--board wants a class of board")?;
                let found = shipped::board_classes().iter().find(|c| c.key == *key);
                class = Some(found.ok_or_else(|| {
                    let keys: Vec<&str> = shipped::board_classes().iter().map(|c| c.key).collect();
                    format!("--board {key}: accepted is one of {}", keys.join(", "))
                })?);
            }
            "--events" => extras.events = true,
            "--trace" => extras.trace = true,
            "--presses" => extras.presses = true,
            "--margins" => extras.margins = true,
            flag if flag.starts_with("--") => return Err(format!("{flag} is not an option\n{USAGE}")),
            path => paths.push(path),
        }
    }
    if paths.is_empty() {
        return Err(format!("no design file is given\n{USAGE}"));
    }
    // A file that cannot be used takes nothing from the others.
    let mut said = Said { out: String::new(), refused: Vec::new() };
    for path in paths {
        match report_of(path, class, extras) {
            Ok(line) => said.out += &(line + "\n"),
            Err(message) => said.refused.push(message),
        }
    }
    Ok(said)
}

fn report_of(path: &str, class: Option<&shipped::BoardClass>, extras: Extras) -> Result<String, String> {
    let mut design = design(path)?;
    if let Some(class) = class {
        shipped::apply(&mut design, class.key);
    }
    let checked = checked(path, &design)?;
    let answers = report::answer(&checked);
    Ok(report::json(&design.name, &checked, &answers, &report::further(&checked, &answers), extras)
        .to_string())
}

fn read(path: &str) -> Result<String, String> {
    std::fs::read_to_string(path).map_err(|e| format!("{path}: {e}"))
}

fn design(path: &str) -> Result<Design, String> {
    file::from_json(&read(path)?).map_err(|e| format!("{path}: {e}"))
}

fn checked(path: &str, design: &Design) -> Result<Checked, String> {
    check::check(design).map_err(|faults| {
        let lines: Vec<String> = faults.iter().map(|f| format!("{path}: {}: {}", f.key, f.message)).collect();
        lines.join("\n")
    })
}

fn replay_command(words: &[&str]) -> Result<String, String> {
    let (mut soc, mut temperature, mut as_json) = (1.0, None, false);
    let mut paths = Vec::new();
    let mut words = words.iter();
    while let Some(word) = words.next() {
        let number = |value: Option<&&str>| -> Result<f64, String> {
            let text = value.ok_or_else(|| format!("{word} wants a number"))?;
            let value: f64 = text.parse().map_err(|_| format!("{word} {text}: not a number"))?;
            if value.is_finite() { Ok(value) } else { Err(format!("{word} {text}: not a finite number")) }
        };
        match *word {
            "--soc" => soc = number(words.next())?,
            "--temperature" => temperature = Some(number(words.next())?),
            "--json" => as_json = true,
            flag if flag.starts_with("--") => return Err(format!("{flag} is not an option\n{USAGE}")),
            path => paths.push(path),
        }
    }
    let [design_path, log_path] = paths[..] else { return Err(USAGE.into()) };
    if !(0.0..=1.0).contains(&soc) {
        return Err(format!("--soc {soc}: accepted is 0 to 1"));
    }
    let checked = checked(design_path, &design(design_path)?)?;
    let log = Log::read(&read(log_path)?).map_err(|e| format!("{log_path}: {e}"))?;
    let ambient = checked.nominal.usage.ambient.0;
    let first = temperature.or_else(|| log.temperature.first().copied()).unwrap_or(ambient);
    if !(-60.0..=120.0).contains(&first) {
        return Err(format!("the cell starts at {first} °C; accepted is −60 to 120 °C"));
    }
    let start = ReplayStart { soc, temperature: Celsius(first), ambient: Celsius(first) };
    let got = replay::run(&checked.nominal.cell, &start, &log.rows);
    if let Some(p) = got.iter().find(|p| !p.voltage.0.is_finite() || !p.temperature.0.is_finite()) {
        let at = p.time.0;
        return Err(format!(
            "{log_path}: the cell leaves all bounds at {at} s; the current is not one it can give"
        ));
    }
    let rms = (!log.voltage.is_empty()).then(|| {
        let squares: f64 = got.iter().zip(&log.voltage).map(|(p, v)| (p.voltage.0 - v).powi(2)).sum();
        (squares / got.len() as f64).sqrt()
    });
    if as_json {
        return Ok(json!({
            "replay": 1,
            "time_s": got.iter().map(|p| p.time.0).collect::<Vec<_>>(),
            "predicted_V": got.iter().map(|p| p.voltage.0).collect::<Vec<_>>(),
            "predicted_C": got.iter().map(|p| p.temperature.0).collect::<Vec<_>>(),
            "soc": got.iter().map(|p| p.soc).collect::<Vec<_>>(),
            "rms_V": rms,
        })
        .to_string()
            + "\n");
    }
    let mut out = String::from("time_s,predicted_V,predicted_C,soc\n");
    for p in &got {
        out += &format!("{},{:.6},{:.4},{:.6}\n", p.time.0, p.voltage.0, p.temperature.0, p.soc);
    }
    if let Some(rms) = rms {
        eprintln!("RMS against voltage_V: {:.2} mV over {} rows", rms * 1e3, got.len());
    }
    Ok(out)
}

/// A recorded current.
struct Log {
    rows: Vec<Recorded>,
    voltage: Vec<f64>,
    temperature: Vec<f64>,
}

impl Log {
    fn read(text: &str) -> Result<Self, String> {
        let mut reader = csv::ReaderBuilder::new()
            .trim(csv::Trim::All)
            .comment(Some(b'#'))
            .from_reader(text.trim_start_matches('\u{feff}').as_bytes());
        let header = reader.headers().map_err(|e| e.to_string())?.clone();
        let column = |names: &[&str]| header.iter().position(|h| names.contains(&h));
        let time = column(&["time_s"]).ok_or("the column time_s is missing")?;
        let current = column(&["current_A"]).ok_or("the column current_A is missing")?;
        let voltage = column(&["voltage_V"]);
        let temperature = column(&["temperature_C", "temperature_degC"]);
        let mut log = Self { rows: Vec::new(), voltage: Vec::new(), temperature: Vec::new() };
        for record in reader.records() {
            let record = record.map_err(|e| e.to_string())?;
            let line = record.position().map_or(0, csv::Position::line);
            let number = |column: usize| -> Result<f64, String> {
                let text = record.get(column).unwrap_or("");
                let value: f64 = text
                    .parse()
                    .map_err(|_| format!("line {line}: “{text}” in {} is not a number", &header[column]))?;
                if value.is_finite() { Ok(value) } else { Err(format!("line {line}: {text} is not finite")) }
            };
            let row = Recorded { time: Seconds(number(time)?), current: Amps(number(current)?) };
            if log.rows.last().is_some_and(|last: &Recorded| last.time.0 > row.time.0) {
                return Err(format!("line {line}: the time falls; accepted are rows in rising order"));
            }
            log.rows.push(row);
            if let Some(column) = voltage {
                log.voltage.push(number(column)?);
            }
            if let Some(column) = temperature {
                log.temperature.push(number(column)?);
            }
        }
        if log.rows.is_empty() {
            return Err("there are no rows".into());
        }
        Ok(log)
    }
}
