//! The inner loop of elimination: `y += f · x` over a stretch of a row, in double-double, on the widest registers that
//! the machine has.

use pulp::{Arch, WithSimd};

use super::dd::{Dd, fast_two_sum, two_product, two_sum};

/// A stretch of numbers as separate high and low parts, which is what wide registers want.
#[derive(Debug, Clone, Default)]
pub(super) struct Stretch {
    pub(super) hi: Vec<f64>,
    pub(super) lo: Vec<f64>,
}

impl Stretch {
    pub(super) fn zeros(length: usize) -> Self {
        Self { hi: vec![0.0; length], lo: vec![0.0; length] }
    }

    pub(super) fn get(&self, at: usize) -> Dd {
        Dd { hi: self.hi[at], lo: self.lo[at] }
    }

    pub(super) fn set(&mut self, at: usize, value: Dd) {
        self.hi[at] = value.hi;
        self.lo[at] = value.lo;
    }
}

/// Chosen once; adds a multiple of one stretch to another.
#[derive(Debug, Clone, Copy)]
pub(super) struct Kernel(Arch);

impl Kernel {
    pub(super) fn new() -> Self {
        Self(Arch::new())
    }

    /// `y[i] += f · x[i]`, all numbers not negative. The same bits on every machine.
    pub(super) fn add_multiple(self, f: Dd, x: (&[f64], &[f64]), y: (&mut [f64], &mut [f64])) {
        self.0.dispatch(AddMultiple { f, x, y });
    }
}

struct AddMultiple<'a> {
    f: Dd,
    x: (&'a [f64], &'a [f64]),
    y: (&'a mut [f64], &'a mut [f64]),
}

impl WithSimd for AddMultiple<'_> {
    type Output = ();

    #[inline(always)]
    fn with_simd<S: pulp::Simd>(self, _simd: S) {
        let Self { f, x, y } = self;
        // The loop is compiled once per processor family; only the exact product differs, and both ways give its bits.
        if S::IS_SCALAR {
            each(f, x, y, &two_product);
        } else {
            each(f, x, y, &|a, b| {
                let p = a * b;
                (p, a.mul_add(b, -p))
            });
        }
    }
}

#[inline(always)]
#[expect(clippy::needless_pass_by_value, reason = "a pair of slices is a view")]
fn each(f: Dd, x: (&[f64], &[f64]), y: (&mut [f64], &mut [f64]), product: &impl Fn(f64, f64) -> (f64, f64)) {
    let n = x.0.len();
    let (x_hi, x_lo, y_hi, y_lo) = (&x.0[..n], &x.1[..n], &mut y.0[..n], &mut y.1[..n]);
    for i in 0..n {
        let (p, e) = product(f.hi, x_hi[i]);
        let (p, e) = fast_two_sum(p, e + (f.hi * x_lo[i] + f.lo * x_hi[i]));
        let (s, r) = two_sum(y_hi[i], p);
        (y_hi[i], y_lo[i]) = fast_two_sum(s, r + (y_lo[i] + e));
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn wide_registers_give_the_bits_of_plain_arithmetic() {
        let n = 37;
        let x: Vec<Dd> = (1..=n).map(|i| Dd::of_u64(i as u64).over(Dd::of_u64(7))).collect();
        let mut y: Vec<Dd> = (1..=n).map(|i| Dd::ONE.over(Dd::of_u64(i as u64 * 3))).collect();
        let f = Dd::of_u64(5).over(Dd::of_u64(11));
        let (mut xs, mut ys) = (Stretch::zeros(n), Stretch::zeros(n));
        for i in 0..n {
            xs.set(i, x[i]);
            ys.set(i, y[i]);
        }
        Kernel::new().add_multiple(f, (&xs.hi, &xs.lo), (&mut ys.hi, &mut ys.lo));
        for i in 0..n {
            y[i] = y[i].plus(f.times(x[i]));
            assert_eq!(ys.get(i), y[i], "{i}");
        }
    }
}
