//! From files to plain data: the only place where fabrication data, reviews and styles are read.
