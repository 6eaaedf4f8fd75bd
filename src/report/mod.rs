//! Problems as text and JSON, and what each code means.
