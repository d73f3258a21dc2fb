//! Placeholder.
#![expect(dead_code, unused_imports, reason = "the devices that use the world are not here yet")]

mod scenario;
mod world;

fn main() {}
