//! Vectors and rotations in three dimensions, as plain arrays.
//!
//! Rotations are of the axes, not of the vector: `rotation_3(a)` takes components along the old axes
//! to components along axes turned by `a` about the third, which is the R₃(a) of the IERS Conventions.

/// Three components.
pub type Vector = [f64; 3];
/// Three rows of three.
pub type Matrix = [[f64; 3]; 3];

/// The rotation that changes nothing.
pub const IDENTITY: Matrix = [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]];

/// Scalar product.
#[inline(always)]
pub fn dot(a: Vector, b: Vector) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

/// Vector product.
#[inline(always)]
pub fn cross(a: Vector, b: Vector) -> Vector {
    [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]]
}

/// Sum.
#[inline(always)]
pub fn add(a: Vector, b: Vector) -> Vector {
    [a[0] + b[0], a[1] + b[1], a[2] + b[2]]
}

/// Difference.
#[inline(always)]
pub fn sub(a: Vector, b: Vector) -> Vector {
    [a[0] - b[0], a[1] - b[1], a[2] - b[2]]
}

/// Product with a number.
#[inline(always)]
pub fn scale(s: f64, a: Vector) -> Vector {
    [s * a[0], s * a[1], s * a[2]]
}

/// `a + s b`.
#[inline(always)]
pub fn add_scaled(a: Vector, s: f64, b: Vector) -> Vector {
    [a[0] + s * b[0], a[1] + s * b[1], a[2] + s * b[2]]
}

/// Length.
#[inline(always)]
pub fn norm(a: Vector) -> f64 {
    dot(a, a).sqrt()
}

/// The vector of length one along `a`; NaN for the zero vector.
#[inline(always)]
pub fn unit(a: Vector) -> Vector {
    scale(1.0 / norm(a), a)
}

/// Angle between two vectors of any length, radians, well conditioned from 0 to π.
pub fn angle(a: Vector, b: Vector) -> f64 {
    norm(cross(a, b)).atan2(dot(a, b))
}

/// The unit vector at a longitude and latitude, radians.
pub fn from_angles(longitude: f64, latitude: f64) -> Vector {
    let (sin_lon, cos_lon) = longitude.sin_cos();
    let (sin_lat, cos_lat) = latitude.sin_cos();
    [cos_lat * cos_lon, cos_lat * sin_lon, sin_lat]
}

/// Longitude in (−π, π] and latitude of a vector of any length, radians.
pub fn to_angles(a: Vector) -> (f64, f64) {
    (a[1].atan2(a[0]), a[2].atan2(a[0].hypot(a[1])))
}

/// Rotation of the axes about the first.
pub fn rotation_1(angle: f64) -> Matrix {
    let (s, c) = angle.sin_cos();
    [[1.0, 0.0, 0.0], [0.0, c, s], [0.0, -s, c]]
}

/// Rotation of the axes about the second.
pub fn rotation_2(angle: f64) -> Matrix {
    let (s, c) = angle.sin_cos();
    [[c, 0.0, -s], [0.0, 1.0, 0.0], [s, 0.0, c]]
}

/// Rotation of the axes about the third.
pub fn rotation_3(angle: f64) -> Matrix {
    let (s, c) = angle.sin_cos();
    [[c, s, 0.0], [-s, c, 0.0], [0.0, 0.0, 1.0]]
}

/// Matrix times vector.
#[inline(always)]
pub fn rotate(m: &Matrix, v: Vector) -> Vector {
    [dot(m[0], v), dot(m[1], v), dot(m[2], v)]
}

/// Transposed matrix times vector.
#[inline(always)]
pub fn rotate_back(m: &Matrix, v: Vector) -> Vector {
    add(add(scale(v[0], m[0]), scale(v[1], m[1])), scale(v[2], m[2]))
}

/// Matrix product `a b`: first `b`, then `a`.
pub fn product(a: &Matrix, b: &Matrix) -> Matrix {
    [rotate_back(b, a[0]), rotate_back(b, a[1]), rotate_back(b, a[2])]
}

/// The inverse of a rotation.
pub fn transpose(m: &Matrix) -> Matrix {
    [[m[0][0], m[1][0], m[2][0]], [m[0][1], m[1][1], m[2][1]], [m[0][2], m[1][2], m[2][2]]]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rotations_turn_the_axes() {
        let quarter = std::f64::consts::FRAC_PI_2;
        let close = |a: Vector, b: Vector| norm(sub(a, b)) < 1e-15;
        // An axis turned by a quarter about the third sees the old x axis at minus its own y.
        assert!(close(rotate(&rotation_3(quarter), [1.0, 0.0, 0.0]), [0.0, -1.0, 0.0]));
        assert!(close(rotate(&rotation_1(quarter), [0.0, 1.0, 0.0]), [0.0, 0.0, -1.0]));
        assert!(close(rotate(&rotation_2(quarter), [0.0, 0.0, 1.0]), [-1.0, 0.0, 0.0]));
    }

    #[test]
    fn products_are_orthogonal_and_transposes_undo() {
        let m = product(&rotation_1(0.3), &product(&rotation_2(-1.1), &rotation_3(2.7)));
        let back = product(&m, &transpose(&m));
        for i in 0..3 {
            assert!(norm(sub(back[i], IDENTITY[i])) < 1e-15);
        }
        let v = [0.2, -0.5, 0.8];
        assert!(norm(sub(rotate_back(&m, rotate(&m, v)), v)) < 1e-15);
    }

    #[test]
    fn angle_is_well_conditioned_at_both_ends() {
        let a = from_angles(1.0, 0.5);
        for tiny in [1e-12, 1e-9] {
            let b = from_angles(1.0, 0.5 + tiny);
            assert!((angle(a, b) - tiny).abs() < 2e-16);
            assert!((angle(a, scale(-1.0, b)) - (std::f64::consts::PI - tiny)).abs() < 1e-15);
        }
    }
}
