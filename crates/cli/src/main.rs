//! The hillpull program.
fn main() {}
