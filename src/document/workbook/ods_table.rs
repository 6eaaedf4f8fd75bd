//! stub
use super::refs::Scope;
pub(super) fn formulas(_x: &str, _s: &mut Scope) -> Result<Vec<((usize, u32, u32), String)>, String> {
    Ok(vec![])
}
