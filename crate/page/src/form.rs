//! The form as markup, made from the catalogue.

use strikeline_design::catalogue::{self, FIELDS, Field, Kind, PARTS, Part};
use strikeline_design::design::Design;
use strikeline_design::{quantity, shipped};

use crate::number::escaped;

/// The id of a field's input.
pub fn input_id(key: &str) -> String {
    format!("f-{}", key.replace('.', "-"))
}

/// The whole form.
pub fn form(design: &Design) -> String {
    PARTS.iter().map(|(part, name)| part_markup(design, *part, name)).collect()
}

fn part_markup(design: &Design, part: Part, name: &str) -> String {
    let rows = |everyday: bool| -> String {
        FIELDS.iter().filter(|f| f.part == part && f.everyday == everyday).map(|f| row(design, f)).collect()
    };
    let (plain, folded) = (rows(true), rows(false));
    let heading = format!("<h2>{name}</h2>");
    let more = match part {
        Part::Cell => "Age, parallel cells, ratings, curves, heat",
        Part::Board => "More limits, over-discharge and over-charge, switch",
        Part::Second => "Fitted, and with what",
        Part::Leads => "Conductor, joints, fuse, ratings",
        Part::Load => "Start, surge, capacitor, ripple, output",
        Part::Use => "Storage, cold, bounds",
        Part::Charger => "Voltage, trickle, temperatures",
    };
    let folded = if folded.is_empty() {
        folded
    } else {
        format!("<details><summary>{more}</summary>{folded}</details>")
    };
    let (start, helps) = if part == Part::Board { (classes(), board_helps()) } else { Default::default() };
    format!("<section class=\"part\">{heading}{start}{plain}{helps}{folded}</section>")
}

/// The id of the list of board classes.
pub const CLASS: &str = "board-class";

/// A class of board to start from, for those who know only its marking.
fn classes() -> String {
    let options: String = shipped::board_classes()
        .iter()
        .map(|c| format!("<option value=\"{}\">{}</option>", c.key, escaped(c.label)))
        .collect();
    format!(
        "<div class=\"field wide\"><label for=\"{CLASS}\">Known by its marking only? Start from a class</label>\
         <select id=\"{CLASS}\"><option value=\"\">as entered below</option>{options}</select></div>"
    )
}

/// Where the figures of a board stand, and how to measure its pair.
fn board_helps() -> String {
    let numbers: String = shipped::FOUR_NUMBERS
        .iter()
        .map(|(key, text)| {
            let label = catalogue::field(key).map_or("", |f| f.label);
            format!("<li><b>{}</b>: {}</li>", escaped(label), escaped(text))
        })
        .collect();
    let steps: String = shipped::PAIR_BY_METER.iter().map(|s| format!("<li>{}</li>", escaped(s))).collect();
    format!(
        "<details class=\"how\"><summary>Four figures to copy from data sheets</summary><ul>{numbers}</ul></details>\
         <details class=\"how\"><summary>No data sheet: the pair by supply and meter</summary><ol>{steps}</ol></details>"
    )
}

/// What a field accepts, in words.
pub fn accepted(field: &Field) -> String {
    match field.kind {
        Kind::Quantity { shown, min, max, optional, tolerance } => {
            let range = format!("{} to {}", quantity::format(min, &shown), quantity::format(max, &shown));
            let tolerance = match tolerance {
                Some(t) => format!(
                    "; a tolerance may follow, e.g. ± 10 %, else ± {} % is taken",
                    (t * 100.0).round()
                ),
                None => String::new(),
            };
            format!("{range}{tolerance}{}", if optional { "; may stay empty" } else { "" })
        }
        Kind::Choice(_) => String::new(),
        Kind::Table { optional, .. } => {
            format!(
                "two numbers a line, the first rising{}",
                if optional { "; paste two columns" } else { "" }
            )
        }
    }
}

fn row(design: &Design, field: &Field) -> String {
    let id = input_id(field.key);
    let text = escaped(design.get(field.key));
    let hidden = if design.matters(field) { "" } else { " hidden" };
    let attributes =
        format!("id=\"{id}\" data-key=\"{}\" aria-describedby=\"{id}-help {id}-fault\"", field.key);
    let (input, wide) = match field.kind {
        Kind::Choice(list) => {
            let options: String = list
                .iter()
                .map(|(key, label)| {
                    let selected = if *key == design.get(field.key) { " selected" } else { "" };
                    format!("<option value=\"{key}\"{selected}>{label}</option>")
                })
                .collect();
            (format!("<select {attributes}>{options}</select>"), " wide")
        }
        Kind::Table { .. } => {
            let rows = design.get(field.key).lines().count().clamp(2, 8);
            (
                format!("<textarea {attributes} rows=\"{rows}\" spellcheck=\"false\">{text}</textarea>"),
                " wide",
            )
        }
        Kind::Quantity { optional, .. } => {
            let place = if optional { " placeholder=\"not given\"" } else { "" };
            (
                format!(
                    "<input {attributes} value=\"{text}\"{place} autocomplete=\"off\" spellcheck=\"false\">"
                ),
                "",
            )
        }
    };
    let accepted = accepted(field);
    let help = if accepted.is_empty() {
        escaped(field.help)
    } else {
        format!("{} Accepted: {}.", escaped(field.help), escaped(&accepted))
    };
    format!(
        "<div class=\"field{wide}\" data-row=\"{}\"{hidden}><label for=\"{id}\">{}</label>{input}\
         <p class=\"help\" id=\"{id}-help\">{help}</p><p class=\"fault\" id=\"{id}-fault\" hidden></p></div>",
        field.key,
        escaped(field.label),
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn law_every_field_has_a_labelled_input() {
        let markup = form(&Design::demo());
        for f in FIELDS {
            let id = input_id(f.key);
            assert!(
                markup.contains(&format!("for=\"{id}\"")) && markup.contains(&format!("id=\"{id}\"")),
                "{}",
                f.key
            );
        }
    }

    #[test]
    fn exact_typed_markup_stays_text() {
        let mut design = Design::demo();
        design.set("cell.capacity", "\"><script>alert(1)</script>");
        assert!(!form(&design).contains("<script>"));
    }
}
