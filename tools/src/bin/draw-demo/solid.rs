//! What a thing on the bench is made of, geometrically: an outline and a relief over it.

/// A place on a thing, in its own frame (the thing reaches about 1 from its centre).
pub struct Place {
    /// Signed distance to the outline, negative inside.
    pub edge: f32,
    /// The height of the mark worked into the face, 0 (none) … 1.
    pub relief: f32,
    /// How much of the second colour (paint, stain) lies here, 0 … 1.
    pub paint: f32,
}

impl Place {
    /// A place without mark or paint.
    pub fn plain(edge: f32) -> Self {
        Self { edge, relief: 0.0, paint: 0.0 }
    }
}

/// A thing that can be drawn.
pub trait Solid {
    /// What is at (x, y) of the thing's own frame.
    fn at(&self, x: f32, y: f32) -> Place;
    /// How far in from the outline the edge is rounded; as large as the thing itself for a pebble.
    fn rounding(&self) -> f32;
    /// The height of the face over the bench.
    fn thickness(&self) -> f32;
    /// The height of the relief; negative for a mark that is sunk into the face.
    fn relief_height(&self) -> f32;
}
