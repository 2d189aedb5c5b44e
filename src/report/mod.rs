//! placeholder
use crate::store::*;
pub struct Summary;
impl Summary { pub fn from_file(_: &ShotFile) -> Result<Summary, StoreError> { Ok(Summary) } pub fn to_json(&self) -> String { String::new() } }
impl std::fmt::Display for Summary { fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result { writeln!(f, "") } }
