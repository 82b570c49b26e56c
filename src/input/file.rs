//! A network file's bytes as text.

use std::fs::File;
use std::io::{ErrorKind, Read};
use std::path::Path;

use super::sources::place;
use crate::problems::{Problem, Problems, nearest};

/// Largest file read (bytes); a network of a thousand elements takes an eighth of it.
pub const LARGEST_FILE: u64 = 1 << 20;

/// The text of a file.
pub(super) fn text(path: &Path) -> Result<String, Problems> {
    let name = path.display().to_string();
    let fail = |what: String| Problem::error(name.as_str(), what);
    let open = || -> std::io::Result<_> {
        let meta = std::fs::metadata(path)?;
        if meta.is_dir() {
            return Err(ErrorKind::IsADirectory.into());
        }
        let mut bytes = Vec::new();
        if meta.len() <= LARGEST_FILE {
            // The length of a pipe or a growing file is not known beforehand.
            File::open(path)?
                .take(LARGEST_FILE + 1)
                .read_to_end(&mut bytes)?;
        }
        Ok((meta.len(), bytes))
    };
    let (length, bytes) = open().map_err(|e| match e.kind() {
        ErrorKind::NotFound => missing(path, fail("there is no such file".to_owned())),
        ErrorKind::IsADirectory => {
            fail("this is a directory".to_owned()).hint("name a network file in it")
        }
        ErrorKind::PermissionDenied => fail("reading this file is not permitted".to_owned())
            .hint("ask its owner, or copy it where you may read it"),
        ErrorKind::NotADirectory => fail("there is no such file".to_owned())
            .hint("a part of its path is a file, not a directory"),
        _ => fail(format!("cannot be read: {e}")),
    })?;
    if length > LARGEST_FILE || bytes.len() as u64 > LARGEST_FILE {
        let most = LARGEST_FILE >> 20;
        let what = if length > LARGEST_FILE {
            let size = length as f64 / f64::from(1 << 20);
            format!("the file is {size:.1} MiB, larger than the {most} MiB a network file may be")
        } else {
            format!("more than {most} MiB come from it, larger than a network file may be")
        };
        return Err(fail(what)
            .hint("a network file is a few kilobytes of text")
            .into());
    }
    let text = String::from_utf8(bytes).map_err(|e| {
        let at = e.utf8_error().valid_up_to();
        let bytes = e.into_bytes();
        if bytes.contains(&0) {
            return binary(&name, &bytes);
        }
        let valid = bytes.get(..at).unwrap_or_default();
        let shown = String::from_utf8_lossy(&bytes);
        // The valid front is unchanged by the lossy reading, so the offset holds in both.
        let byte = bytes.get(at).copied().unwrap_or_default();
        let what = format!("byte {byte:#04x} at offset {} is not UTF-8 text", valid.len());
        fail(what)
            .hint("save the file as UTF-8; in an older encoding a degree sign or an umlaut is the usual cause")
            .at(place(&name, &shown, at, at + 1))
    })?;
    if text.contains('\0') {
        return Err(binary(&name, text.as_bytes()).into());
    }
    Ok(text)
}

fn binary(name: &str, bytes: &[u8]) -> Problem {
    let at = bytes.iter().position(|b| *b == 0).unwrap_or_default();
    let problem = Problem::error(
        name,
        format!("the file is not text: it has a zero byte at offset {at}"),
    );
    if bytes.starts_with(&[0xff, 0xfe]) || bytes.starts_with(&[0xfe, 0xff]) {
        problem.hint("it looks like UTF-16; save it as UTF-8")
    } else {
        problem.hint("a network file is TOML text; is this the right file?")
    }
}

/// Adds the name of a like file beside the one that is missing.
fn missing(path: &Path, problem: Problem) -> Problem {
    let folder = match path.parent() {
        Some(p) if !p.as_os_str().is_empty() => p,
        _ => Path::new("."),
    };
    let Ok(entries) = std::fs::read_dir(folder) else {
        return problem.hint(format!("there is no directory {} either", folder.display()));
    };
    let mut names: Vec<String> = entries
        .filter_map(|e| e.ok()?.file_name().into_string().ok())
        .filter(|n| n.ends_with(".toml"))
        .collect();
    names.sort();
    let wanted = path
        .file_name()
        .map(|n| n.to_string_lossy().into_owned())
        .unwrap_or_default();
    match nearest(&wanted, names.iter().map(String::as_str)) {
        Some(meant) => problem.hint(format!("did you mean {}?", folder.join(meant).display())),
        None => problem.hint("check the path"),
    }
}
