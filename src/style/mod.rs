//! Looks as plain data: colours, widths, fonts, page sizes.
