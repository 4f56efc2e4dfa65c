//! The design file: JSON, one entry per field, grouped by part.
//!
//! A value is a text as one would type it (`"45 mΩ"`) or a number in the field's own unit (`45`); a table
//! is a text or a list of pairs. What a file leaves out stands at the default of the file's version. A key that
//! is not known, or stands twice, is refused by name, so that nothing is silently ignored.

use std::fmt;

use serde::de::{Deserialize, Deserializer, MapAccess, SeqAccess, Visitor};
use serde_json::{Map, Number, Value};

use crate::catalogue::{FIELDS, Kind, PARTS, Part, field};
use crate::design::{Design, LONGEST_TEXT};
use crate::quantity::{self, quoted};
use crate::versions::{self, Refused};

pub use crate::versions::VERSION;

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
    /// A field that the file's version does not have.
    #[error(
        "{key} came with version {since} of the file, this one says {says}; change the entry \"strikeline\""
    )]
    LaterField {
        /// The field.
        key: String,
        /// The version that brought it.
        since: u32,
        /// The version of the file.
        says: u32,
    },
    /// A name that stands twice in the same braces.
    #[error("“{0}” stands twice; accepted is once")]
    Twice(String),
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

/// JSON as it stands in the file, names that stand twice included.
enum Node {
    Object(Vec<(String, Node)>),
    Array(Vec<Node>),
    Leaf(Value),
}

impl<'de> Deserialize<'de> for Node {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        struct Reader;
        impl<'de> Visitor<'de> for Reader {
            type Value = Node;
            fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
                f.write_str("a JSON value")
            }
            fn visit_unit<E>(self) -> Result<Node, E> {
                Ok(Node::Leaf(Value::Null))
            }
            fn visit_bool<E>(self, value: bool) -> Result<Node, E> {
                Ok(Node::Leaf(value.into()))
            }
            fn visit_i64<E>(self, value: i64) -> Result<Node, E> {
                Ok(Node::Leaf(value.into()))
            }
            fn visit_u64<E>(self, value: u64) -> Result<Node, E> {
                Ok(Node::Leaf(value.into()))
            }
            fn visit_f64<E>(self, value: f64) -> Result<Node, E> {
                Ok(Node::Leaf(Number::from_f64(value).map_or(Value::Null, Value::Number)))
            }
            fn visit_str<E>(self, value: &str) -> Result<Node, E> {
                Ok(Node::Leaf(value.into()))
            }
            fn visit_seq<A: SeqAccess<'de>>(self, mut rows: A) -> Result<Node, A::Error> {
                let mut all = Vec::new();
                while let Some(row) = rows.next_element()? {
                    all.push(row);
                }
                Ok(Node::Array(all))
            }
            fn visit_map<A: MapAccess<'de>>(self, mut entries: A) -> Result<Node, A::Error> {
                let mut all = Vec::new();
                while let Some(entry) = entries.next_entry()? {
                    all.push(entry);
                }
                Ok(Node::Object(all))
            }
        }
        deserializer.deserialize_any(Reader)
    }
}

impl Node {
    /// The plain value; `path` is where it stands, for a name that stands twice.
    fn once(self, path: &str) -> Result<Value, FileError> {
        match self {
            Self::Leaf(value) => Ok(value),
            Self::Array(rows) => rows.into_iter().map(|row| row.once(path)).collect(),
            Self::Object(entries) => {
                let mut map = Map::new();
                for (name, node) in entries {
                    let path =
                        if path.is_empty() { quoted(&name) } else { format!("{path}.{}", quoted(&name)) };
                    if map.contains_key(&name) {
                        return Err(FileError::Twice(path));
                    }
                    map.insert(name, node.once(&path)?);
                }
                Ok(Value::Object(map))
            }
        }
    }
}

fn part_key(part: Part) -> &'static str {
    match part {
        Part::Cell => "cell",
        Part::Board => "board",
        Part::Second => "second",
        Part::Leads => "leads",
        Part::Load => "load",
        Part::Use => "use",
        Part::Charger => "charger",
    }
}

/// The newest version of the file.
#[derive(serde::Serialize)]
struct Written<'d> {
    strikeline: u32,
    name: &'d str,
    note: &'d str,
    #[serde(flatten)]
    parts: Map<String, Value>,
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
    let file = Written { strikeline: VERSION, name: &design.name, note: &design.note, parts };
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
    let node: Node = serde_json::from_str(text).map_err(|e| FileError::NotAFile(e.to_string()))?;
    // The version first: a newer file may look different in everything else.
    let Node::Object(entries) = &node else {
        return Err(FileError::NotAFile("accepted is a group of parts in braces".into()));
    };
    let version = match entries.iter().find(|(name, _)| name == "strikeline") {
        Some((_, Node::Leaf(version))) => version.clone(),
        Some((_, Node::Object(_) | Node::Array(_))) => {
            return Err(FileError::Version("a group or list".into()));
        }
        None => {
            return Err(FileError::NotAFile("the entry \"strikeline\" with its version is missing".into()));
        }
    };
    let version = match version.as_u64().map(|v| (v, u32::try_from(v))) {
        Some((_, Ok(v))) if (1..=VERSION).contains(&v) => v,
        Some((v, _)) if v > u64::from(VERSION) => return Err(FileError::Newer(v)),
        _ => return Err(FileError::Version(quoted(&version.to_string()))),
    };
    let Value::Object(mut parts) = node.once("")? else {
        return Err(FileError::NotAFile("accepted is a group of parts in braces".into()));
    };
    parts.remove("strikeline");
    let name = text_entry(&mut parts, "name")?;
    let note = text_entry(&mut parts, "note")?;
    let mut texts = Vec::new();
    for (part, fields) in &parts {
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
            texts.push((key, text));
        }
    }
    let mut design = versions::open(version, texts).map_err(|refused| match refused {
        Refused::Unknown(key) => FileError::UnknownField(quoted(&key)),
        Refused::Later { key, since } => FileError::LaterField { key, since, says: version },
        Refused::Twice(key) => FileError::Twice(key),
        Refused::TooLong { key, got } => FileError::TooLong { key, got },
    })?;
    (design.name, design.note) = (name, note);
    Ok(design)
}

/// Takes a text out of the entries beside the parts; empty where there is none.
fn text_entry(parts: &mut Map<String, Value>, key: &'static str) -> Result<String, FileError> {
    match parts.remove(key) {
        None => Ok(String::new()),
        Some(Value::String(text)) if text.len() <= LONGEST_TEXT => Ok(text),
        Some(Value::String(text)) => Err(FileError::TooLong { key: key.into(), got: text.len() }),
        Some(_) => Err(FileError::NotAText(key)),
    }
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
        let later = said(r#"{"strikeline": 1, "charger": {"fitted": "yes"}}"#);
        assert!(later.contains("charger.fitted came with version 2"), "{later}");
        assert!(said(r#"{"strikeline": 9}"#).contains("version 9"));
        assert!(said(r#"{"strikeline": 1, "cell": {"capacity": [1]}}"#).contains("cell.capacity"));
        assert!(
            said(r#"{"strikeline": 1, "cell": {"capacity": 1, "capacity": 2}}"#)
                .contains("“cell.capacity” stands twice")
        );
        assert!(said(r#"{"strikeline": 1, "cell": {}, "cell": {}}"#).contains("“cell” stands twice"));
        assert!(
            said(r#"{"strikeline": 1, "name": "a", "strikeline": 1}"#).contains("“strikeline” stands twice")
        );
        assert!(said("{").starts_with("this is not a design file"));
        assert!(said(&"[".repeat(100_000)).starts_with("this is not a design file"));
    }
}
