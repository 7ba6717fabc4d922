//! One file per command: arguments in, files in, text out.
