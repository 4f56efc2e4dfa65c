//! What is done to the built page after Trunk: names of functions are taken out of the module, and the inline script is
//! allowed by its hash instead of by a blanket word.

use std::path::Path;

use base64::Engine;
use base64::engine::general_purpose::STANDARD;
use sha2::{Digest, Sha256};

/// Finishes the page in `folder`.
///
/// # Errors
/// A file that cannot be read or written, a module that is none, or a policy that does not read as expected.
pub fn finish(folder: &Path) -> Result<(), String> {
    let list = std::fs::read_dir(folder).map_err(|e| format!("{}: {e}", folder.display()))?;
    for path in list.filter_map(|entry| entry.ok().map(|e| e.path())) {
        let say = |e: std::io::Error| format!("{}: {e}", path.display());
        if path.extension().is_some_and(|e| e == "wasm") {
            let module = std::fs::read(&path).map_err(say)?;
            let slim = without_names(&module).ok_or(format!("{} is no module", path.display()))?;
            std::fs::write(&path, slim).map_err(say)?;
        }
        if path.file_name().is_some_and(|n| n == "index.html") {
            let text = std::fs::read_to_string(&path).map_err(say)?;
            std::fs::write(&path, hashed(&text)?).map_err(say)?;
        }
    }
    Ok(())
}

/// The module without its custom sections: names for debuggers, who made it.
///
/// Source: WebAssembly core specification, binary format, 5.5.2 and 5.5.3.
fn without_names(module: &[u8]) -> Option<Vec<u8>> {
    const HEAD: usize = 8;
    if module.get(..4)? != b"\0asm" {
        return None;
    }
    let mut out = module.get(..HEAD)?.to_vec();
    let mut at = HEAD;
    while at < module.len() {
        let begin = at;
        let id = *module.get(at)?;
        at += 1;
        // LEB128, at most five bytes.
        let (mut size, mut shift) = (0_usize, 0);
        loop {
            let byte = *module.get(at)?;
            at += 1;
            size |= usize::from(byte & 0x7f).checked_shl(shift)?;
            shift += 7;
            if byte & 0x80 == 0 {
                break;
            }
            if shift > 28 {
                return None;
            }
        }
        let section = module.get(begin..at.checked_add(size)?)?;
        if id != 0 {
            out.extend_from_slice(section);
        }
        at += size;
    }
    Some(out)
}

/// The page with its inline scripts named in the policy by their hashes.
fn hashed(page: &str) -> Result<String, String> {
    const BLANKET: &str = "script-src 'self' 'unsafe-inline'";
    if !page.contains(BLANKET) {
        return Err(format!("index.html has no policy with {BLANKET}"));
    }
    let mut hashes = String::new();
    let mut rest = page;
    while let Some(open) = rest.find("<script") {
        let after = &rest[open..];
        let head = after.find('>').ok_or("a script tag does not end")?;
        let end = after.find("</script>").ok_or("a script does not end")?;
        if !after[..head].contains(" src=") {
            let digest = Sha256::digest(&after.as_bytes()[head + 1..end]);
            hashes.push_str(&format!(" 'sha256-{}'", STANDARD.encode(digest)));
        }
        rest = &after[end..];
    }
    Ok(page.replace(BLANKET, &format!("script-src 'self'{hashes}")))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn exact_custom_sections_are_taken_out() {
        // An empty type section between two custom ones.
        let module = b"\0asm\x01\0\0\0\x00\x03\x01a_\x01\x01\x00\x00\x02\x01b";
        assert_eq!(without_names(module).as_deref(), Some(&b"\0asm\x01\0\0\0\x01\x01\x00"[..]));
        assert_eq!(without_names(b"\0asm\x01\0\0\0\x01\x7f\x00"), None);
        assert_eq!(without_names(b"<html>"), None);
    }

    #[test]
    fn exact_an_inline_script_is_allowed_by_its_hash() {
        // Source of the hash: W3C Content Security Policy Level 2, 7.18, the script `alert('Hello, world.');`.
        let page = "script-src 'self' 'unsafe-inline' 'x'<script>alert('Hello, world.');</script><script src=\"a\"></script>";
        let hash = "'sha256-qznLcsROx4GACP2dm0UCKCzCG+HiZ1guq6ZZDob/Tng='";
        let done = hashed(page).expect("a policy");
        assert!(done.starts_with(&format!("script-src 'self' {hash} 'x'<script>")), "{done}");
        assert!(hashed("<script></script>").is_err());
    }
}
