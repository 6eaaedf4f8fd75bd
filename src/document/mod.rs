//! The places in documents where questions stand and answers go.
