//! The sheets a user gets: ticket map, contact sheet, tables and JSON, as bytes.
