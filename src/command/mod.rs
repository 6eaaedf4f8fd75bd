//! One file per command of the program.
