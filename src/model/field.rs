//! Gridded fields: what a source is, which nodes a site needs, and the blocks in which storage hands them over.

use crate::model::{FlagSet, Scattered, SourceId};
use crate::numerics::axis::Axis;
use crate::units::{Instant, Window};
use serde::Serialize;
use std::ops::Range;
use std::sync::Arc;

/// How the nodes of a field lie.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Layout {
    /// Latitude and longitude are axes of their own.
    Rectilinear,
    /// Latitude and longitude are fields of two dimensions.
    Curvilinear,
    /// A rectilinear grid about a rotated pole.
    RotatedPole,
    /// A rectilinear grid in a map projection.
    Projected,
    /// Nodes without rows and columns.
    Nodes,
    /// A list of stations.
    Stations,
}

impl Layout {
    /// Its name in words.
    pub fn name(self) -> &'static str {
        match self {
            Self::Rectilinear => "rectilinear grid",
            Self::Curvilinear => "curvilinear grid (two-dimensional latitude and longitude)",
            Self::RotatedPole => "grid about a rotated pole",
            Self::Projected => "grid in a map projection",
            Self::Nodes => "unstructured nodes",
            Self::Stations => "list of stations",
        }
    }
}

/// What happens where a node that the site needs is land or missing.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum CoastRule {
    /// The value is missing.
    #[default]
    Missing,
    /// The weights of the other nodes are scaled up to one, and the value is flagged.
    Renormalise,
}

/// How a value is taken from the nodes of a grid.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum SpatialRule {
    /// Bilinear between the four nodes around the site.
    Bilinear(CoastRule),
    /// The nearest node that has data, within a distance, km.
    Nearest {
        /// Farthest distance that is allowed, km.
        max_distance_km: f64,
    },
    /// Equal weights over all nodes within a distance, km; land is left out.
    Footprint {
        /// The distance, km.
        radius_km: f64,
    },
}

impl Default for SpatialRule {
    fn default() -> Self {
        Self::Bilinear(CoastRule::Missing)
    }
}

/// A node by its stored row and column.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct NodeId {
    /// Index along the latitude axis as stored.
    pub row: usize,
    /// Index along the longitude axis as stored.
    pub column: usize,
}

/// The nodes that a place needs, with their weights; the weights sum to one.
#[derive(Debug, Clone, PartialEq)]
pub struct Stencil {
    /// Nodes and weights; those of weight zero are never needed.
    pub nodes: Vec<(NodeId, f64)>,
    /// Remarks on every value that comes from it.
    pub flags: FlagSet,
}

/// Where the nodes of a field lie.
#[derive(Debug, Clone, PartialEq)]
pub enum Grid {
    /// Latitude and longitude are axes.
    Axes {
        /// Latitudes, degrees north.
        latitude: Axis,
        /// Longitudes, degrees east.
        longitude: Axis,
    },
    /// Every node has a place of its own.
    Scattered(Arc<Scattered>),
}

impl Grid {
    /// How the nodes lie.
    pub fn layout(&self) -> Layout {
        match self {
            Self::Axes { .. } => Layout::Rectilinear,
            Self::Scattered(nodes) => nodes.layout(),
        }
    }

    /// Rows and columns.
    pub fn size(&self) -> (usize, usize) {
        match self {
            Self::Axes { latitude, longitude } => (latitude.len(), longitude.len()),
            Self::Scattered(nodes) => nodes.size(),
        }
    }

    /// South, north, west and east limits, degrees.
    pub fn limits(&self) -> [f64; 4] {
        match self {
            Self::Axes { latitude, longitude } => {
                let ((south, north), (west, east)) = (latitude.limits(), longitude.limits());
                [south, north, west, east]
            }
            Self::Scattered(nodes) => nodes.limits(),
        }
    }

    /// Whether it closes around the globe.
    pub fn is_periodic(&self) -> bool {
        matches!(self, Self::Axes { longitude, .. } if longitude.is_periodic())
    }

    /// Latitude and longitude of a node, degrees, longitude from -180 to 180.
    pub fn place(&self, node: NodeId) -> Option<(f64, f64)> {
        match self {
            Self::Axes { latitude, longitude } => {
                let longitude = (longitude.value_at(node.column)? + 180.0).rem_euclid(360.0) - 180.0;
                Some((latitude.value_at(node.row)?, longitude))
            }
            Self::Scattered(nodes) => nodes.place(node.row, node.column),
        }
    }
}

/// What is known of a field from its headers.
#[derive(Debug, Clone)]
pub struct FieldMeta {
    /// The source.
    pub source: SourceId,
    /// How the nodes lie.
    pub layout: Layout,
    /// The grid.
    pub grid: Grid,
    /// Steps in increasing order, none twice.
    pub steps: Vec<Instant>,
    /// Height above the surface, m, where known.
    pub height_m: Option<f64>,
    /// Remarks on every value.
    pub flags: FlagSet,
    /// What was understood and what the reader should know, in sentences.
    pub notes: Vec<String>,
}

/// The nodes and the times that a job needs.
#[derive(Debug, Clone)]
pub struct NodeRequest {
    /// The nodes, in increasing order, none twice.
    pub nodes: Vec<NodeId>,
    /// The times; `None`: all.
    pub window: Option<Window>,
}

/// A run of steps of one file whose storage blocks are decoded together: the unit of parallel work.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Slab {
    /// The file, by its place in the source.
    pub file: usize,
    /// Steps as stored in that file.
    pub stored_steps: Range<usize>,
}

/// Decoded values of the requested nodes over a slab: component by component, step by step, node by node.
#[derive(Debug, Clone, PartialEq)]
pub struct Block {
    /// Values in the source's own units; NaN is missing.
    pub values: Vec<f64>,
    /// Whether each value is preliminary; empty where none is.
    pub preliminary: Vec<bool>,
}

/// A gridded field whose node values can be had block by block.
pub trait FieldSource: Sync {
    /// Why a block cannot be had.
    type Error: Send;

    /// What is known from the headers.
    fn meta(&self) -> &FieldMeta;

    /// The slabs that hold the request, each storage block in exactly one of them. Reads headers alone.
    fn plan(&self, request: &NodeRequest) -> Vec<Slab>;

    /// Decodes a slab for the nodes of the request.
    ///
    /// # Errors
    /// When a block cannot be read or decoded.
    fn decode(&self, slab: &Slab, nodes: &[NodeId]) -> Result<Block, Self::Error>;
}
