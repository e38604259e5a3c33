//! The header of a NetCDF-4 file: one pass through the libraries under their lock, after which values are read by ourselves.

use super::error::NetcdfError;
use super::header::{
    AttributeValue, ChunkPlace, Chunks, Dimension, Filter, Header, NumberType, Storage, Variable, VariableType,
};
use crate::io::contain::contain;
use hdf5_metno as h5;
use netcdf::AttributeValue as Nc;
use netcdf::types::{FloatType, IntType, NcVariableType};
use std::collections::HashMap;
use std::path::Path;

/// Reads the header of a NetCDF-4 file.
pub(super) fn read_header(path: &Path) -> Result<Header, NetcdfError> {
    contain(|| read_header_trusting(path))
        .unwrap_or_else(|words| Err(NetcdfError::Damaged { path: path.to_owned(), problem: words }))
}

/// The same; damaged bytes may make a library panic.
fn read_header_trusting(path: &Path) -> Result<Header, NetcdfError> {
    let library = |action: &str, problem: String| NetcdfError::Library {
        path: path.to_owned(),
        action: action.to_owned(),
        problem,
    };
    let file = netcdf::open(path).map_err(|error| library("cannot be opened", error.to_string()))?;
    let raw = h5::File::open(path).map_err(|error| library("cannot be opened as HDF5", first_line(&error)))?;
    let mut dimensions: Vec<Dimension> = Vec::new();
    let mut variables = Vec::new();
    for variable in file.variables() {
        let name = variable.name();
        let mut of_variable = Vec::new();
        for dimension in variable.dimensions() {
            let found = Dimension { name: dimension.name(), length: dimension.len() as u64 };
            let index = dimensions.iter().position(|known| *known == found).unwrap_or_else(|| {
                dimensions.push(found);
                dimensions.len() - 1
            });
            of_variable.push(index);
        }
        let kind = kind(&variable.vartype());
        let mut attributes = Vec::new();
        for attribute in variable.attributes() {
            // An attribute of a type that we do not know is passed over; one that we need is missed by its reader.
            if let Ok(value) = attribute.value() {
                attributes.push((attribute.name().to_owned(), attribute_value(value)));
            }
        }
        let shape: Vec<u64> = of_variable.iter().map(|index| dimensions[*index].length).collect();
        if shape.iter().try_fold(8_u64, |bytes, length| bytes.checked_mul(*length)).is_none_or(|b| b > u64::MAX / 4) {
            let problem = format!("variable `{name}` is impossibly large");
            return Err(NetcdfError::Damaged { path: path.to_owned(), problem });
        }
        let storage = storage(path, &raw, &name, kind, &shape)?;
        variables.push(Variable { name, dimensions: of_variable, kind, attributes, storage });
    }
    let groups: Vec<String> =
        file.groups().map(|groups| groups.map(|group| group.name()).collect()).unwrap_or_default();
    if variables.is_empty() {
        let problem = if groups.is_empty() {
            "it has no variables".to_owned()
        } else {
            format!("its variables are in groups ({}), which are not read", groups.join(", "))
        };
        return Err(library("nothing to read", problem));
    }
    Ok(Header { path: path.to_owned(), format: "NetCDF-4", dimensions, variables, groups })
}

/// The library's message without its trace, which names folders of the build.
fn first_line(error: &h5::Error) -> String {
    let text = error.to_string();
    text.lines().next().unwrap_or_default().to_owned()
}

fn kind(found: &NcVariableType) -> VariableType {
    VariableType::Number(match found {
        NcVariableType::Int(IntType::I8) => NumberType::I8,
        NcVariableType::Int(IntType::U8) => NumberType::U8,
        NcVariableType::Int(IntType::I16) => NumberType::I16,
        NcVariableType::Int(IntType::U16) => NumberType::U16,
        NcVariableType::Int(IntType::I32) => NumberType::I32,
        NcVariableType::Int(IntType::U32) => NumberType::U32,
        NcVariableType::Int(IntType::I64) => NumberType::I64,
        NcVariableType::Int(IntType::U64) => NumberType::U64,
        NcVariableType::Float(FloatType::F32) => NumberType::F32,
        NcVariableType::Float(FloatType::F64) => NumberType::F64,
        NcVariableType::Char | NcVariableType::String => return VariableType::Text,
        _ => return VariableType::Other,
    })
}

fn attribute_value(value: Nc) -> AttributeValue {
    use AttributeValue::{Numbers, Text};
    macro_rules! all {
        ($values:expr, $kind:ident) => {
            Numbers($values.into_iter().map(|value| value as f64).collect(), NumberType::$kind)
        };
    }
    let one = |value: f64, kind: NumberType| Numbers(vec![value], kind);
    match value {
        Nc::Str(text) => Text(text),
        Nc::Strs(texts) => Text(texts.join(" ")),
        Nc::Uchar(value) => one(f64::from(value), NumberType::U8),
        Nc::Schar(value) => one(f64::from(value), NumberType::I8),
        Nc::Ushort(value) => one(f64::from(value), NumberType::U16),
        Nc::Short(value) => one(f64::from(value), NumberType::I16),
        Nc::Uint(value) => one(f64::from(value), NumberType::U32),
        Nc::Int(value) => one(f64::from(value), NumberType::I32),
        Nc::Ulonglong(value) => one(value as f64, NumberType::U64),
        Nc::Longlong(value) => one(value as f64, NumberType::I64),
        Nc::Float(value) => one(f64::from(value), NumberType::F32),
        Nc::Double(value) => one(value, NumberType::F64),
        Nc::Uchars(values) => all!(values, U8),
        Nc::Schars(values) => all!(values, I8),
        Nc::Ushorts(values) => all!(values, U16),
        Nc::Shorts(values) => all!(values, I16),
        Nc::Uints(values) => all!(values, U32),
        Nc::Ints(values) => all!(values, I32),
        Nc::Ulonglongs(values) => all!(values, U64),
        Nc::Longlongs(values) => all!(values, I64),
        Nc::Floats(values) => all!(values, F32),
        Nc::Doubles(values) => Numbers(values, NumberType::F64),
    }
}

fn storage(
    path: &Path,
    file: &h5::File,
    name: &str,
    kind: VariableType,
    shape: &[u64],
) -> Result<Storage, NetcdfError> {
    let VariableType::Number(number) = kind else { return Ok(Storage::Library) };
    // NetCDF-4 stores a variable that only shares a dimension's name under a longer one.
    let Ok(dataset) = file.dataset(name).or_else(|_| file.dataset(&format!("_nc4_non_coord_{name}"))) else {
        return Ok(Storage::Library);
    };
    let (user_block, stored_shape) =
        (file.userblock(), dataset.shape().iter().map(|length| *length as u64).collect::<Vec<_>>());
    let plain = dataset.dtype().is_ok_and(|dtype| dtype.size() == number.size());
    let big_endian = dataset.dtype().is_ok_and(|dtype| dtype.byte_order() == h5::datatype::ByteOrder::BigEndian);
    let mut filters = Vec::new();
    let mut own = plain && user_block == 0;
    for filter in dataset.filters() {
        match filter {
            h5::filters::Filter::Shuffle => filters.push(Filter::Shuffle),
            h5::filters::Filter::Deflate(_) => filters.push(Filter::Deflate),
            h5::filters::Filter::Fletcher32 => filters.push(Filter::Fletcher32),
            // The library undoes these by itself.
            h5::filters::Filter::ScaleOffset(_) | h5::filters::Filter::NBit => own = false,
            other => {
                // Refused when it is read: a file may hold other variables than the wind.
                return Ok(Storage::Locked(filter_name(&other)));
            }
        }
    }
    match dataset.layout() {
        // A variable along an unlimited dimension may be shorter in storage than the dimension: the rest is fill.
        h5::dataset::Layout::Contiguous if own && stored_shape == shape => {
            Ok(dataset.offset().map_or(Storage::Library, |offset| Storage::Contiguous { offset, big_endian }))
        }
        h5::dataset::Layout::Chunked if own => {
            let Some(chunk) = dataset.chunk() else { return Ok(Storage::Library) };
            let chunk: Vec<u64> = chunk.iter().map(|length| *length as u64).collect();
            let grid: Vec<u64> = shape.iter().zip(&chunk).map(|(length, chunk)| length.div_ceil(*chunk)).collect();
            let mut blocks = HashMap::new();
            dataset
                .chunks_visit(|info| {
                    let number = info
                        .offset
                        .iter()
                        .zip(&chunk)
                        .zip(&grid)
                        .fold(0, |number, ((offset, chunk), count)| number * count + offset / chunk);
                    let place = ChunkPlace { address: info.addr, bytes: info.size, filter_mask: info.filter_mask };
                    blocks.insert(number, place);
                    0
                })
                .map_err(|error| NetcdfError::Library {
                    path: path.to_owned(),
                    action: format!("the index of variable `{name}` cannot be read"),
                    problem: first_line(&error),
                })?;
            Ok(Storage::Chunked(Chunks { shape: chunk, extent: stored_shape, filters, big_endian, blocks }))
        }
        _ => Ok(Storage::Library),
    }
}

fn filter_name(filter: &h5::filters::Filter) -> String {
    match filter {
        h5::filters::Filter::SZip(..) => "szip".to_owned(),
        h5::filters::Filter::User(id, _) => match id {
            // Identifiers registered with The HDF Group.
            307 => "bzip2 (307)".to_owned(),
            32000 => "lzf (32000)".to_owned(),
            32001 => "blosc (32001)".to_owned(),
            32004 => "lz4 (32004)".to_owned(),
            32008 => "bitshuffle (32008)".to_owned(),
            32013 => "zfp (32013)".to_owned(),
            32015 => "zstd (32015)".to_owned(),
            other => format!("number {other}"),
        },
        other => format!("{other:?}"),
    }
}
