//! Steps: formula trees and their renderings.
