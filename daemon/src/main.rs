//! Placeholder.
#[cfg_attr(not(test), expect(dead_code, reason = "used by the conductor"))]
mod clock;
#[cfg_attr(not(test), expect(dead_code, unused_imports, reason = "used by the conductor"))]
mod session;
fn main() {}
