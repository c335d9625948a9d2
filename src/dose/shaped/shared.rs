//! Edges that rectangles share: where one leaf ends the next one mostly begins,
//! and what was worked out for an edge need not be worked out again.

/// What the last rectangle's edges along one axis gave.
pub(super) struct Shared<T> {
    last: Option<([f64; 2], [T; 2])>,
}

impl<T: Copy> Shared<T> {
    pub(super) const fn new() -> Self {
        Self { last: None }
    }

    /// What `of` gives for the lower and the upper edge, cm.
    #[inline(always)]
    pub(super) fn pair(&mut self, edges_cm: [f64; 2], of: impl Fn(f64) -> T) -> [T; 2] {
        let values = match self.last {
            Some((last_cm, values)) if last_cm == edges_cm => return values,
            Some((last_cm, [_, upper])) if last_cm[1] == edges_cm[0] => [upper, of(edges_cm[1])],
            _ => [of(edges_cm[0]), of(edges_cm[1])],
        };
        self.last = Some((edges_cm, values));
        values
    }
}
