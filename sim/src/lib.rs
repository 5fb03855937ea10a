//! A lathe on the desk.

#![forbid(unsafe_code)]
