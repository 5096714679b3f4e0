//! What a model is read from: a file or a stream, hashed on the way.

use std::fs::File;
use std::io::{self, Read};
use std::path::Path;
use std::sync::Arc;

use sha2::{Digest, Sha256};

use super::InputFile;
use super::fault::{Fault, FaultKind, ModelError, Place};
use super::source::hexadecimal;

/// Bytes at the beginning that can be looked at before they are read.
const HEAD: u64 = 1 << 16;

/// A source of bytes. One that fails reads like one that ends; [`Input::finish`], which every reader's caller calls, says
/// that it failed.
pub(super) struct Input<'a> {
    name: String,
    source: Box<dyn Read + 'a>,
    head: Vec<u8>,
    /// How much of the head is read.
    at: usize,
    hash: Sha256,
    failure: Option<io::Error>,
}

impl Input<'static> {
    /// Opens a file.
    pub(super) fn open(path: &Path) -> Result<Self, ModelError> {
        let file = File::open(path).map_err(|source| ModelError::Read { path: path.to_owned(), source })?;
        Ok(Self::new(file, path.display().to_string()))
    }
}

impl<'a> Input<'a> {
    /// Reads from any source, by a name for messages.
    pub(super) fn new(source: impl Read + 'a, name: String) -> Self {
        let mut source: Box<dyn Read + 'a> = Box::new(source);
        let mut head = Vec::new();
        let failure = source.by_ref().take(HEAD).read_to_end(&mut head).err();
        Self { name, source, head, at: 0, hash: Sha256::new(), failure }
    }

    /// The name of the source.
    pub(super) fn name(&self) -> &str {
        &self.name
    }

    /// The beginning, or all if it is short.
    pub(super) fn head(&self) -> &[u8] {
        &self.head
    }

    /// All of it.
    pub(super) fn whole(&mut self) -> Vec<u8> {
        let mut bytes = Vec::new();
        // Reading never fails here; see `finish`.
        let _length = self.read_to_end(&mut bytes);
        bytes
    }

    /// Reads what is left, so that all of it is hashed.
    ///
    /// # Errors
    /// The system's reason, if the source failed.
    pub(super) fn finish(mut self) -> Result<InputFile, ModelError> {
        let copied = io::copy(&mut self, &mut io::sink());
        match self.failure.take().or(copied.err()) {
            Some(source) => Err(ModelError::Read { path: self.name.into(), source }),
            None => Ok(InputFile { file: self.name, sha256: hexadecimal(self.hash) }),
        }
    }
}

impl Read for Input<'_> {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let mut head = &self.head[self.at..];
        let read = if head.is_empty() && self.failure.is_none() {
            loop {
                match self.source.read(buffer) {
                    Ok(read) => break read,
                    Err(error) if error.kind() == io::ErrorKind::Interrupted => {}
                    Err(error) => {
                        self.failure = Some(error);
                        break 0;
                    }
                }
            }
        } else {
            let read = head.read(buffer)?;
            self.at += read;
            read
        };
        self.hash.update(&buffer[..read]);
        Ok(read)
    }
}

/// Bytes as text.
///
/// # Errors
/// The line that is none.
pub(super) fn as_text<'b>(bytes: &'b [u8], file: &str) -> Result<&'b str, ModelError> {
    std::str::from_utf8(bytes).map_err(|error| {
        let line = bytes[..error.valid_up_to()].iter().filter(|byte| **byte == b'\n').count() as u64 + 1;
        let place = Place { file: Some(Arc::from(file)), line: Some(line) };
        let remedy = "save the file as UTF-8";
        ModelError::Faulty(vec![Fault::new(FaultKind::Syntax, place, "the file is not UTF-8 text", remedy)])
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Gives some bytes, interrupted every other time, and then fails.
    struct Failing {
        calls: u64,
        given: usize,
    }

    impl Read for Failing {
        fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
            self.calls += 1;
            if self.calls.is_multiple_of(2) {
                return Err(io::ErrorKind::Interrupted.into());
            }
            if self.given > 100_000 {
                return Err(io::Error::other("the line is dead"));
            }
            self.given += buffer.len();
            buffer.fill(b'a');
            Ok(buffer.len())
        }
    }

    #[test]
    fn a_source_is_read_whole_and_hashed() {
        let text = "0123456789".repeat(20_000);
        let mut input = Input::new(text.as_bytes(), "text".to_owned());
        assert_eq!(input.head().len() as u64, HEAD);
        assert_eq!(input.whole(), text.as_bytes());
        let read = input.finish().unwrap();
        assert_eq!(read.sha256, hexadecimal(Sha256::new_with_prefix(&text)));
        // What nobody reads is hashed as well.
        assert_eq!(Input::new(text.as_bytes(), "text".to_owned()).finish().unwrap(), read);
        // FIPS 180-4 examples, from memory: the hash of "abc".
        let abc = Input::new(b"abc".as_slice(), String::new()).finish().unwrap().sha256;
        assert_eq!(abc, "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    }

    #[test]
    fn a_source_that_fails_says_so_at_the_end() {
        let mut input = Input::new(Failing { calls: 0, given: 0 }, "wire".to_owned());
        assert!(input.whole().len() > 100_000);
        let error = input.finish().unwrap_err().to_string();
        assert!(error.contains("wire: the line is dead"), "{error}");
    }
}
