//! Small arithmetic shared by the drawing. Transcendental functions come from `libm`, which computes the same bits on
//! every machine.

/// A linear-light colour: red, green, blue.
pub type Colour = [f32; 3];

/// 0 below `low`, 1 above `high`, smooth between.
pub fn smooth(low: f32, high: f32, x: f32) -> f32 {
    let t = ((x - low) / (high - low)).clamp(0.0, 1.0);
    t * t * (3.0 - 2.0 * t)
}

/// The whole number at or below `x`. (Without SSE 4.1 the standard one is a call, and this is where the time goes.)
pub fn below(x: f32) -> i32 {
    let whole = x as i32;
    whole - i32::from(x < whole as f32)
}

/// A round ridge: 1 at distance 0, falling to 0 at `half_width`.
pub fn ridge(distance: f32, half_width: f32) -> f32 {
    let t = distance / half_width;
    (1.0 - t * t).max(0.0)
}

/// From `a` (t = 0) to `b` (t = 1).
pub fn mix(a: f32, b: f32, t: f32) -> f32 {
    a + (b - a) * t
}

/// From colour `a` (t = 0) to colour `b` (t = 1).
pub fn blend(a: Colour, b: Colour, t: f32) -> Colour {
    [mix(a[0], b[0], t), mix(a[1], b[1], t), mix(a[2], b[2], t)]
}

/// The colour, brighter or darker.
pub fn times(c: Colour, k: f32) -> Colour {
    [c[0] * k, c[1] * k, c[2] * k]
}

/// Length of (x, y).
pub fn length(x: f32, y: f32) -> f32 {
    (x * x + y * y).sqrt()
}

/// (x, y) turned by the angle whose cosine and sine are given.
pub fn turn(x: f32, y: f32, (cos, sin): (f32, f32)) -> (f32, f32) {
    (cos * x - sin * y, sin * x + cos * y)
}

/// Cosine and sine of an angle in radians.
pub fn angle(radians: f32) -> (f32, f32) {
    (libm::cosf(radians), libm::sinf(radians))
}

/// The distance from (x, y) to the segment from `a` to `b`.
pub fn to_segment(x: f32, y: f32, a: (f32, f32), b: (f32, f32)) -> f32 {
    let (dx, dy) = (b.0 - a.0, b.1 - a.1);
    let (px, py) = (x - a.0, y - a.1);
    let t = ((px * dx + py * dy) / (dx * dx + dy * dy).max(1e-9)).clamp(0.0, 1.0);
    length(px - t * dx, py - t * dy)
}

/// The signed distance to a box with rounded corners, negative inside.
pub fn to_box(x: f32, y: f32, half: (f32, f32), round: f32) -> f32 {
    let (qx, qy) = (x.abs() - half.0 + round, y.abs() - half.1 + round);
    length(qx.max(0.0), qy.max(0.0)) + qx.max(qy).min(0.0) - round
}
