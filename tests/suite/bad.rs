//! Wrong files: each mistake in tests/bad has its message beside it, as a user would see it.
//!
//! `UPDATE_EXPECTED=1 cargo test --test suite bad` rewrites the messages; read the difference before you keep it.

mod hostile;

use std::path::{Path, PathBuf};

use dutybank::diagnostic::{Diagnostics, Severity};
use dutybank::read::Document;

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/bad")
}

/// A file of the folder; what the system says of a missing one differs from system to system.
fn load(name: &str) -> std::io::Result<Vec<u8>> {
    std::fs::read(folder().join(name)).map_err(|_| std::io::Error::other("there is no such file"))
}

/// The problems of a text, and the text as far as it could be read.
fn problems(bytes: &[u8]) -> (Diagnostics, String) {
    let document = match Document::parse(bytes) {
        Ok(document) => document,
        Err(rejected) => return (rejected.diagnostics, rejected.text),
    };
    let text = document.text().to_owned();
    let found = document.check(&load).map_or_else(
        |errors| errors,
        |system| {
            let mut cautions = Diagnostics::default();
            system.cautions.into_iter().for_each(|d| cautions.push(d));
            cautions
        },
    );
    (found, text)
}

fn wrong_files() -> Vec<PathBuf> {
    let entries = std::fs::read_dir(folder()).unwrap();
    let mut files: Vec<PathBuf> = entries.map(|entry| entry.unwrap().path()).collect();
    files.retain(|path| path.extension().is_some_and(|end| end == "yaml"));
    files.sort();
    files
}

#[test]
fn every_mistake_is_named_with_its_place_and_a_way_out() {
    let update = std::env::var_os("UPDATE_EXPECTED").is_some();
    let files = wrong_files();
    assert!(files.len() >= 60, "only {} files were found", files.len());
    let mut wrong = Vec::new();
    for path in files {
        let name = path.file_stem().unwrap().to_string_lossy().into_owned();
        let (problems, text) = problems(&std::fs::read(&path).unwrap());
        if problems.list().is_empty() {
            wrong.push(format!("{name}: nothing was found"));
        }
        for d in problems.list() {
            // An empty file has no place to point at.
            if d.place.is_none_or(|place| place.line == 0) && name != "empty" {
                wrong.push(format!("{name}: no place: {}", d.message));
            }
            // "must be above zero" says what would fit.
            if d.help.is_none() && d.label.is_none() && !d.message.contains(" must be ") {
                wrong.push(format!("{name}: no way out: {}", d.message));
            }
            if d.message.ends_with('.') || d.message.contains('\n') {
                wrong.push(format!("{name}: not a title: {}", d.message));
            }
        }
        let rendered = problems.render(&text, &format!("{name}.yaml"), false);
        let expected = path.with_extension("expected");
        if update {
            std::fs::write(&expected, &rendered).unwrap();
        } else if std::fs::read_to_string(&expected).unwrap_or_default() != rendered {
            wrong.push(format!("{name}: the message is another one:\n{rendered}"));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn cautions_do_not_refuse_a_file() {
    for name in [
        "drooping",
        "efficiency_fraction",
        "unused_node",
        "pump_elevation",
    ] {
        let bytes = std::fs::read(folder().join(name).with_extension("yaml")).unwrap();
        let (problems, _) = problems(&bytes);
        let only_caution = matches!(problems.list(), [d] if d.severity == Severity::Caution);
        assert!(only_caution, "{name}: {:?}", problems.list());
    }
}
