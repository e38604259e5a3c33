//! Gridded wind: formats, axes, time, packing; against numbers worked out by general-purpose libraries.

mod formats;
mod hazards;
mod layouts;
mod properties;
mod reference;
mod refusals;
mod support;
