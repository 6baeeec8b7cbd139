//! Stand-in until the host module is merged: only the cpu number.

use std::fmt;

use serde::{Deserialize, Serialize};

/// A logical CPU number.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(transparent)]
pub struct Cpu(pub u32);

impl fmt::Display for Cpu {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.0.fmt(f)
    }
}
