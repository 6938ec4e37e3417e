//! Regenerates the committed tables; see DEVELOPERS.md.
fn main() {}
