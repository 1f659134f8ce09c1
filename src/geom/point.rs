//! Points and boxes in the plane of the board, in metres.

/// A point or vector in metres; x to the right, y up, board seen from the top.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Point {
    /// Metres to the right.
    pub x: f64,
    /// Metres up.
    pub y: f64,
}

impl Point {
    /// A point from metres.
    pub const fn new(x: f64, y: f64) -> Self {
        Self { x, y }
    }

    /// A point from millimetres.
    pub fn mm(x: f64, y: f64) -> Self {
        Self::new(x * 1e-3, y * 1e-3)
    }

    /// Distance to `other` in metres.
    pub fn distance(self, other: Self) -> f64 {
        libm::hypot(self.x - other.x, self.y - other.y)
    }

    /// Length of the vector in metres.
    pub fn length(self) -> f64 {
        libm::hypot(self.x, self.y)
    }

    /// Scalar product in square metres.
    pub fn dot(self, other: Self) -> f64 {
        self.x * other.x + self.y * other.y
    }

    /// z component of the vector product in square metres; positive when `other` lies to the left.
    pub fn cross(self, other: Self) -> f64 {
        self.x * other.y - self.y * other.x
    }
}

impl std::ops::Add for Point {
    type Output = Self;
    fn add(self, other: Self) -> Self {
        Self::new(self.x + other.x, self.y + other.y)
    }
}

impl std::ops::Sub for Point {
    type Output = Self;
    fn sub(self, other: Self) -> Self {
        Self::new(self.x - other.x, self.y - other.y)
    }
}

impl std::ops::Mul<f64> for Point {
    type Output = Self;
    fn mul(self, factor: f64) -> Self {
        Self::new(self.x * factor, self.y * factor)
    }
}

/// An upright box in metres. An empty box has `min` above `max`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bounds {
    /// Lower left corner.
    pub min: Point,
    /// Upper right corner.
    pub max: Point,
}

impl Bounds {
    /// The box that holds nothing.
    pub const EMPTY: Self = Self {
        min: Point::new(f64::INFINITY, f64::INFINITY),
        max: Point::new(f64::NEG_INFINITY, f64::NEG_INFINITY),
    };

    /// The smallest box round `points`.
    pub fn of(points: impl IntoIterator<Item = Point>) -> Self {
        points.into_iter().fold(Self::EMPTY, Self::with)
    }

    /// The smallest box round this one and `point`.
    pub fn with(self, point: Point) -> Self {
        Self {
            min: Point::new(self.min.x.min(point.x), self.min.y.min(point.y)),
            max: Point::new(self.max.x.max(point.x), self.max.y.max(point.y)),
        }
    }

    /// The smallest box round this one and `other`.
    pub fn union(self, other: Self) -> Self {
        if other.is_empty() { self } else { self.with(other.min).with(other.max) }
    }

    /// The box grown by `margin_m` on every side.
    pub fn grown(self, margin_m: f64) -> Self {
        let by = Point::new(margin_m, margin_m);
        Self { min: self.min - by, max: self.max + by }
    }

    /// Whether nothing lies inside.
    pub fn is_empty(self) -> bool {
        self.min.x > self.max.x || self.min.y > self.max.y
    }

    /// Whether `point` lies inside or on the rim.
    pub fn contains(self, point: Point) -> bool {
        (self.min.x..=self.max.x).contains(&point.x) && (self.min.y..=self.max.y).contains(&point.y)
    }

    /// Whether the two boxes share a point.
    pub fn meets(self, other: Self) -> bool {
        self.min.x <= other.max.x
            && other.min.x <= self.max.x
            && self.min.y <= other.max.y
            && other.min.y <= self.max.y
    }

    /// Width in metres.
    pub fn width(self) -> f64 {
        self.max.x - self.min.x
    }

    /// Height in metres.
    pub fn height(self) -> f64 {
        self.max.y - self.min.y
    }

    /// The middle.
    pub fn centre(self) -> Point {
        (self.min + self.max) * 0.5
    }
}
