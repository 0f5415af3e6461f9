//! The values 0, 1 and X, and packed vectors of them.

use std::fmt;

use serde::{Deserialize, Serialize};

/// A logic value: a subset of IEEE 1164.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[repr(u8)]
pub enum Value {
    /// Low.
    Zero = 0,
    /// High.
    One = 1,
    /// Unknown: 0 or 1.
    X = 2,
}

impl Value {
    /// The known value, or `None` for X.
    pub const fn known(self) -> Option<bool> {
        match self {
            Value::Zero => Some(false),
            Value::One => Some(true),
            Value::X => None,
        }
    }

    /// The letter used in every file and picture.
    pub const fn letter(self) -> char {
        match self {
            Value::Zero => '0',
            Value::One => '1',
            Value::X => 'X',
        }
    }
}

impl From<bool> for Value {
    fn from(bit: bool) -> Value {
        if bit { Value::One } else { Value::Zero }
    }
}

impl fmt::Display for Value {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}", self.letter())
    }
}

/// The shape of a glitch or hazard: from the values before and after, and the number of transitions between.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
pub enum Shape {
    /// 0 before and after, and a pulse between.
    Static0,
    /// 1 before and after, and a pulse between.
    Static1,
    /// One change is wanted, three or more were seen.
    Dynamic,
}

impl Shape {
    /// The word used in every file and text.
    pub const fn word(self) -> &'static str {
        match self {
            Shape::Static0 => "static-0",
            Shape::Static1 => "static-1",
            Shape::Dynamic => "dynamic",
        }
    }
}

/// A fixed number of bits, 64 a word; bits past the length are 0.
#[derive(Clone, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
pub struct Bits(Box<[u64]>);

impl Bits {
    /// `len` bits, all 0.
    pub fn zeros(len: usize) -> Bits {
        Bits(vec![0; len.div_ceil(64)].into())
    }

    /// The bits of an iterator, first bit first.
    pub fn of(bits: impl ExactSizeIterator<Item = bool>) -> Bits {
        let mut all = Bits::zeros(bits.len());
        for (i, bit) in bits.enumerate() {
            all.set(i, bit);
        }
        all
    }

    /// Bit `i`. Panics past the length.
    #[inline]
    pub fn get(&self, i: usize) -> bool {
        self.0[i >> 6] >> (i & 63) & 1 == 1
    }

    /// Sets bit `i`. Panics past the length.
    #[inline]
    pub fn set(&mut self, i: usize, bit: bool) {
        let mask = 1 << (i & 63);
        let word = &mut self.0[i >> 6];
        *word = if bit { *word | mask } else { *word & !mask };
    }

    /// Inverts bit `i`. Panics past the length.
    #[inline]
    pub fn flip(&mut self, i: usize) {
        self.0[i >> 6] ^= 1 << (i & 63);
    }

    /// The words, bit 0 of word 0 first.
    #[inline]
    pub fn words(&self) -> &[u64] {
        &self.0
    }

    /// The words, to be changed.
    pub fn words_mut(&mut self) -> &mut [u64] {
        &mut self.0
    }

    /// Is any bit 1?
    #[inline]
    pub fn any(&self) -> bool {
        self.0.iter().any(|word| *word != 0)
    }

    /// Copies another vector of the same length without allocating.
    #[inline]
    pub fn copy_from(&mut self, other: &Bits) {
        // for the one word of a small circuit a call would cost more than the copy
        match (&mut *self.0, &*other.0) {
            ([ours], [theirs]) => *ours = *theirs,
            (ours, theirs) => ours.copy_from_slice(theirs),
        }
    }

    /// The indices of the bits that are 1.
    pub fn ones(&self) -> impl Iterator<Item = usize> + '_ {
        self.0.iter().enumerate().flat_map(|(w, word)| {
            let mut rest = *word;
            std::iter::from_fn(move || {
                let bit = rest.trailing_zeros();
                (rest != 0).then(|| {
                    rest &= rest - 1;
                    w * 64 + bit as usize
                })
            })
        })
    }
}

/// A value for every net, by net number. An unknown net has its bit in `unknown` set and in `ones` clear.
#[derive(Clone, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
pub struct State {
    /// The nets at 1.
    pub ones: Bits,
    /// The nets at X; as long as `ones`.
    pub unknown: Bits,
}

impl State {
    /// All nets at 0.
    pub fn zeros(nets: usize) -> State {
        State { ones: Bits::zeros(nets), unknown: Bits::zeros(nets) }
    }

    /// A state of known values.
    pub fn known(ones: Bits) -> State {
        let unknown = Bits(vec![0; ones.0.len()].into());
        State { ones, unknown }
    }

    /// The value of net number `net`. Panics past the length.
    #[inline]
    pub fn get(&self, net: usize) -> Value {
        if self.unknown.get(net) { Value::X } else { Value::from(self.ones.get(net)) }
    }

    /// Sets the value of net number `net`. Panics past the length.
    #[inline]
    pub fn set(&mut self, net: usize, value: Value) {
        self.ones.set(net, value == Value::One);
        self.unknown.set(net, value == Value::X);
    }

    /// Is any net at X?
    #[inline]
    pub fn has_unknown(&self) -> bool {
        self.unknown.any()
    }

    /// Copies another state of the same length without allocating.
    #[inline]
    pub fn copy_from(&mut self, other: &State) {
        self.ones.copy_from(&other.ones);
        self.unknown.copy_from(&other.unknown);
    }
}
