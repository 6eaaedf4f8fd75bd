//! Figures with their dimension and a bound on their error.

use crate::language::Sym;
use crate::number::Real;
use smallvec::{SmallVec, smallvec};

/// What a dimension is made of.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub enum Base {
    /// Time, counted in hours.
    Time,
    /// Mass, counted in kilograms.
    Mass,
    /// A declared exposure, or the unit of a declared attribute.
    Word(Sym),
}

/// Powers of bases; empty for a bare number.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Dim(SmallVec<[(Base, i16); 1]>);

impl Dim {
    /// A bare number.
    pub const NONE: Dim = Dim(SmallVec::new_const());

    /// A base to a power.
    pub fn of(base: Base, power: i16) -> Dim {
        Dim(smallvec![(base, power)])
    }

    /// Whether it is a bare number.
    pub fn is_none(&self) -> bool {
        self.0.is_empty()
    }

    /// The base and power, where there is only one base.
    pub fn single(&self) -> Option<(Base, i16)> {
        match self.0.as_slice() {
            [one] => Some(*one),
            _ => None,
        }
    }

    /// The bases with their powers, in a fixed order.
    pub fn parts(&self) -> &[(Base, i16)] {
        &self.0
    }

    /// `self` times `other` to the power `power`; `None` when a power leaves 16 bits.
    pub fn times(&self, other: &Dim, power: i16) -> Option<Dim> {
        let mut parts = self.0.clone();
        for (base, p) in &other.0 {
            let p = p.checked_mul(power)?;
            match parts.iter_mut().find(|(b, _)| b == base) {
                Some((_, q)) => *q = q.checked_add(p)?,
                None => parts.push((*base, p)),
            }
        }
        parts.retain(|(_, p)| *p != 0);
        parts.sort_unstable();
        Some(Dim(parts))
    }

    /// The root of degree 2, where there is one.
    pub fn sqrt(&self) -> Option<Dim> {
        self.0
            .iter()
            .map(|(b, p)| (p % 2 == 0).then_some((*b, p / 2)))
            .collect::<Option<SmallVec<_>>>()
            .map(Dim)
    }
}

/// A figure: its value in base units (h, kg, declared words), what 1 minus it
/// is where that is known better than subtraction would give it, its dimension,
/// and an absolute bound on its error.
#[derive(Clone, PartialEq, Debug)]
pub struct Quantity {
    /// The value.
    pub value: Real,
    /// 1 − value, known from the decimal text or from the other tail.
    pub complement: Option<Real>,
    /// Its dimension.
    pub dim: Dim,
    /// |true value − value| is at most this.
    pub error: f64,
}

/// Relative error of one operation of [`Real`], with room to spare.
pub const STEP: f64 = 1.0 / (1_u128 << 96) as f64;

impl Quantity {
    /// A bare number whose error is that of rounding alone.
    pub fn number(value: Real) -> Quantity {
        Quantity { value, complement: None, dim: Dim::NONE, error: value.to_f64().abs() * STEP }
    }

    /// The same with another dimension.
    #[must_use]
    pub fn with_dim(mut self, dim: Dim) -> Quantity {
        self.dim = dim;
        self
    }

    /// The bound on the error relative to the value; infinite for 0.
    pub fn relative_error(&self) -> f64 {
        let size = self.value.to_f64().abs();
        if self.error == 0.0 {
            0.0
        } else if size == 0.0 {
            f64::INFINITY
        } else {
            self.error / size
        }
    }

    /// The value as a whole number, if it is one between 0 and `u32::MAX`.
    pub fn whole(&self) -> Option<u32> {
        let nearest = self.value.to_f64().round();
        let off = (self.value - Real::from(nearest)).to_f64().abs();
        let fits = self.dim.is_none() && (0.0..=f64::from(u32::MAX)).contains(&nearest);
        (fits && off <= self.error.max(nearest * STEP)).then_some(nearest as u32)
    }
}
