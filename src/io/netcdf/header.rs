//! One description of a gridded file, whichever format it has: dimensions, variables, attributes, and where bytes lie.

use std::path::PathBuf;

/// A number type as stored.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum NumberType {
    I8,
    U8,
    I16,
    U16,
    I32,
    U32,
    I64,
    U64,
    F32,
    F64,
}

impl NumberType {
    /// Whether it is a whole number.
    pub(super) fn is_integer(self) -> bool {
        !matches!(self, Self::F32 | Self::F64)
    }

    /// Bytes a value.
    pub(super) fn size(self) -> usize {
        match self {
            Self::I8 | Self::U8 => 1,
            Self::I16 | Self::U16 => 2,
            Self::I32 | Self::U32 | Self::F32 => 4,
            Self::I64 | Self::U64 | Self::F64 => 8,
        }
    }

    /// The fill value that the NetCDF library writes where none is named (`NC_FILL_*` in netcdf.h). Bytes have none in
    /// practice: all their values are used.
    pub(super) fn default_fill(self) -> Option<f64> {
        match self {
            Self::I8 | Self::U8 => None,
            Self::I16 => Some(-32_767.0),
            Self::U16 => Some(65_535.0),
            Self::I32 => Some(-2_147_483_647.0),
            Self::U32 => Some(4_294_967_295.0),
            Self::I64 => Some(-9_223_372_036_854_775_806.0),
            Self::U64 => Some(18_446_744_073_709_551_614.0),
            Self::F32 | Self::F64 => Some(9.969_209_968_386_869e36),
        }
    }

    /// A value of this type from its bytes.
    #[inline]
    pub(super) fn decode(self, bytes: &[u8], big_endian: bool) -> f64 {
        macro_rules! number {
            ($type:ty) => {{
                let array = bytes.try_into().expect("a value has the size of its type");
                let value = if big_endian { <$type>::from_be_bytes(array) } else { <$type>::from_le_bytes(array) };
                value as f64
            }};
        }
        match self {
            Self::I8 => f64::from(bytes[0] as i8),
            Self::U8 => f64::from(bytes[0]),
            Self::I16 => number!(i16),
            Self::U16 => number!(u16),
            Self::I32 => number!(i32),
            Self::U32 => number!(u32),
            Self::I64 => number!(i64),
            Self::U64 => number!(u64),
            Self::F32 => number!(f32),
            Self::F64 => number!(f64),
        }
    }
}

/// The type of a variable.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum VariableType {
    Number(NumberType),
    Text,
    /// Compound, vlen, enum ...: not read.
    Other,
}

/// An attribute's value.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum AttributeValue {
    Text(String),
    /// Numbers, with the type that they are stored in.
    Numbers(Vec<f64>, NumberType),
}

/// A dimension.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Dimension {
    pub(super) name: String,
    pub(super) length: u64,
}

/// Where the bytes of a variable lie.
#[derive(Debug, Clone)]
pub(super) enum Storage {
    /// One run of bytes, last dimension fastest.
    Contiguous { offset: u64, big_endian: bool },
    /// Classic record variable: one run a record.
    Records { offset: u64, record_bytes: u64 },
    /// HDF5 chunks that we decode ourselves.
    Chunked(Chunks),
    /// Read through the library.
    Library,
    /// Packed with a filter that cannot be undone: its name.
    Locked(String),
}

/// The chunks of a variable.
#[derive(Debug, Clone)]
pub(super) struct Chunks {
    /// Length of a chunk along each dimension.
    pub(super) shape: Vec<u64>,
    /// Length of the stored data along each dimension: along an unlimited one it may be shorter than the dimension, and what
    /// a chunk holds beyond it means nothing.
    pub(super) extent: Vec<u64>,
    /// Filters in the order of writing.
    pub(super) filters: Vec<Filter>,
    pub(super) big_endian: bool,
    /// Address, size and filter mask of each chunk, by its number along the chunk grid (last dimension fastest).
    pub(super) blocks: std::collections::HashMap<u64, ChunkPlace>,
}

/// A stored chunk.
#[derive(Debug, Clone, Copy)]
pub(super) struct ChunkPlace {
    pub(super) address: u64,
    pub(super) bytes: u64,
    /// Bit n set: filter n was not applied.
    pub(super) filter_mask: u32,
}

/// A filter that we undo.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Filter {
    Shuffle,
    Deflate,
    Fletcher32,
}

/// A variable.
#[derive(Debug, Clone)]
pub(super) struct Variable {
    pub(super) name: String,
    /// Indices into the header's dimensions.
    pub(super) dimensions: Vec<usize>,
    pub(super) kind: VariableType,
    pub(super) attributes: Vec<(String, AttributeValue)>,
    pub(super) storage: Storage,
}

/// A file's header.
#[derive(Debug, Clone)]
pub(super) struct Header {
    pub(super) path: PathBuf,
    /// Name of the format, for people.
    pub(super) format: &'static str,
    pub(super) dimensions: Vec<Dimension>,
    pub(super) variables: Vec<Variable>,
    /// Names of groups, whose variables are not read.
    pub(super) groups: Vec<String>,
}

impl Variable {
    /// An attribute, by its exact name.
    pub(super) fn attribute(&self, name: &str) -> Option<&AttributeValue> {
        self.attributes.iter().find(|(known, _)| known == name).map(|(_, value)| value)
    }

    /// A text attribute, trimmed; empty texts count as none.
    pub(super) fn text(&self, name: &str) -> Option<&str> {
        match self.attribute(name)? {
            AttributeValue::Text(text) => {
                Some(text.trim_matches(['\0', ' ', '\n', '\t'])).filter(|text| !text.is_empty())
            }
            AttributeValue::Numbers(..) => None,
        }
    }

    /// The number type; `None` for text and other types.
    pub(super) fn number_type(&self) -> Option<NumberType> {
        match self.kind {
            VariableType::Number(number) => Some(number),
            VariableType::Text | VariableType::Other => None,
        }
    }
}

impl Header {
    /// Lengths of a variable's dimensions.
    pub(super) fn shape(&self, variable: &Variable) -> Vec<u64> {
        variable.dimensions.iter().map(|dimension| self.dimensions[*dimension].length).collect()
    }

    /// Names of a variable's dimensions.
    pub(super) fn dimension_names<'a>(&'a self, variable: &Variable) -> Vec<&'a str> {
        variable.dimensions.iter().map(|dimension| self.dimensions[*dimension].name.as_str()).collect()
    }

    /// A variable, by its exact name.
    pub(super) fn variable(&self, name: &str) -> Option<&Variable> {
        self.variables.iter().find(|variable| variable.name == name)
    }

    /// Names of all variables, for messages.
    pub(super) fn variable_names(&self) -> String {
        let names: Vec<&str> = self.variables.iter().map(|variable| variable.name.as_str()).collect();
        if names.is_empty() { "none".to_owned() } else { names.join(", ") }
    }
}
