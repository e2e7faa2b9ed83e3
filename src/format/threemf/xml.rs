//! XML as 3MF allows it: UTF-8, no document type, no entities but XML's own.

use quick_xml::XmlVersion;
use quick_xml::escape::resolve_predefined_entity;
use quick_xml::events::{BytesStart, Event};

use super::{AGAIN, bad};
use crate::error::{Error, Kind, Result};

/// The text, if it is UTF-8.
pub(super) fn utf8(bytes: &[u8]) -> Result<&str> {
    if bytes.starts_with(b"\xff\xfe") || bytes.starts_with(b"\xfe\xff") {
        return Err(bad("its XML is UTF-16, and UTF-8 is read"));
    }
    let bytes = bytes.strip_prefix(b"\xef\xbb\xbf").unwrap_or(bytes);
    std::str::from_utf8(bytes).map_err(|e| {
        let line = 1 + memchr::memchr_iter(b'\n', &bytes[..e.valid_up_to()]).count() as u64;
        bad("its XML is not UTF-8").at_line(line)
    })
}

/// Events one by one, with the line of the last one for errors.
pub(super) struct Reader<'a> {
    text: &'a str,
    inner: quick_xml::Reader<&'a [u8]>,
    /// Where the last event began.
    at: u64,
    depth: u32,
}

impl<'a> Reader<'a> {
    pub(super) fn new(text: &'a str) -> Self {
        Self {
            text,
            inner: quick_xml::Reader::from_str(text),
            at: 0,
            depth: 0,
        }
    }

    /// The line of the last event, from 1.
    pub(super) fn line(&self) -> u64 {
        self.line_of(self.at)
    }

    fn line_of(&self, at: u64) -> u64 {
        let end = usize::try_from(at).map_or(self.text.len(), |n| n.min(self.text.len()));
        1 + memchr::memchr_iter(b'\n', &self.text.as_bytes()[..end]).count() as u64
    }

    /// The error, at the line of the last event.
    pub(super) fn fail(&self, error: Error) -> Error {
        if error.line.is_some() {
            return error;
        }
        error.at_line(self.line())
    }

    /// The next event.
    pub(super) fn next(&mut self) -> Result<Event<'a>> {
        self.at = self.inner.buffer_position();
        let event = self.inner.read_event().map_err(|e| {
            let at = self.inner.error_position();
            bad(format!("its XML is not well formed: {e}")).at_line(self.line_of(at))
        })?;
        match &event {
            Event::DocType(_) => {
                return Err(self.fail(bad("its XML has a document type, which 3MF does not allow")));
            }
            Event::GeneralRef(e) => {
                let known = match e.resolve_char_ref() {
                    Ok(Some(_)) => true,
                    Ok(None) => resolve_predefined_entity(&e.xml10_content()).is_some(),
                    Err(_) => false,
                };
                if !known {
                    return Err(self.fail(bad("its XML has an entity that XML does not define")));
                }
            }
            Event::Decl(e) => {
                let other = match e.encoding() {
                    Some(Ok(name)) => !name.eq_ignore_ascii_case("utf-8"),
                    Some(Err(_)) => true,
                    None => false,
                };
                if other {
                    return Err(self.fail(bad("its XML declares another encoding than UTF-8")));
                }
            }
            Event::Start(_) => self.depth += 1,
            Event::End(_) => self.depth = self.depth.saturating_sub(1),
            Event::Eof if self.depth > 0 => {
                return Err(self.fail(Error::new(
                    Kind::Truncated,
                    "its XML ends before its last element does",
                    AGAIN,
                )));
            }
            _ => {}
        }
        Ok(event)
    }

    /// Goes past an element that was begun, with all that is in it. Everything in it is still held
    /// to the rules of XML.
    pub(super) fn skip(&mut self) -> Result<()> {
        let outside = self.depth.saturating_sub(1);
        while self.depth > outside {
            self.next()?;
        }
        Ok(())
    }

    /// Hands each attribute of a tag over, its value as XML normalises it and without blanks around
    /// it.
    pub(super) fn attributes(
        &self,
        e: &BytesStart<'_>,
        mut each: impl FnMut(&str, &str) -> Result<()>,
    ) -> Result<()> {
        let mut all = e.attributes();
        // Keys that are looked at are compared by whoever takes them; the check takes memory.
        for attribute in all.with_checks(false) {
            let attribute = attribute
                .map_err(|e| self.fail(bad(format!("its XML is not well formed: {e}"))))?;
            let value = attribute
                .normalized_value(XmlVersion::Implicit1_0)
                .map_err(|e| self.fail(bad(format!("its XML is not well formed: {e}"))))?;
            each(attribute.key.into_inner(), value.trim()).map_err(|e| self.fail(e))?;
        }
        Ok(())
    }
}
