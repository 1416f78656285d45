//! The obstructions all round a site.

/// To come.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Skyline;
