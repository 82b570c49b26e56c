//! What is left of a table once every key it may have was asked for: keys too many, and too few.

use super::{Fields, Missing, Reader, shown};
use crate::input::document::Value;
use crate::problems::{Problem, listed, nearest};

/// Keys of the whole file.
const TOP: &[&str] = &["title", "search", "feed", "element", "sensor", "exit"];

/// Most unknown keys told of one table.
const MOST: usize = 20;

impl Fields<'_> {
    /// Reports what is missing from a table whose other keys cannot be judged.
    pub fn abandon(self, reader: &mut Reader) {
        for Missing { problem, .. } in self.missing {
            match &self.home {
                Some(mark) => reader.report(mark, problem),
                None => reader.report_subject(problem),
            }
        }
    }

    /// Reports every key that was not asked for, and what is missing.
    pub fn finish(mut self, reader: &mut Reader) {
        let mut unknown = Vec::new();
        for entry in &self.table.entries {
            let key = entry.key.as_str();
            if self.offered.contains(&key) {
                continue;
            }
            // The line has been told of; the key may still be the one that is missing.
            let broken = matches!(entry.node.value, Value::Unread);
            let subject = self.subject(key);
            if let Some(m) = self.misplaced.iter().find(|m| m.key == key && !broken) {
                // The file said so before the override did; the file is not wrong.
                let p = if m.overridden && !entry.mark.is_override() {
                    Problem::warning(subject, format!("is left out, as {}", m.why))
                } else {
                    Problem::error(subject, format!("`{key}` has no meaning here: {}", m.why))
                        .hint(format!("remove `{key}`"))
                };
                reader.report(&entry.mark, p);
                continue;
            }
            let what = format!("{} has no key `{}`", self.what, shown(key));
            let fail = |hint: String| Problem::error(subject.as_str(), &what).hint(hint);
            if let Some((_, holder)) = self.kept.iter().find(|(k, _)| *k == key && !broken) {
                let hint =
                    format!("`{key}` belongs into its {holder}: {holder} = {{ {key} = ... }}");
                reader.report(&entry.mark, fail(hint));
                continue;
            }
            if !self.prefix.is_empty() && TOP.contains(&key) {
                let right = match key {
                    "title" => {
                        "write it above the first [table]: what stands below one belongs to it"
                    }
                    "element" => "write each element under its own [[element]]",
                    "sensor" => "write each sensor under its own [[sensor]]",
                    _ => "write it as a table of its own, under its header in brackets",
                };
                if !broken {
                    reader.report(
                        &entry.mark,
                        fail(format!("`{key}` belongs to the whole file; {right}")),
                    );
                }
                reader.strays.push(key.to_owned());
                continue;
            }
            if unknown.len() > MOST {
                unknown.push((&entry.mark, Problem::error(subject, what)));
                continue;
            }
            let legal = || {
                let misplaced = self.misplaced.iter().map(|m| m.key);
                let kept = self.kept.iter().map(|(key, _)| *key);
                self.offered.iter().copied().chain(misplaced).chain(kept)
            };
            // A key already stated is hardly the one meant.
            let unstated = legal().filter(|k| !self.states(k));
            let meant = nearest(key, unstated).or_else(|| nearest(key, legal()));
            self.missing
                .retain(|m| !m.keys.iter().any(|k| Some(*k) == meant));
            match meant {
                _ if broken => {}
                Some(meant) => {
                    reader.report(&entry.mark, fail(format!("did you mean `{meant}`?")));
                }
                None => unknown.push((&entry.mark, Problem::error(subject, what))),
            }
        }
        if self.prefix.is_empty() {
            let strays = &reader.strays;
            self.missing
                .retain(|m| !m.keys.iter().any(|k| strays.iter().any(|s| s == k)));
        }
        // One key too many and one too few are most likely the same.
        let mut hint = format!("it may have {}", listed(self.offered.iter()));
        if let ([_], [Missing { keys, .. }]) = (unknown.as_slice(), self.missing.as_slice()) {
            let keys = listed(keys.iter().map(|k| format!("`{k}`")));
            hint = format!("is {keys} meant, which {} needs?", self.what);
            self.missing.clear();
        }
        let more = unknown.len().saturating_sub(MOST);
        for (i, (mark, mut problem)) in unknown.into_iter().take(MOST).enumerate() {
            if more > 0 && i + 1 == MOST {
                problem.what += &format!(", nor the {more} unknown ones below it");
            }
            reader.report(mark, problem.hint(hint.as_str()));
        }
        self.abandon(reader);
    }
}
