//! Vectors in space.

/// a - b
pub(super) fn difference(a: [f64; 3], b: [f64; 3]) -> [f64; 3] {
    std::array::from_fn(|axis| a[axis] - b[axis])
}

/// The scalar product.
pub(super) fn dot(a: [f64; 3], b: [f64; 3]) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

/// The vector product.
pub(super) fn cross(a: [f64; 3], b: [f64; 3]) -> [f64; 3] {
    std::array::from_fn(|axis| {
        let (next, last) = ((axis + 1) % 3, (axis + 2) % 3);
        a[next] * b[last] - a[last] * b[next]
    })
}

/// The length.
pub(super) fn norm(a: [f64; 3]) -> f64 {
    dot(a, a).sqrt()
}

/// A multiple.
pub(super) fn scaled(a: [f64; 3], factor: f64) -> [f64; 3] {
    a.map(|component| component * factor)
}
