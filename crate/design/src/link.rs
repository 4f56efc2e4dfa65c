//! The share link: the whole design in the fragment of the address, so that nothing is sent anywhere.
//!
//! `#2.` (the version) and then, in the web's base-64 alphabet, a checksum and the compressed design. Only what
//! differs from the defaults of its version stands in it; see [`crate::versions`]. Texts go as they were typed, so
//! the numbers are the same to the last bit.

use serde::{Deserialize, Serialize};

use crate::design::{Design, LONGEST_TEXT};
use crate::versions::{self, Refused};

pub use crate::versions::VERSION;

/// Longest fragment that is read, in characters.
pub const LONGEST: usize = 64_000;
/// Most bytes that a link may unfold to.
const MOST_BYTES: usize = 400_000;

/// Why a fragment is not a link of ours.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum LinkError {
    /// It does not begin like one.
    #[error("this address holds no design")]
    NotALink,
    /// Cut off, altered, or not ours.
    #[error("the link is damaged, perhaps cut off when it was copied; ask for it again")]
    Damaged,
    /// Made by a later page.
    #[error("the link is of version {0}, this page reads up to {VERSION}; open it with a newer page")]
    Newer(u32),
    /// Far larger than a design.
    #[error("the link is larger than any design; it was not opened")]
    TooLarge,
}

/// Versions 1 and 2, which differ in their fields and defaults only: name, note, and the fields that differ from
/// the default, by key.
#[derive(Debug, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Link {
    #[serde(rename = "n", default, skip_serializing_if = "String::is_empty")]
    name: String,
    #[serde(rename = "t", default, skip_serializing_if = "String::is_empty")]
    note: String,
    #[serde(rename = "f", default, skip_serializing_if = "Vec::is_empty")]
    fields: Vec<(String, String)>,
}

/// The fragment of a design, from `#` on.
pub fn encode(design: &Design) -> String {
    let link = Link {
        name: design.name.clone(),
        note: design.note.clone(),
        fields: design.changed().map(|(f, text)| (f.key.to_string(), text.to_string())).collect(),
    };
    let plain = serde_json::to_vec(&link).unwrap_or_default();
    let mut bytes = crc32fast::hash(&plain).to_le_bytes().to_vec();
    bytes.extend(miniz_oxide::deflate::compress_to_vec(&plain, 9));
    format!("#{VERSION}.{}", data_encoding::BASE64URL_NOPAD.encode(&bytes))
}

/// The design of a fragment, with or without its `#`.
///
/// # Errors
/// One sentence; the caller's own design stays as it is.
pub fn decode(fragment: &str) -> Result<Design, LinkError> {
    let fragment = fragment.trim().trim_start_matches('#');
    let (version, payload) = fragment.split_once('.').ok_or(LinkError::NotALink)?;
    if version.is_empty() || version.len() > 6 || !version.bytes().all(|b| b.is_ascii_digit()) {
        return Err(LinkError::NotALink);
    }
    let version: u32 = version.parse().map_err(|_| LinkError::NotALink)?;
    if version > VERSION {
        return Err(LinkError::Newer(version));
    }
    if version == 0 {
        return Err(LinkError::NotALink);
    }
    if payload.len() > LONGEST {
        return Err(LinkError::TooLarge);
    }
    let bytes = data_encoding::BASE64URL_NOPAD.decode(payload.as_bytes()).map_err(|_| LinkError::Damaged)?;
    let (sum, packed) = bytes.split_at_checked(4).ok_or(LinkError::Damaged)?;
    let plain = miniz_oxide::inflate::decompress_to_vec_with_limit(packed, MOST_BYTES).map_err(|e| {
        if e.status == miniz_oxide::inflate::TINFLStatus::HasMoreOutput {
            LinkError::TooLarge
        } else {
            LinkError::Damaged
        }
    })?;
    if crc32fast::hash(&plain).to_le_bytes() != *sum {
        return Err(LinkError::Damaged);
    }
    let link: Link = serde_json::from_slice(&plain).map_err(|_| LinkError::Damaged)?;
    if link.name.len() > LONGEST_TEXT || link.note.len() > LONGEST_TEXT {
        return Err(LinkError::TooLarge);
    }
    let mut design = versions::open(version, link.fields).map_err(|refused| match refused {
        Refused::TooLong { .. } => LinkError::TooLarge,
        Refused::Unknown(_) | Refused::Later { .. } | Refused::Twice(_) => LinkError::Damaged,
    })?;
    (design.name, design.note) = (link.name, link.note);
    Ok(design)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn exact_a_link_comes_back_the_same() {
        let mut design = Design::demo();
        design.set("cell.capacity", "2,8 Ah");
        design.set("load.table", "3 2.5\n4 2.7");
        let link = encode(&design);
        assert_eq!(decode(&link), Ok(design));
        assert!(encode(&Design::demo()).len() < 300, "{}", encode(&Design::demo()).len());
    }

    #[test]
    fn exact_a_damaged_link_is_refused() {
        let link = encode(&Design::demo());
        for k in 3..link.len() {
            let mut bytes = link.clone().into_bytes();
            bytes[k] = if bytes[k] == b'A' { b'B' } else { b'A' };
            let altered = String::from_utf8(bytes).expect("ascii");
            assert!(decode(&altered).is_err(), "byte {k}");
            assert!(decode(&link[..k]).is_err(), "cut at {k}");
        }
        assert_eq!(decode("#7.abc"), Err(LinkError::Newer(7)));
        assert_eq!(decode("#top"), Err(LinkError::NotALink));
    }

    #[test]
    fn exact_a_bomb_is_not_unfolded() {
        let plain = vec![b' '; 50_000_000];
        let mut bytes = crc32fast::hash(&plain).to_le_bytes().to_vec();
        bytes.extend(miniz_oxide::deflate::compress_to_vec(&plain, 9));
        let link = format!("#1.{}", data_encoding::BASE64URL_NOPAD.encode(&bytes));
        assert_eq!(decode(&link), Err(LinkError::TooLarge));
    }
}
