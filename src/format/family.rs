//! The formats that there are, and what options and file names call them.

use std::fmt;
use std::path::Path;

use crate::error::{Error, Kind, Result};

/// The formats that are read.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Format {
    /// STL as records of 50 bytes.
    StlBinary,
    /// STL as text.
    StlText,
    /// OBJ.
    Obj,
    /// 3MF: a zip package with an XML model in it.
    ThreeMf,
    /// PLY, text or binary of either byte order.
    Ply,
    /// OFF, as text.
    Off,
    /// glTF 2.0 as one binary file.
    GltfBinary,
    /// glTF 2.0 as JSON, its buffers within or beside it.
    GltfText,
}

/// What a person or a file name can say about a format; the bytes tell the rest.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Family {
    /// STL of either kind.
    Stl,
    /// OBJ.
    Obj,
    /// 3MF.
    ThreeMf,
    /// PLY of any kind.
    Ply,
    /// OFF.
    Off,
    /// glTF of either kind.
    Gltf,
}

impl Format {
    /// The name in JSON and in options, the same for all kinds of a family.
    pub fn name(self) -> &'static str {
        self.family().name()
    }

    /// Whether its numbers are written as text, and so have lines.
    pub fn is_text(self) -> bool {
        matches!(
            self,
            Self::StlText | Self::Obj | Self::ThreeMf | Self::Off | Self::GltfText
        )
    }

    /// The family that it is of.
    pub fn family(self) -> Family {
        match self {
            Self::StlBinary | Self::StlText => Family::Stl,
            Self::Obj => Family::Obj,
            Self::ThreeMf => Family::ThreeMf,
            Self::Ply => Family::Ply,
            Self::Off => Family::Off,
            Self::GltfBinary | Self::GltfText => Family::Gltf,
        }
    }
}

/// In words: "binary STL", "text STL", "OBJ".
impl fmt::Display for Format {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Self::StlBinary => "binary STL",
            Self::StlText => "text STL",
            Self::GltfBinary => "binary glTF",
            other => other.family().title(),
        })
    }
}

impl Family {
    /// Every family, in the order in which they are offered.
    pub const ALL: [Self; 6] = [
        Self::Stl,
        Self::Obj,
        Self::ThreeMf,
        Self::Ply,
        Self::Off,
        Self::Gltf,
    ];

    /// The name in JSON and in options.
    pub fn name(self) -> &'static str {
        match self {
            Self::Stl => "stl",
            Self::Obj => "obj",
            Self::ThreeMf => "3mf",
            Self::Ply => "ply",
            Self::Off => "off",
            Self::Gltf => "gltf",
        }
    }

    /// The name in sentences.
    pub fn title(self) -> &'static str {
        match self {
            Self::Stl => "STL",
            Self::Obj => "OBJ",
            Self::ThreeMf => "3MF",
            Self::Ply => "PLY",
            Self::Off => "OFF",
            Self::Gltf => "glTF",
        }
    }

    /// The family that an option such as `--format stl` names.
    ///
    /// # Errors
    /// `usage`, with the names that there are.
    pub fn from_option(name: &str) -> Result<Self> {
        let found = Self::ALL
            .into_iter()
            .find(|f| f.name().eq_ignore_ascii_case(name));
        found.ok_or_else(|| {
            Error::new(
                Kind::Usage,
                format!("\"{name}\" is not a format that is read"),
                "the formats are stl, obj, 3mf, ply, off and gltf",
            )
        })
    }

    /// The family that a file's ending names, in any case; `.gz` after it is looked through.
    pub fn from_path(path: &Path) -> Option<Self> {
        let ending = path.extension()?.to_str()?;
        if ending.eq_ignore_ascii_case("gz") {
            return Self::from_path(Path::new(path.file_stem()?));
        }
        if ending.eq_ignore_ascii_case("glb") {
            return Some(Self::Gltf);
        }
        Self::ALL
            .into_iter()
            .find(|f| f.name().eq_ignore_ascii_case(ending))
    }
}

/// The name that bodies without one take: the file's, without its ending and without `.gz`;
/// `body` for standard input.
pub fn stem(path: &Path) -> String {
    let stem = |p: &Path| p.file_stem().map(|s| s.to_string_lossy().into_owned());
    let is_packed = path
        .extension()
        .is_some_and(|e| e.eq_ignore_ascii_case("gz"));
    let name = match stem(path) {
        Some(inner) if is_packed && Family::from_path(path).is_some() => stem(Path::new(&inner)),
        other => other,
    };
    name.filter(|s| s != "-").unwrap_or_else(|| "body".into())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn endings_name_families_and_stems() {
        let of = |p: &str| Family::from_path(Path::new(p));
        assert_eq!(of("a/wheel.GLB"), Some(Family::Gltf));
        assert_eq!(of("wheel.3mf"), Some(Family::ThreeMf));
        assert_eq!(of("wheel.ply.gz"), Some(Family::Ply));
        assert_eq!(of("wheel.gz"), None);
        assert_eq!(of(".stl"), None);
        for family in Family::ALL {
            assert_eq!(Family::from_option(family.name()).unwrap(), family);
            assert_eq!(of(&format!("x.{}", family.name())), Some(family));
        }
        assert_eq!(Family::from_option("step").unwrap_err().kind, Kind::Usage);
        assert_eq!(stem(Path::new("a/wheel.v2.stl.gz")), "wheel.v2");
        assert_eq!(stem(Path::new("wheel.stl")), "wheel");
        assert_eq!(stem(Path::new("notes.gz")), "notes");
        assert_eq!(stem(Path::new("-")), "body");
    }
}
