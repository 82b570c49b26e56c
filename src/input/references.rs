//! Stations named by a response: `NAME`, `NAME.in`, `NAME.out`.

use super::document::Mark;
use super::fields::{Pending, Reader, shown};
use crate::elements::Element;
use crate::elements::flame::Reference;
use crate::problems::{Problem, nearest};

/// Reads the form of a reference; whether anything bears the name is asked by [`check`].
pub(super) fn read(
    reader: &mut Reader,
    text: &str,
    mark: &Mark,
    subject: String,
    flame: &str,
) -> Reference {
    let reference = match text.split_once('.') {
        None => Reference::OutletOf(text.to_owned()),
        Some((name, "out")) => Reference::OutletOf(name.to_owned()),
        Some((name, "in")) => Reference::InletOf(name.to_owned()),
        Some((name, side)) => {
            let what = format!("`{}` is no side of an element", shown(side));
            let hint = format!("write {0}.in or {0}.out", shown(name));
            reader.report(mark, Problem::error(subject, what).hint(hint));
            return Reference::OwnInlet;
        }
    };
    reader.references.push(Pending {
        subject,
        mark: mark.clone(),
        flame: flame.to_owned(),
        reference: reference.clone(),
    });
    reference
}

/// Whether each reference names a station that is there, with a remark on one behind its own flame.
pub(super) fn check(reader: &mut Reader, elements: &[Element]) {
    for pending in std::mem::take(&mut reader.references) {
        if let Some(problem) = judge(&pending, elements) {
            reader.report(&pending.mark, problem);
        }
    }
}

fn judge(pending: &Pending, elements: &[Element]) -> Option<Problem> {
    let fail = |what: String| Problem::error(pending.subject.as_str(), what);
    let position = |name: &str| elements.iter().position(|e| e.name == name);
    let flame = position(&pending.flame)?;
    let (name, outlet) = match &pending.reference {
        Reference::OwnInlet => return None,
        Reference::InletOf(name) => (name, false),
        Reference::OutletOf(name) => (name, true),
    };
    let Some(at) = position(name) else {
        let names = || elements.iter().map(|e| e.name.as_str());
        let meant = nearest(name, names());
        // It may well mean an element whose own name could not be used, which has been told.
        if meant.is_none() && names().any(|n| n.starts_with("element.")) {
            return None;
        }
        let problem = fail(match name.as_str() {
            "" => "no station is named".to_owned(),
            _ => format!("nothing is named `{}`", shown(name)),
        });
        return Some(match meant {
            Some(meant) => problem.hint(format!("did you mean `{meant}`?")),
            None => problem.hint(
                "name an element, NAME.in or NAME.out; without reference it is the flame's inlet",
            ),
        });
    };
    if name == "feed" && !outlet {
        return Some(fail("the feed has no inlet".to_owned()).hint("write feed.out"));
    }
    if name == "exit" && outlet {
        return Some(fail("the exit has no outlet".to_owned()).hint("write exit.in"));
    }
    if at == flame && outlet {
        let what = "the response follows the velocity behind its own flame";
        return Some(
            Problem::warning(pending.subject.as_str(), what).hint(format!(
                "write {name}.in for the velocity before it; a bare name is the outlet"
            )),
        );
    }
    // Station k lies between elements k and k+1; the flame begins at station flame-1.
    let downstream =
        if outlet { at > flame } else { at > flame + 1 } || (at == flame + 1 && !outlet);
    downstream.then(|| {
        Problem::warning(
            pending.subject.as_str(),
            format!("the response follows the velocity at `{name}`, downstream of its flame"),
        )
        .hint("a flame usually answers to the velocity upstream of it, at its injector")
    })
}
