//! Reads the sources and fails on what the design forbids: imports that run the wrong way, effects outside the
//! command, files grown too long, modules without a header, panics, and words that have no place here.

use std::path::{Path, PathBuf};

/// Longest file, its tests not counted.
const LONGEST: usize = 500;

/// What each module must not see. What is not listed it may.
const FORBIDDEN: [(&str, &[&str]); 7] = [
    (
        "part",
        &[
            "network", "solve", "shift", "study", "read", "output", "cli", "units",
        ],
    ),
    (
        "network",
        &["solve", "shift", "study", "read", "output", "cli", "units"],
    ),
    (
        "solve",
        &["shift", "study", "read", "output", "cli", "units"],
    ),
    ("shift", &["study", "read", "output", "cli"]),
    ("read", &["solve", "study", "output", "cli"]),
    ("study", &["read", "output", "cli"]),
    ("output", &["cli"]),
];

/// Only the command prints, reads the clock, looks at its surroundings or touches files.
const EFFECTS: [&str; 9] = [
    "println!",
    "print!",
    "eprintln!",
    "eprint!",
    "dbg!",
    "std::fs",
    "std::time",
    "std::env",
    "std::process",
];

/// Nothing that a user gives may stop the program this way.
const PANICS: [&str; 8] = [
    "unsafe ",
    "todo!",
    "unimplemented!",
    "unreachable!",
    "panic!",
    ".unwrap()",
    ".expect(",
    ".unwrap_err()",
];

/// File, and the line that stands there all the same, with the reason.
const ALLOWED: [(&str, &str, &str); 1] = [(
    "units/table.rs",
    "panic!(\"the table has no such unit\")",
    "runs while compiling only: a const of the table itself",
)];

/// Words, in two halves so that this file does not hold them.
const WORDS: [(&str, &str); 8] = [
    ("/wo", "rk/"),
    ("/tm", "p/"),
    ("/ro", "ot/"),
    ("loca", "lhost"),
    ("seed doc", "ument"),
    ("helper ", "session"),
    ("issue ", "tracker"),
    ("issue ", "#"),
];

struct Source {
    /// Relative to the folder it was found in, with `/`.
    name: String,
    text: String,
}

impl Source {
    /// Lines before the unit tests at the foot.
    fn body(&self) -> impl Iterator<Item = (usize, &str)> {
        let lines = self.text.lines().enumerate();
        lines
            .take_while(|(_, line)| *line != "#[cfg(test)]")
            .map(|(i, line)| (i + 1, line))
    }

    /// Those of them that are code.
    fn code(&self) -> impl Iterator<Item = (usize, &str)> {
        self.body()
            .filter(|(_, line)| !line.trim_start().starts_with("//"))
    }

    fn module(&self) -> &str {
        let first = self.name.split('/').next().unwrap_or(&self.name);
        first.trim_end_matches(".rs")
    }
}

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

fn files(folder: &str, endings: &[&str]) -> Vec<Source> {
    let base = root().join(folder);
    let mut folders: Vec<PathBuf> = vec![base.clone()];
    let mut sources = Vec::new();
    while let Some(here) = folders.pop() {
        let Ok(entries) = std::fs::read_dir(&here) else {
            continue;
        };
        for entry in entries {
            let path = entry.unwrap().path();
            // what the browser tests install is not ours
            if path.ends_with("node_modules") {
                continue;
            }
            if path.is_dir() {
                folders.push(path);
            } else if path
                .extension()
                .is_some_and(|e| endings.iter().any(|wanted| e == *wanted))
            {
                let name = path.strip_prefix(&base).unwrap().to_str().unwrap();
                // some wrong files are wrong in their bytes
                let text = String::from_utf8_lossy(&std::fs::read(&path).unwrap()).into_owned();
                sources.push(Source {
                    name: name.replace('\\', "/"),
                    text,
                });
            }
        }
    }
    sources.sort_by(|a, b| a.name.cmp(&b.name));
    sources
}

fn sources() -> Vec<Source> {
    let sources = files("src", &["rs"]);
    assert!(sources.len() > 50, "the sources were not found");
    sources
}

fn assert_none(found: Vec<String>, what: &str) {
    assert!(found.is_empty(), "{what}:\n{}", found.join("\n"));
}

#[test]
fn imports_run_one_way() {
    let mut found = Vec::new();
    for source in sources() {
        let Some((_, forbidden)) = FORBIDDEN.iter().find(|(m, _)| *m == source.module()) else {
            continue;
        };
        for (number, line) in source.code() {
            for module in *forbidden {
                let path = format!("crate::{module}");
                let seen = line.match_indices(&path).any(|(at, _)| {
                    let next = line[at + path.len()..].chars().next();
                    !next.is_some_and(|c| c.is_alphanumeric() || c == '_')
                });
                if seen {
                    found.push(format!("{}:{number}: {}", source.name, line.trim()));
                }
            }
        }
    }
    assert_none(found, "forbidden imports");
}

#[test]
fn grouped_imports_do_not_hide_a_module() {
    // `use crate::{..}` would pass the test above unseen.
    let hidden = sources().into_iter().flat_map(|source| {
        let lines: Vec<String> = source
            .code()
            .filter(|(_, line)| line.contains("crate::{") || line.contains("crate::*"))
            .map(|(number, _)| format!("{}:{number}", source.name))
            .collect();
        lines
    });
    assert_none(hidden.collect(), "write one `use crate::module` a line");
}

#[test]
fn only_the_command_has_effects() {
    let mut found = Vec::new();
    for source in sources() {
        if source.module() == "cli" || source.name == "main.rs" {
            continue;
        }
        for (number, line) in source.code() {
            if EFFECTS.iter().any(|effect| line.contains(effect)) {
                found.push(format!("{}:{number}: {}", source.name, line.trim()));
            }
        }
    }
    assert_none(found, "effects outside the command");
}

#[test]
fn nothing_panics_by_intent() {
    let mut found = Vec::new();
    for source in sources() {
        for (number, line) in source.code() {
            let allowed = ALLOWED
                .iter()
                .any(|(file, text, _)| *file == source.name && line.contains(text));
            if !allowed && PANICS.iter().any(|panic| line.contains(panic)) {
                found.push(format!("{}:{number}: {}", source.name, line.trim()));
            }
        }
    }
    assert_none(found, "panics and the like");
}

#[test]
fn what_is_allowed_is_still_there() {
    let sources = sources();
    for (file, text, reason) in ALLOWED {
        let source = sources.iter().find(|source| source.name == file);
        let stands = source.is_some_and(|source| source.text.contains(text));
        assert!(
            stands,
            "{file} no longer has `{text}` ({reason}): take it off the list"
        );
    }
}

#[test]
fn files_stay_short() {
    let long = sources().into_iter().filter_map(|source| {
        let lines = source.body().count();
        (lines > LONGEST).then(|| format!("{}: {lines} lines", source.name))
    });
    assert_none(long.collect(), "split these");
}

#[test]
fn every_module_says_what_it_is_for() {
    let mut all = sources();
    all.extend(files("tests", &["rs"]));
    all.extend(files("benches", &["rs"]));
    let silent = all
        .into_iter()
        .filter(|source| !source.text.starts_with("//!"))
        .map(|source| source.name);
    assert_none(silent.collect(), "no `//!` header");
}

#[test]
fn no_word_of_the_workplace() {
    let mut found = Vec::new();
    for folder in ["src", "tests", "benches", "examples", "networks"] {
        for source in files(folder, &["rs", "yaml", "md", "toml", "py", "csv", "json"]) {
            for (number, line) in source.text.lines().enumerate() {
                let low = line.to_lowercase();
                if WORDS.iter().any(|(a, b)| low.contains(&format!("{a}{b}"))) {
                    found.push(format!("{folder}/{}:{}: {line}", source.name, number + 1));
                }
            }
        }
    }
    assert_none(found, "words of the workplace");
}

#[test]
fn nothing_is_called_by_what_it_is_not() {
    let vague = ["utils", "helpers", "common", "misc"];
    let found = sources().into_iter().filter_map(|source| {
        let parts = source.name.trim_end_matches(".rs").split('/');
        let mut parts = parts.filter(|part| vague.contains(part));
        parts.next().map(|_| source.name.clone())
    });
    assert_none(found.collect(), "say what is in it");
}
