//! Files and streams: read whole, written whole or not at all.

use std::io::{Read, Write};
use std::path::{Path, PathBuf};

use super::Failure;
use super::args::ChangeOptions;
use crate::diagnostic::Diagnostics;
use crate::read::{Change, Document, LARGEST, Load};

/// A system file that has been read.
pub(super) struct Input {
    pub document: Document,
    /// How the user calls it.
    pub name: String,
    /// Where files that it names are looked for.
    folder: PathBuf,
}

impl Input {
    pub fn open(file: &Path) -> Result<Self, Failure> {
        let standard_input = file == Path::new("-");
        let name = if standard_input {
            "standard input".to_owned()
        } else {
            file.display().to_string()
        };
        let bytes = if standard_input {
            read_limited(std::io::stdin().lock())
        } else {
            std::fs::File::open(file).and_then(read_limited)
        };
        let bytes =
            bytes.map_err(|why| Failure::Broken(format!("{name} cannot be read: {why}")))?;
        let folder = if standard_input { None } else { file.parent() };
        let folder = folder.map_or_else(|| PathBuf::from("."), Path::to_path_buf);
        match Document::parse(&bytes) {
            Ok(document) => Ok(Self {
                document,
                name,
                folder,
            }),
            Err(rejected) => Err(problems(&rejected.diagnostics, &rejected.text, &name)),
        }
    }

    /// Fetches files that the system file names.
    pub fn with_load<T>(&self, use_it: impl FnOnce(Load) -> T) -> T {
        use_it(&|name: &str| std::fs::File::open(self.folder.join(name)).and_then(read_limited))
    }

    pub fn rejected(&self, diagnostics: &Diagnostics) -> Failure {
        problems(diagnostics, self.document.text(), &self.name)
    }

    /// The changes of a case of the file.
    pub fn case(&self, name: &str) -> Result<Vec<Change>, Failure> {
        let cases = self
            .document
            .cases()
            .map_err(|diagnostics| self.rejected(&diagnostics))?;
        let names: Vec<String> = cases
            .iter()
            .map(|case| format!("`{}`", case.name))
            .collect();
        cases
            .into_iter()
            .find(|case| case.name == name)
            .map(|case| case.changes)
            .ok_or_else(|| {
                let known = if names.is_empty() {
                    "it has none".to_owned()
                } else {
                    format!("it has {}", names.join(", "))
                };
                Failure::Broken(format!("{} has no case `{name}`; {known}", self.name))
            })
    }

    /// The changes that the command line asks for, the case first.
    pub fn changes(&self, options: &ChangeOptions) -> Result<Vec<Change>, Failure> {
        let mut changes = match &options.case {
            Some(case) => self.case(case)?,
            None => Vec::new(),
        };
        for (option, key, pairs) in [
            ("--speed", Some("speed"), &options.speed),
            ("--level", Some("level"), &options.level),
            ("--set", None, &options.set),
        ] {
            for pair in pairs {
                let Some((path, value)) = pair.split_once('=') else {
                    let message = format!("{option} wants NAME=VALUE, found `{pair}`");
                    return Err(Failure::Broken(message));
                };
                let (path, value) = (path.trim(), value.trim());
                let path = key.map_or_else(|| path.to_owned(), |key| format!("{path}.{key}"));
                changes.push(Change::new(&path, value));
            }
        }
        Ok(changes)
    }
}

/// Reads all, but no more than a system file may have: an endless stream must not fill the memory.
fn read_limited(source: impl Read) -> std::io::Result<Vec<u8>> {
    let mut bytes = Vec::new();
    source.take(LARGEST as u64 + 1).read_to_end(&mut bytes)?;
    Ok(bytes)
}

fn problems(diagnostics: &Diagnostics, text: &str, name: &str) -> Failure {
    Failure::Broken(diagnostics.render(text, name, colour_on_standard_error()))
}

/// Colour where standard error is a terminal that wants it.
pub(super) fn colour_on_standard_error() -> bool {
    anstream::AutoStream::choice(&std::io::stderr()) != anstream::ColorChoice::Never
}

/// Prints to standard output.
pub(super) fn print(text: &str) -> Result<(), Failure> {
    let mut out = std::io::stdout().lock();
    out.write_all(text.as_bytes())
        .and_then(|()| out.flush())
        .map_err(|why| match why.kind() {
            std::io::ErrorKind::BrokenPipe => Failure::PipeClosed,
            _ => Failure::Broken(format!("standard output cannot be written: {why}")),
        })
}

/// Prints to standard error; where that fails there is nobody to tell.
pub(super) fn complain(message: &str) {
    let _ = writeln!(std::io::stderr().lock(), "{}", message.trim_end());
}

/// Output files that are opened before the work and appear whole at the end, or not at all.
pub(super) struct Pending {
    path: PathBuf,
    file: tempfile::NamedTempFile,
}

impl Pending {
    pub fn open(path: &Path) -> Result<Self, Failure> {
        let folder = match path.parent() {
            Some(folder) if folder != Path::new("") => folder,
            _ => Path::new("."),
        };
        let file = tempfile::NamedTempFile::new_in(folder).map_err(|why| {
            Failure::Broken(format!("{} cannot be written: {why}", path.display()))
        })?;
        Ok(Self {
            path: path.to_path_buf(),
            file,
        })
    }

    pub fn write_whole(mut self, bytes: &[u8]) -> Result<(), Failure> {
        let written = self.file.write_all(bytes).and_then(|()| self.file.flush());
        written.map_err(|why| self.broken(&why))?;
        self.place()
    }

    /// Puts what was written in its place.
    pub fn place(self) -> Result<(), Failure> {
        readable_by_all(&self.file);
        let path = self.path;
        let placed = self.file.persist(&path);
        placed
            .map(|_| ())
            .map_err(|why| cannot_write(&path, &why.error))
    }

    fn broken(&self, why: &std::io::Error) -> Failure {
        cannot_write(&self.path, why)
    }
}

impl Write for Pending {
    fn write(&mut self, bytes: &[u8]) -> std::io::Result<usize> {
        self.file.write(bytes)
    }

    fn flush(&mut self) -> std::io::Result<()> {
        self.file.flush()
    }
}

fn cannot_write(path: &Path, why: &std::io::Error) -> Failure {
    Failure::Broken(format!("{} cannot be written: {why}", path.display()))
}

/// Temporary files are private; results are files like any other.
#[cfg(unix)]
fn readable_by_all(file: &tempfile::NamedTempFile) {
    use std::os::unix::fs::PermissionsExt;
    // A file with narrower rights is still a result.
    let _ = file
        .as_file()
        .set_permissions(std::fs::Permissions::from_mode(0o644));
}

#[cfg(not(unix))]
fn readable_by_all(_: &tempfile::NamedTempFile) {}
