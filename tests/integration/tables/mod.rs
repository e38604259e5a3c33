//! Tables: level tables, site lists, tracks, wind tables, pairs, and the writer.

mod levels_errors;
mod levels_forms;
mod levels_rules;
mod pairs;
mod real_files;
mod sites;
mod support;
mod times;
mod wind_tables;
mod writing;
