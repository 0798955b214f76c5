//! Sums of products along diagonals, exactly, as one product of big integers.
//!
//! `Sum_{i+j=m} a_i b_j` for all `m` are the coefficients of a product of two polynomials. With the coefficients
//! packed side by side into slots of `w` bits, that is, with the variable set to `2^w`, it is one product of two
//! integers (Kronecker's substitution). Signs need no care when packing, as `Sum_i a_i 2^(w i)` is an ordinary
//! integer; a coefficient below `2^(w-1)` in size is read back after `2^(w-1)` has been added to every slot, which
//! makes all of them non-negative and removes the borrows.

use rug::Integer;
use rug::integer::Order;

const LIMB: usize = 64;

/// The width of the slots for one kind of product.
#[derive(Clone, Copy, Debug)]
pub struct Packing {
    limbs: usize,
}

impl Packing {
    /// For sums (or differences) of `products` products, each of at most `count` terms, of factors below `2^left` and
    /// `2^right` in size: `products * count * 2^(left + right)` stays below half a slot.
    pub fn new(left: u32, right: u32, count: usize, products: usize) -> Packing {
        let length = |n: usize| (usize::BITS - n.leading_zeros()) as usize;
        let bits = left as usize + right as usize + length(count) + length(products) + 1;
        Packing { limbs: bits.div_ceil(LIMB) }
    }

    /// The coefficients, side by side.
    pub fn pack<'a>(self, values: impl Iterator<Item = &'a Integer>) -> Integer {
        let (mut positive, mut negative): (Vec<u64>, Vec<u64>) = (Vec::new(), Vec::new());
        for value in values {
            let end = positive.len() + self.limbs;
            let digits = value.to_digits::<u64>(Order::Lsf);
            if *value < 0 {
                negative.extend(digits)
            } else {
                positive.extend(digits)
            }
            positive.resize(end, 0);
            negative.resize(end, 0);
        }
        Integer::from_digits(&positive, Order::Lsf) - Integer::from_digits(&negative, Order::Lsf)
    }

    /// The first `count` coefficients of a product of packed integers, or of a sum of such products.
    pub fn unpack(self, product: &Integer, count: usize) -> Vec<Integer> {
        let half = Integer::from(1) << (self.limbs * LIMB - 1) as u32;
        let mut offsets = vec![0u64; self.limbs * count];
        for (index, limb) in offsets.iter_mut().enumerate() {
            if index % self.limbs == self.limbs - 1 {
                *limb = 1 << (LIMB - 1);
            }
        }
        let shifted = Integer::from_digits(&offsets, Order::Lsf) + product;
        let mut digits = shifted.to_digits::<u64>(Order::Lsf);
        digits.resize(self.limbs * count, 0);
        digits.chunks(self.limbs).map(|slot| Integer::from_digits(slot, Order::Lsf) - &half).collect()
    }
}

/// An `n` with all `|values| < 2^n`.
pub fn length(values: &[Integer]) -> u32 {
    values.iter().map(Integer::significant_bits).max().unwrap_or(0)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn by_pairs(left: &[Integer], right: &[Integer]) -> Vec<Integer> {
        let mut sums = vec![Integer::new(); left.len() + right.len() - 1];
        for (i, a) in left.iter().enumerate() {
            for (j, b) in right.iter().enumerate() {
                sums[i + j] += Integer::from(a * b);
            }
        }
        sums
    }

    proptest::proptest! {
        #[test]
        fn agrees_with_the_double_loop(
            left in proptest::collection::vec(proptest::num::i128::ANY, 1..40),
            right in proptest::collection::vec(proptest::num::i128::ANY, 1..40),
            extreme in 0usize..4
        ) {
            let mut left: Vec<Integer> = left.into_iter().map(Integer::from).collect();
            let mut right: Vec<Integer> = right.into_iter().map(Integer::from).collect();
            if extreme == 0 {
                left.iter_mut().chain(right.iter_mut()).for_each(|v| *v = (Integer::from(1) << 127u32) - 1);
                right.iter_mut().for_each(|v| *v = Integer::from(-&*v));
            }
            let packing = Packing::new(length(&left), length(&right), left.len().min(right.len()), 1);
            let product = packing.pack(left.iter()) * packing.pack(right.iter());
            proptest::prop_assert_eq!(
                packing.unpack(&product, left.len() + right.len() - 1), by_pairs(&left, &right)
            );
        }
    }
}
