//! The columns of the table: one row a body.

use serde::{Deserialize, Serialize};

/// What a column holds; any cell may be empty.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Holds {
    /// UTF-8 text.
    Text,
    /// A whole number, not negative.
    Count,
    /// An f64.
    Real,
    /// True or false.
    Flag,
}

/// A column of the table.
#[derive(Clone, Copy, Debug)]
pub struct Column {
    /// Its name, with the unit of a quantity at its end.
    pub name: &'static str,
    /// What it holds.
    pub holds: Holds,
    /// Symbol of the unit; empty for what has none.
    pub unit: &'static str,
    /// What it means.
    pub meaning: &'static str,
}

/// One cell.
#[derive(Clone, Debug, PartialEq)]
pub enum Cell {
    /// Of [`Holds::Text`].
    Text(Option<String>),
    /// Of [`Holds::Count`].
    Count(Option<u64>),
    /// Of [`Holds::Real`].
    Real(Option<f64>),
    /// Of [`Holds::Flag`].
    Flag(Option<bool>),
}

macro_rules! of_kind {
    (Text) => { Option<String> };
    (Count) => { Option<u64> };
    (Real) => { Option<f64> };
    (Flag) => { Option<bool> };
}

macro_rules! columns {
    ($($name:ident $holds:ident $unit:literal $meaning:literal;)*) => {
        /// All columns, in order.
        pub const COLUMNS: &[Column] = &[$(Column {
            name: stringify!($name),
            holds: Holds::$holds,
            unit: $unit,
            meaning: $meaning,
        }),*];

        /// One body of one file, or one file that could not be read or holds no body.
        #[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
        #[serde(deny_unknown_fields)]
        pub struct Row {
            $(#[doc = $meaning] pub $name: of_kind!($holds),)*
        }

        impl Row {
            /// Its cells, in the order of [`COLUMNS`].
            pub fn cells(&self) -> Vec<Cell> {
                vec![$(Cell::$holds(self.$name.clone())),*]
            }

            /// Fills the cell of a column.
            ///
            /// # Errors
            /// Where no column of that name holds such a cell.
            pub fn set(&mut self, column: &str, cell: Cell) -> Result<(), String> {
                match (column, cell) {
                    $((stringify!($name), Cell::$holds(x)) => self.$name = x,)*
                    (name, _) => return Err(format!("\"{name}\" is no column of a survey, or holds something else")),
                }
                Ok(())
            }
        }
    };
}

columns! {
    path Text "" "File, as it was found; lossy where it is not UTF-8";
    path_hex Text "" "The path's bytes in hexadecimal, where it is not UTF-8";
    body Text "" "Id of the body, unique in its file; empty where the file holds none or could not be read";
    name Text "" "The file's own name of the body";
    format Text "" "stl or obj";
    unit Text "" "Length unit that the file's coordinates were taken in";
    unit_assumed Flag "" "Whether nobody stated that unit";
    bytes Count "B" "Length of the file";
    sha256 Text "" "SHA-256 of the file";
    bodies Count "" "Bodies of the file";
    triangles Count "" "Triangles of the body; of the file where there is no body";
    shells Count "" "Its shells";
    voids Count "" "Those of them that are voids";
    closed Flag "" "Whether the directed edges cancel";
    sound Flag "" "Whether nothing blocks or doubts, on the body or in the file as a whole";
    turned Flag "" "Whether it was inside out and turned";
    findings Text "" "Kinds of findings on the body with their counts, such as: hole 1, degenerate 3";
    file_findings Text "" "The same of findings that belong to no one body of the file";
    overlap_tested Flag "" "Whether surfaces that cut each other were looked for";
    refused Text "" "Why there is no volume: not-closed, duplicate, nested-solid or degenerate";
    volume_m3 Real "m3" "Volume";
    volume_doubt_m3 Real "m3" "How far the volume may be off by the findings that doubt it, all together; empty without such";
    area_m2 Real "m2" "Surface area";
    condition Real "" "How many times larger the summed terms are than the volume";
    centroid_x_m Real "m" "Centre of the volume";
    centroid_y_m Real "m" "Centre of the volume";
    centroid_z_m Real "m" "Centre of the volume";
    bounds_low_x_m Real "m" "Lower corner of the box";
    bounds_low_y_m Real "m" "Lower corner of the box";
    bounds_low_z_m Real "m" "Lower corner of the box";
    bounds_high_x_m Real "m" "Upper corner of the box";
    bounds_high_y_m Real "m" "Upper corner of the box";
    bounds_high_z_m Real "m" "Upper corner of the box";
    inertia_xx_m5 Real "m5" "Inertia tensor of the volume about the centroid";
    inertia_yy_m5 Real "m5" "Inertia tensor of the volume about the centroid";
    inertia_zz_m5 Real "m5" "Inertia tensor of the volume about the centroid";
    inertia_xy_m5 Real "m5" "Inertia tensor of the volume about the centroid (minus the integral of xy)";
    inertia_xz_m5 Real "m5" "Inertia tensor of the volume about the centroid (minus the integral of xz)";
    inertia_yz_m5 Real "m5" "Inertia tensor of the volume about the centroid (minus the integral of yz)";
    principal_1_m5 Real "m5" "Least principal moment of the volume";
    principal_2_m5 Real "m5" "Middle principal moment of the volume";
    principal_3_m5 Real "m5" "Greatest principal moment of the volume";
    material Text "" "Material that was assigned";
    density_kg_m3 Real "kg/m3" "Its density";
    mass_kg Real "kg" "Volume times density";
    mass_standard_kg Real "kg" "Standard uncertainty of the mass by the density's tolerance alone; empty where none is stated";
    same_shape Text "" "The first body, as path#body, of those that are this shape up to a rigid motion or mirroring; empty for a shape of its own";
    mirrored Flag "" "Whether it is the mirror image of that first one";
    error_kind Text "" "Kind of the error that kept the file from being read";
    error Text "" "The error";
    error_advice Text "" "What to do about it";
    error_line Count "" "Line of a text file that it is at";
    error_byte Count "" "Byte of a binary file that it is at";
    program Text "" "Program and version that weighed it";
}

impl Row {
    /// Its file and body as one word, as `weigh` takes them.
    pub fn place(&self) -> String {
        let path = self.path.as_deref().unwrap_or_default();
        match &self.body {
            Some(body) => format!("{path}#{body}"),
            None => path.to_owned(),
        }
    }

    /// The centre of the volume, m.
    pub fn centroid(&self) -> Option<[f64; 3]> {
        Some([self.centroid_x_m?, self.centroid_y_m?, self.centroid_z_m?])
    }
}
