//! Faults around the program: killed while it writes, no room, no permission, two runs at once, libraries that crash.

mod libraries;
mod writing;
