//! The objects of a glTF, as far as they are read. Indices are checked where they are followed.

use serde::Deserialize;
use serde::de::IgnoredAny;
use std::collections::BTreeMap;

type Extensions = BTreeMap<String, IgnoredAny>;

#[derive(Deserialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Root {
    pub(super) asset: Asset,
    #[serde(default)]
    pub(super) extensions_required: Vec<String>,
    pub(super) scene: Option<usize>,
    #[serde(default)]
    pub(super) scenes: Vec<Scene>,
    #[serde(default)]
    pub(super) nodes: Vec<Node>,
    #[serde(default)]
    pub(super) meshes: Vec<Mesh>,
    #[serde(default)]
    pub(super) materials: Vec<Named>,
    #[serde(default)]
    pub(super) accessors: Vec<Accessor>,
    #[serde(default)]
    pub(super) buffer_views: Vec<View>,
    #[serde(default)]
    pub(super) buffers: Vec<Buffer>,
    #[serde(default)]
    pub(super) animations: Vec<IgnoredAny>,
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Asset {
    pub(super) version: String,
    pub(super) min_version: Option<String>,
}

#[derive(Deserialize)]
pub(super) struct Named {
    pub(super) name: Option<String>,
}

#[derive(Deserialize)]
pub(super) struct Scene {
    #[serde(default)]
    pub(super) nodes: Vec<usize>,
}

#[derive(Deserialize)]
pub(super) struct Node {
    pub(super) name: Option<String>,
    #[serde(default)]
    pub(super) children: Vec<usize>,
    pub(super) matrix: Option<[f64; 16]>,
    pub(super) translation: Option<[f64; 3]>,
    pub(super) rotation: Option<[f64; 4]>,
    pub(super) scale: Option<[f64; 3]>,
    pub(super) mesh: Option<usize>,
    pub(super) skin: Option<usize>,
    #[serde(default)]
    pub(super) weights: Vec<f64>,
    #[serde(default)]
    pub(super) extensions: Extensions,
}

#[derive(Deserialize)]
pub(super) struct Mesh {
    pub(super) name: Option<String>,
    pub(super) primitives: Vec<Primitive>,
    #[serde(default)]
    pub(super) weights: Vec<f64>,
}

#[derive(Deserialize)]
pub(super) struct Primitive {
    pub(super) attributes: BTreeMap<String, usize>,
    pub(super) indices: Option<usize>,
    pub(super) material: Option<usize>,
    pub(super) mode: Option<u32>,
    #[serde(default)]
    pub(super) extensions: Extensions,
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Accessor {
    pub(super) buffer_view: Option<usize>,
    #[serde(default)]
    pub(super) byte_offset: u64,
    pub(super) component_type: u32,
    #[serde(default)]
    pub(super) normalized: bool,
    pub(super) count: u64,
    #[serde(rename = "type")]
    pub(super) kind: String,
    pub(super) sparse: Option<Sparse>,
}

#[derive(Deserialize)]
pub(super) struct Sparse {
    pub(super) count: u64,
    pub(super) indices: SparseIndices,
    pub(super) values: SparseValues,
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct SparseIndices {
    pub(super) buffer_view: usize,
    #[serde(default)]
    pub(super) byte_offset: u64,
    pub(super) component_type: u32,
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct SparseValues {
    pub(super) buffer_view: usize,
    #[serde(default)]
    pub(super) byte_offset: u64,
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct View {
    pub(super) buffer: usize,
    #[serde(default)]
    pub(super) byte_offset: u64,
    pub(super) byte_length: u64,
    pub(super) byte_stride: Option<u64>,
    #[serde(default)]
    pub(super) extensions: Extensions,
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase")]
pub(super) struct Buffer {
    pub(super) uri: Option<String>,
    pub(super) byte_length: u64,
}
