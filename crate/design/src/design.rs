//! A design as it is entered: a text for every field, a name and a note.

use crate::catalogue::{self, FIELDS, Field, When};

/// What is entered.
#[derive(Debug, Clone, PartialEq)]
pub struct Design {
    /// What the builder calls it.
    pub name: String,
    /// Anything to remember.
    pub note: String,
    /// One text per field, in the order of the catalogue.
    texts: Vec<String>,
}

/// Longest name, note or field text that is kept, in bytes.
pub const LONGEST_TEXT: usize = 20_000;

impl Default for Design {
    /// Every field as the catalogue has it, and a usual lit draw.
    fn default() -> Self {
        let mut design = Self {
            name: String::new(),
            note: String::new(),
            texts: FIELDS.iter().map(|f| f.default.to_string()).collect(),
        };
        design.set("load.table", "3.0 2.45\n3.3 2.55\n3.6 2.65\n3.9 2.72\n4.2 2.78");
        design
    }
}

impl Design {
    /// The worked example: a pocket igniter for lighting bee smokers, all parts invented.
    pub fn demo() -> Self {
        let mut design = Self {
            name: "Smoker igniter, pocket size".into(),
            note: "Lights the fuel of a bee smoker in the wind. All parts are invented.".into(),
            ..Self::default()
        };
        design.set("cell.charge", "1.1 A");
        design.set("charger.fitted", "yes");
        design
    }

    /// The text of a field; empty for a key that is none.
    pub fn get(&self, key: &str) -> &str {
        position(key).map_or("", |k| self.texts[k].as_str())
    }

    /// Sets the text of a field; whether there is such a field and the text is not too long.
    pub fn set(&mut self, key: &str, text: &str) -> bool {
        match position(key) {
            Some(k) if text.len() <= LONGEST_TEXT => {
                self.texts[k] = text.to_string();
                true
            }
            _ => false,
        }
    }

    /// Whether a field matters with the choices made.
    pub fn matters(&self, field: &Field) -> bool {
        match field.when {
            When::Always => true,
            When::Is(key, values) => {
                values.contains(&self.get(key))
                    && catalogue::field(key).is_some_and(|chooser| self.matters(chooser))
            }
        }
    }

    /// The fields whose text is not the default, with their texts.
    pub fn changed(&self) -> impl Iterator<Item = (&'static Field, &str)> {
        let usual = Self::default();
        FIELDS
            .iter()
            .enumerate()
            .filter(move |(k, _)| usual.texts[*k] != self.texts[*k])
            .map(|(k, field)| (field, self.texts[k].as_str()))
    }
}

fn position(key: &str) -> Option<usize> {
    FIELDS.iter().position(|f| f.key == key)
}
