//! Texts and places in them.
//!
//! Every text that a run reads gets a stretch of one address space of bytes, so that a [`Span`] is two numbers and
//! says by itself which file it lies in. Meaning is no business of this room.

use std::path::{Path, PathBuf};
use std::sync::{Arc, OnceLock};

/// A stretch of text: byte positions in the address space of one [`SourceMap`], the end excluded.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Span {
    /// Position of the first byte.
    pub start: u32,
    /// Position after the last byte.
    pub end: u32,
}

impl Span {
    /// The span of what stands in no text, such as a setting on the command line.
    pub const NONE: Self = Self { start: u32::MAX, end: u32::MAX };

    /// The span from `start` to `end`, the end excluded.
    pub const fn new(start: u32, end: u32) -> Self {
        Self { start, end }
    }

    /// The smallest span that covers both.
    #[must_use]
    pub fn to(self, other: Self) -> Self {
        Self { start: self.start.min(other.start), end: self.end.max(other.end) }
    }

    /// Length in bytes.
    pub const fn len(self) -> usize {
        (self.end - self.start) as usize
    }

    /// Whether nothing lies between start and end.
    pub const fn is_empty(self) -> bool {
        self.start == self.end
    }
}

/// Which text of a [`SourceMap`]; counts from 0 in the order in which they were added.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct FileId(pub u32);

/// One text with the name under which it is told to people.
#[derive(Debug)]
pub struct File {
    /// The path as the user wrote it, or as it follows from a `use`; `-` for standard input.
    pub name: String,
    /// The whole text.
    pub text: Arc<str>,
    /// Where the text begins in the address space.
    pub base: u32,
    lines: OnceLock<Vec<u32>>,
}

impl File {
    /// Byte offsets of the line starts, relative to this text; made at the first call.
    fn lines(&self) -> &[u32] {
        self.lines.get_or_init(|| {
            let ends = self.text.bytes().enumerate().filter(|&(_, b)| b == b'\n').map(|(i, _)| i as u32 + 1);
            std::iter::once(0).chain(ends).collect()
        })
    }

    /// Number of the line, from 0, that holds the byte at `offset` of this text.
    pub fn line_index(&self, offset: u32) -> usize {
        self.lines().partition_point(|&start| start <= offset) - 1
    }

    /// Text of the line with number `index` (from 0), without its line end.
    pub fn line_text(&self, index: usize) -> &str {
        let lines = self.lines();
        let start = lines.get(index).map_or(self.text.len(), |&s| s as usize);
        let end = lines.get(index + 1).map_or(self.text.len(), |&s| s as usize);
        self.text[start..end].trim_end_matches(['\n', '\r'])
    }

    /// Byte offset, in this text, at which the line with number `index` (from 0) begins.
    pub fn line_start(&self, index: usize) -> u32 {
        self.lines().get(index).copied().unwrap_or(self.text.len() as u32)
    }
}

/// A place as it is told to people: lines and columns count from 1, columns and lengths in Unicode scalar values.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Place<'a> {
    /// Name of the file.
    pub file: &'a str,
    /// Line, from 1.
    pub line: usize,
    /// Column, from 1.
    pub column: usize,
    /// Length in scalar values, of the part that lies on any line (line breaks count).
    pub length: usize,
}

/// The most bytes of text that one run reads: positions are 32-bit numbers.
pub const MAX_TEXT_BYTES: usize = 2_000_000_000;

/// All the texts of one run.
#[derive(Debug, Default)]
pub struct SourceMap {
    files: Vec<File>,
}

impl SourceMap {
    /// An empty map.
    pub fn new() -> Self {
        Self::default()
    }

    /// Adds a text and tells its number, or `None` where all texts together would pass [`MAX_TEXT_BYTES`].
    ///
    /// One byte of address space stays free after each text, so that a span at its very end is not taken for the
    /// next text's.
    pub fn add(&mut self, name: impl Into<String>, text: impl Into<Arc<str>>) -> Option<FileId> {
        let text = text.into();
        let base = self.files.last().map_or(0, |f| f.base as usize + f.text.len() + 1);
        if base + text.len() > MAX_TEXT_BYTES {
            return None;
        }
        let id = FileId(self.files.len() as u32);
        self.files.push(File { name: name.into(), text, base: base as u32, lines: OnceLock::new() });
        Some(id)
    }

    /// The text with this number.
    pub fn file(&self, id: FileId) -> &File {
        &self.files[id.0 as usize]
    }

    /// All texts, in the order in which they were added.
    pub fn files(&self) -> &[File] {
        &self.files
    }

    /// The text in which a span lies, or `None` for [`Span::NONE`].
    pub fn file_of(&self, span: Span) -> Option<&File> {
        if span == Span::NONE {
            return None;
        }
        let after = self.files.partition_point(|f| f.base <= span.start);
        after.checked_sub(1).map(|i| &self.files[i])
    }

    /// The text that a span covers; empty for [`Span::NONE`].
    pub fn text(&self, span: Span) -> &str {
        self.file_of(span).map_or("", |f| {
            let start = (span.start - f.base) as usize;
            let end = ((span.end - f.base) as usize).min(f.text.len());
            f.text.get(start..end).unwrap_or("")
        })
    }

    /// The place of a span as it is told to people, or `None` for [`Span::NONE`].
    pub fn place(&self, span: Span) -> Option<Place<'_>> {
        let file = self.file_of(span)?;
        let start = (span.start - file.base).min(file.text.len() as u32);
        let line = file.line_index(start);
        let before = file.text.get(file.line_start(line) as usize..start as usize).unwrap_or("");
        let before = if line == 0 { before.trim_start_matches('\u{feff}') } else { before };
        let length = self.text(span).chars().count();
        Some(Place { file: &file.name, line: line + 1, column: before.chars().count() + 1, length })
    }
}

/// Where texts come from: the file system for the command line, a table in tests.
pub trait Loader {
    /// The bytes of the text at `path`.
    ///
    /// # Errors
    ///
    /// Whatever the place it reads from says, such as "not found".
    fn load(&self, path: &Path) -> std::io::Result<Vec<u8>>;

    /// One spelling for all paths to the same text, so that a circle of `use` is found; `path` itself by default.
    fn identity(&self, path: &Path) -> PathBuf {
        path.to_path_buf()
    }
}
