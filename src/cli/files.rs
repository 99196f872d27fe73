//! Files in and out: with `source`, the only place that touches them.

use crate::diagnostics::{Code, Diagnostic};
use crate::source::{FileId, Loader, MAX_TEXT_BYTES, SourceMap, Span};
use std::ffi::OsString;
use std::io::{self, BufWriter, Read as _, Write};
use std::path::{Path, PathBuf};

/// The name of standard input and standard output.
pub(super) const STANDARD: &str = "-";

/// The most places of a text that are told as no UTF-8: such a file is mostly no text at all.
const MAX_BAD_PLACES: usize = 20;

/// The file system.
pub(super) struct FileSystem;

impl Loader for FileSystem {
    fn load(&self, path: &Path) -> io::Result<Vec<u8>> {
        std::fs::read(path)
    }

    fn identity(&self, path: &Path) -> PathBuf {
        std::fs::canonicalize(path).unwrap_or_else(|_| path.to_path_buf())
    }
}

/// A file to work on.
pub(super) struct Input {
    /// Its place among the sources.
    pub(super) id: FileId,
    /// A diagnostic for each stretch that is no UTF-8; in the text it stands as U+FFFD.
    pub(super) unreadable: Vec<Diagnostic>,
}

/// Reads a file, or standard input for `-`.
///
/// # Errors
///
/// Why it can't be read, as a diagnostic without a place.
pub(super) fn read(path: &str, sources: &mut SourceMap) -> Result<Input, Diagnostic> {
    let mut bytes = Vec::new();
    let fail =
        |what: &str, e: &io::Error| Diagnostic::new(Code::UseNotFound, format!("{what} can't be read: {}", reason(e)));
    if path == STANDARD {
        io::stdin()
            .lock()
            .take(MAX_TEXT_BYTES as u64 + 1)
            .read_to_end(&mut bytes)
            .map_err(|e| fail("standard input", &e))?;
    } else {
        // A device may never end: no more is read than a run can take.
        let file = std::fs::File::open(path).map_err(|e| fail(&format!("`{path}`"), &e))?;
        file.take(MAX_TEXT_BYTES as u64 + 1).read_to_end(&mut bytes).map_err(|e| fail(&format!("`{path}`"), &e))?;
    }
    let (text, bad) = decode(bytes);
    let id = sources.add(path, text).ok_or_else(|| {
        Diagnostic::new(Code::LimitReached, format!("`{path}` is longer than the {MAX_TEXT_BYTES} bytes of one run"))
            .help("split it, and check the parts each on its own")
    })?;
    let base = sources.file(id).base;
    let told = bad.into_iter().map(|at| {
        Diagnostic::new(Code::Syntax, "this is not UTF-8")
            .label(Span::new(base + at, base + at + 3), "no character in UTF-8 begins like this")
            .help("save the file in UTF-8")
    });
    Ok(Input { id, unreadable: told.collect() })
}

/// The text, with U+FFFD for what is no UTF-8, and where those stand.
fn decode(bytes: Vec<u8>) -> (String, Vec<u32>) {
    let bytes = match String::from_utf8(bytes) {
        Ok(text) => return (text, Vec::new()),
        Err(error) => error.into_bytes(),
    };
    let (mut text, mut bad) = (String::with_capacity(bytes.len()), Vec::new());
    for chunk in bytes.utf8_chunks() {
        text.push_str(chunk.valid());
        if !chunk.invalid().is_empty() {
            if bad.len() < MAX_BAD_PLACES {
                bad.push(text.len() as u32);
            }
            text.push(char::REPLACEMENT_CHARACTER);
        }
    }
    (text, bad)
}

/// What the system says, without its number.
fn reason(error: &io::Error) -> String {
    let text = error.to_string();
    let text = text.split(" (os error").next().unwrap_or_default();
    let mut letters = text.chars();
    letters.next().map_or_else(String::new, |first| first.to_lowercase().chain(letters).collect())
}

/// Where results go.
pub(super) enum Destination {
    /// Standard output.
    Standard(BufWriter<io::StdoutLock<'static>>),
    /// A pipe, a device or the like, which can't be replaced.
    Direct(BufWriter<std::fs::File>),
    /// A new file beside the one to be replaced; it takes its name at the end.
    Whole(Replacement),
}

/// A file in the making.
pub(super) struct Replacement {
    out: BufWriter<std::fs::File>,
    temporary: PathBuf,
    target: PathBuf,
    finished: bool,
}

impl Destination {
    /// Opens `path`, or standard output for none and for `-`.
    ///
    /// # Errors
    ///
    /// Why it can't be written, in a sentence.
    pub(super) fn open(path: Option<&Path>) -> Result<Self, String> {
        let Some(path) = path.filter(|p| *p != Path::new(STANDARD)) else {
            return Ok(Self::Standard(BufWriter::with_capacity(1 << 16, io::stdout().lock())));
        };
        let fail = |e: io::Error| format!("can't write `{}`: {}", path.display(), reason(&e));
        // Where the name is a link, what it leads to is replaced and not the link.
        let target = std::fs::canonicalize(path).unwrap_or_else(|_| path.to_path_buf());
        let known = std::fs::metadata(&target).ok();
        if known.as_ref().is_some_and(std::fs::Metadata::is_dir) {
            return Err(format!("can't write `{}`: it is a folder", path.display()));
        }
        if known.as_ref().is_some_and(|m| !m.is_file()) {
            let file = std::fs::OpenOptions::new().write(true).open(&target).map_err(fail)?;
            return Ok(Self::Direct(BufWriter::new(file)));
        }
        let mut name = OsString::from(".");
        name.push(target.file_name().ok_or_else(|| format!("can't write `{}`: it names no file", path.display()))?);
        name.push(format!(".{}.part", std::process::id()));
        let temporary = target.with_file_name(name);
        let file = std::fs::File::create(&temporary).map_err(fail)?;
        let out = BufWriter::with_capacity(1 << 16, file);
        let made = Replacement { out, temporary, target, finished: false };
        if let Some(known) = known {
            std::fs::set_permissions(&made.temporary, known.permissions()).map_err(fail)?;
        }
        Ok(Self::Whole(made))
    }

    /// The end: everything is written, and a new file takes its name.
    ///
    /// # Errors
    ///
    /// What the system says; a file to be replaced is as it was.
    pub(super) fn finish(self) -> io::Result<()> {
        match self {
            Self::Standard(mut out) => out.flush(),
            Self::Direct(mut out) => out.flush(),
            Self::Whole(mut made) => {
                made.out.flush()?;
                made.out.get_ref().sync_all()?;
                std::fs::rename(&made.temporary, &made.target)?;
                made.finished = true;
                Ok(())
            }
        }
    }
}

impl Drop for Replacement {
    fn drop(&mut self) {
        if !self.finished {
            // Nothing can be done about a failure here; what matters is that the target is untouched.
            let _ = std::fs::remove_file(&self.temporary);
        }
    }
}

impl Write for Destination {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        match self {
            Self::Standard(out) => out.write(bytes),
            Self::Direct(out) => out.write(bytes),
            Self::Whole(made) => made.out.write(bytes),
        }
    }

    fn flush(&mut self) -> io::Result<()> {
        match self {
            Self::Standard(out) => out.flush(),
            Self::Direct(out) => out.flush(),
            Self::Whole(made) => made.out.flush(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::decode;

    #[test]
    fn what_is_no_utf8_is_replaced_and_found() {
        assert_eq!(decode(b"a\n".to_vec()), ("a\n".to_owned(), vec![]));
        assert_eq!(decode(b"a\xffb\xc3(".to_vec()), ("a\u{fffd}b\u{fffd}(".to_owned(), vec![1, 5]));
        assert_eq!(decode(vec![0xff; 1000]).1.len(), 20);
    }
}
