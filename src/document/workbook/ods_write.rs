//! stub
use super::*;
pub(super) fn write(_b: &Book, _a: &[Vec<&Answer>]) -> Result<Vec<u8>, BookTrouble> {
    Err(BookTrouble::file("", ""))
}
