//! A finished picture: SVG, PNG rendered from that very SVG, and the same in words.

use crate::draw::png::{RenderFault, encode, render};
use crate::draw::{Scene, svg};

/// A picture as bytes, ready to be written.
#[derive(Clone, Debug, PartialEq)]
pub struct Picture {
    /// SVG file.
    pub svg: String,
    /// PNG file.
    pub png: Vec<u8>,
    /// What the picture shows, in sentences: alternative text for a ticket.
    pub description: String,
    /// Picture number.
    pub number: String,
}

impl Picture {
    /// Writes a scene.
    pub fn of(scene: &Scene) -> Result<Self, RenderFault> {
        let svg = svg::write(scene);
        let png = encode(scene, &render(scene, &svg)?)?;
        Ok(Self { svg: svg.text, png, description: scene.description.clone(), number: scene.number.clone() })
    }
}
