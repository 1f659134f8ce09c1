//! Drawing: scenes of placed items, the colour scale, and the writers of SVG and PNG.
