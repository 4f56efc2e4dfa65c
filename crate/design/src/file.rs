//! The design file: JSON, one entry per field, grouped by part.
//!
//! A value is a text as one would type it (`"45 mΩ"`) or a number in the field's own unit (`45`); a table
//! is a text or a list of pairs. What a file leaves out stands at its default. A key that is not known
//! is refused by name, so that a misspelt one is not silently ignored.

use serde::{Deserialize, Serialize};
use serde_json::{Map, Value};

use crate::catalogue::{FIELDS, Kind, PARTS, Part, field};
use crate::design::{Design, LONGEST_TEXT};
use crate::quantity::{self, quoted};

/// The version that is written.
pub const VERSION: u32 = 1;

/// Largest file that is read, in bytes.
pub const LARGEST: usize = 1_000_000;

/// Why a text is not a design file.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum FileError {
    /// Too many bytes.
    #[error("the file has {0} bytes; a design file has at most {LARGEST}")]
    TooLarge(usize),
    /// Not JSON, or not of the form.
    #[error("this is not a design file: {0}")]
    NotAFile(String),
    /// Written by a later page.
    #[error("the file is of version {0}, this page reads up to {VERSION}; open it with a newer page")]
    Newer(u64),
    /// The version is no whole number from 1.
    #[error("strikeline is {0}; accepted is the version of the file, a whole number from 1 to {VERSION}")]
    Version(String),
    /// A text was wanted.
    #[error("{0}: accepted is a text")]
    NotAText(&'static str),
    /// A part was wanted.
    #[error("{0}: accepted is a group of fields in braces")]
    NotAPart(String),
    /// A name that no field has.
    #[error("“{0}” is not a field of a design; the fields are listed in the documentation")]
    UnknownField(String),
    /// A value of the wrong kind.
    #[error(
        "{key}: accepted is a text such as \"45 mΩ\", a number in the field's own unit, or a list of pairs for a table"
    )]
    WrongKind {
        /// The field.
        key: String,
    },
    /// A value that is too long.
    #[error("{key} has {got} bytes; accepted are at most {LONGEST_TEXT}")]
    TooLong {
        /// The field.
        key: String,
        /// How many bytes it has.
        got: usize,
    },
}

/// Version 1 of the file.
#[derive(Debug, Serialize, Deserialize)]
struct FileV1 {
    strikeline: u32,
    #[serde(default)]
    name: String,
    #[serde(default)]
    note: String,
    #[serde(flatten)]
    parts: Map<String, Value>,
}

fn part_key(part: Part) -> &'static str {
    match part {
        Part::Cell => "cell",
        Part::Board => "board",
        Part::Second => "second",
        Part::Leads => "leads",
        Part::Load => "load",
        Part::Use => "use",
    }
}

/// The design as a file: every field, also those at their default.
pub fn to_json(design: &Design) -> String {
    let mut parts = Map::new();
    for f in FIELDS {
        let entry = parts.entry(part_key(f.part)).or_insert_with(|| Value::Object(Map::new()));
        if let Value::Object(map) = entry {
            let (_, name) = f.key.split_once('.').unwrap_or(("", f.key));
            map.insert(name.into(), Value::String(design.get(f.key).into()));
        }
    }
    let file = FileV1 { strikeline: VERSION, name: design.name.clone(), note: design.note.clone(), parts };
    serde_json::to_string_pretty(&file).unwrap_or_default()
}

/// The documentation of every field, as the rows of a Markdown table: key, what a number means, range,
/// default, label.
pub fn field_table() -> String {
    let mut out = String::from(
        "| field | a number is in | accepted | default | what it is |\n| --- | --- | --- | --- | --- |\n",
    );
    for f in FIELDS {
        let (unit, accepted) = match f.kind {
            Kind::Quantity { shown, min, max, optional, .. } => {
                let unit = if shown.text.is_empty() { "a plain number" } else { shown.text };
                let empty = if optional { ", or empty" } else { "" };
                let range = format!("{} to {}", quantity::format(min, &shown), quantity::format(max, &shown));
                (unit.to_string(), range + empty)
            }
            Kind::Choice(list) => {
                let keys: Vec<String> = list.iter().map(|(key, _)| format!("`{key}`")).collect();
                ("–".into(), keys.join(", "))
            }
            Kind::Table { x, y, .. } => {
                let name = |text: &str| if text.is_empty() { "plain".to_string() } else { text.to_string() };
                (format!("{}, {}", name(x.text), name(y.text)), "pairs".into())
            }
        };
        let usual = Design::default();
        let default = usual.get(f.key).replace('\n', "; ");
        out += &format!("| `{}` | {unit} | {accepted} | {default} | {} |\n", f.key, f.label);
    }
    out
}

/// Reads a design file.
///
/// # Errors
/// One sentence that names what is wrong.
pub fn from_json(text: &str) -> Result<Design, FileError> {
    if text.len() > LARGEST {
        return Err(FileError::TooLarge(text.len()));
    }
    let text = text.trim_start_matches('\u{feff}');
    // The version first: a newer file may look different in everything else.
    let value: Value = serde_json::from_str(text).map_err(|e| FileError::NotAFile(e.to_string()))?;
    let Some(version) = value.get("strikeline") else {
        return Err(FileError::NotAFile("the entry \"strikeline\" with its version is missing".into()));
    };
    match version.as_u64() {
        Some(v) if v > u64::from(VERSION) => return Err(FileError::Newer(v)),
        Some(1..) => {}
        _ => return Err(FileError::Version(quoted(&version.to_string()))),
    }
    for key in ["name", "note"] {
        if value.get(key).is_some_and(|v| !v.is_string()) {
            return Err(FileError::NotAText(key));
        }
    }
    let file: FileV1 = serde_json::from_value(value).map_err(|e| FileError::NotAFile(e.to_string()))?;
    let mut design = Design::default();
    design.name = limited("name", file.name)?;
    design.note = limited("note", file.note)?;
    for (part, fields) in &file.parts {
        if !PARTS.iter().any(|(p, _)| part_key(*p) == part) {
            return Err(FileError::UnknownField(quoted(part)));
        }
        let Value::Object(fields) = fields else { return Err(FileError::NotAPart(quoted(part))) };
        for (name, value) in fields {
            let key = format!("{part}.{name}");
            let Some(f) = field(&key) else { return Err(FileError::UnknownField(quoted(&key))) };
            let text = match value {
                Value::String(text) => text.clone(),
                Value::Number(number) => number.to_string(),
                Value::Array(rows) if matches!(f.kind, Kind::Table { .. }) => {
                    rows_text(rows).ok_or_else(|| FileError::WrongKind { key: key.clone() })?
                }
                _ => return Err(FileError::WrongKind { key }),
            };
            let text = limited(&key, text)?;
            design.set(f.key, &text);
        }
    }
    Ok(design)
}

fn limited(key: &str, text: String) -> Result<String, FileError> {
    if text.len() > LONGEST_TEXT {
        return Err(FileError::TooLong { key: key.into(), got: text.len() });
    }
    Ok(text)
}

fn rows_text(rows: &[Value]) -> Option<String> {
    let lines: Option<Vec<String>> = rows
        .iter()
        .map(|row| match row.as_array().map(Vec::as_slice) {
            Some([a, b]) => Some(format!("{} {}", a.as_f64()?, b.as_f64()?)),
            _ => None,
        })
        .collect();
    lines.map(|l| l.join("\n"))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn exact_a_file_comes_back_the_same() {
        let mut design = Design::demo();
        design.set("cell.capacity", "2800 mAh");
        assert_eq!(from_json(&to_json(&design)), Ok(design));
    }

    #[test]
    fn exact_a_short_file_is_enough() {
        let design = from_json(
            r#"{"strikeline": 1, "cell": {"capacity": 2.28}, "load": {"table": [[3, 2.5], [4, 2.7]]}}"#,
        );
        let design = design.expect("a file");
        assert_eq!((design.get("cell.capacity"), design.get("load.table")), ("2.28", "3 2.5\n4 2.7"));
    }

    #[test]
    fn exact_refusals_name_what_is_wrong() {
        let said = |text: &str| from_json(text).expect_err(text).to_string();
        assert!(said(r#"{"strikeline": 1, "cell": {"capasity": 1}}"#).contains("cell.capasity"));
        assert!(said(r#"{"strikeline": 9}"#).contains("version 9"));
        assert!(said(r#"{"strikeline": 1, "cell": {"capacity": [1]}}"#).contains("cell.capacity"));
        assert!(said("{").starts_with("this is not a design file"));
        assert!(said(&"[".repeat(100_000)).starts_with("this is not a design file"));
    }
}
