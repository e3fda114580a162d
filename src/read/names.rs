//! What a name may look like.

use super::context::Context;
use super::yaml::Key;
use crate::diagnostic::Diagnostic;

const LONGEST: usize = 80;

/// A word that stands for every part that has a key; see `cases`.
pub(super) const EVERY: &str = "all";

/// Letters of any language, digits, `_`, `-` and inner spaces; dots number the members of a bank.
pub(super) fn check(cx: &mut Context, key: &Key, what: &str) {
    let name = &key.name;
    let shown: String = name.chars().take(24).collect();
    let strange = |c: &char| !(c.is_alphanumeric() || "_- ".contains(*c));
    let problem = if name.is_empty() {
        "is empty".to_owned()
    } else if name.trim() != name {
        "starts or ends with a space".to_owned()
    } else if name.chars().count() > LONGEST {
        "is too long".to_owned()
    } else if let Some(c) = name.chars().find(strange) {
        match c {
            '.' => "holds a dot, which numbers the members of a bank".to_owned(),
            c => format!("holds `{}`", c.escape_debug()),
        }
    } else if name == EVERY || name == "fluid" || name == "site" {
        "has a meaning of its own in `cases`".to_owned()
    } else {
        return;
    };
    let help = format!(
        "names are made of letters, digits, `_`, `-` and inner spaces, at most {LONGEST} of them; \
         `{EVERY}`, `fluid` and `site` are taken"
    );
    cx.push(
        Diagnostic::error(
            "name",
            key.place,
            format!("the name `{shown}` of this {what} {problem}"),
        )
        .help(help),
    );
}

/// A name that is only shown, never part of a path: any text on one line.
pub(super) fn check_label(cx: &mut Context, key: &Key, what: &str) {
    let name = &key.name;
    if name.trim().is_empty()
        || name.chars().any(char::is_control)
        || name.chars().count() > LONGEST
    {
        let help = format!("a name here is any text on one line of at most {LONGEST} characters");
        cx.push(
            Diagnostic::error(
                "name",
                key.place,
                format!("the name of this {what} cannot be used"),
            )
            .help(help),
        );
    }
}
