//! The program: see `cli`.

fn main() {}
