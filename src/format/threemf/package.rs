//! The package around the model: a zip file whose relationships say which part is the model
//! (Open Packaging Conventions, ECMA-376 part 2).

use std::io::{Cursor, Read};

use quick_xml::events::Event;
use zip::ZipArchive;
use zip::result::ZipError;

use super::xml::{self, Reader};
use super::{AGAIN, bad};
use crate::error::{Error, Kind, Result};
use crate::format::gzip::{most, too_large};

/// Most entries of a package. A model with a thousand textures is far below.
const ENTRIES: usize = 1 << 16;
const MODEL: &str = "http://schemas.microsoft.com/3dmanufacturing/2013/01/3dmodel";
const RELATIONSHIPS: &str = "_rels/.rels";

pub(super) struct Package<'a> {
    zip: ZipArchive<Cursor<&'a [u8]>>,
    /// Bytes that may still be unpacked.
    left: u64,
    packed: u64,
}

fn of_zip(e: ZipError, what: &str) -> Error {
    match e {
        ZipError::Io(e) if e.kind() == std::io::ErrorKind::UnexpectedEof => Error::new(
            Kind::Truncated,
            format!("{what} ends before it should"),
            AGAIN,
        ),
        e => bad(format!(
            "{what} is damaged or of a kind that is not read: {e}"
        )),
    }
}

impl<'a> Package<'a> {
    pub(super) fn open(bytes: &'a [u8]) -> Result<Self> {
        let zip = ZipArchive::new(Cursor::new(bytes)).map_err(|e| of_zip(e, "the zip package"))?;
        if zip.len() > ENTRIES {
            return Err(Error::new(
                Kind::TooLarge,
                format!(
                    "the package has {} entries; at most {ENTRIES} are read",
                    zip.len()
                ),
                AGAIN,
            ));
        }
        let packed = bytes.len() as u64;
        Ok(Self {
            zip,
            left: most(packed),
            packed,
        })
    }

    /// Name and text of the model.
    pub(super) fn model(&mut self) -> Result<(String, Vec<u8>)> {
        let Some(relationships) = self.part(RELATIONSHIPS)? else {
            return Err(bad(format!(
                "this zip package has no {RELATIONSHIPS}, which says where the model of a 3MF is"
            )));
        };
        let name = target(&relationships).map_err(|mut e| {
            e.message = format!("{RELATIONSHIPS}: {}", e.message);
            e
        })?;
        match self.part(&name)? {
            Some(text) => Ok((name, text)),
            None => Err(bad(format!(
                "{RELATIONSHIPS} names {name:?} as the model, which is not in the package"
            ))),
        }
    }

    /// The bytes of a part, whose name is compared without regard to the case of ASCII letters.
    fn part(&mut self, name: &str) -> Result<Option<Vec<u8>>> {
        let found = (0..self.zip.len()).find(|&i| {
            let entry = self.zip.name_for_index(i);
            entry.is_some_and(|n| {
                n.is_ok_and(|n| n.trim_start_matches('/').eq_ignore_ascii_case(name))
            })
        });
        let Some(index) = found else { return Ok(None) };
        let what = format!("{name} in the package");
        let file = self.zip.by_index(index).map_err(|e| of_zip(e, &what))?;
        // What it declares as its size is not used: it may say anything.
        let mut out = Vec::new();
        file.take(self.left.saturating_add(1))
            .read_to_end(&mut out)
            .map_err(|e| of_zip(ZipError::Io(e), &what))?;
        let size = out.len() as u64;
        if size > self.left {
            return Err(too_large(self.packed, most(self.packed)));
        }
        self.left -= size;
        Ok(Some(out))
    }
}

/// The part that the relationships of the package name as its model.
fn target(relationships: &[u8]) -> Result<String> {
    let mut reader = Reader::new(xml::utf8(relationships)?);
    let mut found: Option<String> = None;
    loop {
        let event = reader.next()?;
        let (Event::Start(e) | Event::Empty(e)) = &event else {
            if matches!(event, Event::Eof) {
                break;
            }
            continue;
        };
        if e.local_name().into_inner() != "Relationship" {
            continue;
        }
        let (mut kind, mut name, mut external) = (None, None, false);
        reader.attributes(e, |key, value| {
            match key {
                "Type" => kind = Some(value.to_owned()),
                "Target" => name = Some(value.to_owned()),
                "TargetMode" => external = value == "External",
                _ => {}
            }
            Ok(())
        })?;
        if kind.as_deref() != Some(MODEL) {
            continue;
        }
        let Some(name) = name.filter(|_| !external) else {
            return Err(reader.fail(bad("the relationship to the model names no part")));
        };
        if found.is_some() {
            return Err(reader.fail(bad("two relationships say that they name the model")));
        }
        let name = name.trim_start_matches("./").trim_start_matches('/');
        found = Some(name.to_owned());
    }
    found.ok_or_else(|| bad("there is no relationship to a 3D model"))
}
