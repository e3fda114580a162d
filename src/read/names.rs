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
    let problem = if name.is_empty() || name.trim() != name {
        "is empty or starts or ends with a space"
    } else if name.chars().count() > LONGEST {
        "is too long"
    } else if !name
        .chars()
        .all(|c| c.is_alphanumeric() || "_- ".contains(c))
    {
        "holds a character that a name cannot have"
    } else if name == EVERY || name == "fluid" || name == "site" {
        "has a meaning of its own in `cases`"
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
            format!("the name of {what} `{shown}` {problem}"),
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
                format!("this name of a {what} cannot be used"),
            )
            .help(help),
        );
    }
}
