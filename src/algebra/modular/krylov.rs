//! The Krylov sequence of a [`Program`] modulo four primes, its minimal generating polynomial, and from these the
//! determinant and the numerators modulo each.
//!
//! Sources: D. H. Wiedemann, "Solving sparse linear equations over finite fields", IEEE Transactions on Information
//! Theory 32 (1986), for the sequence; J. L. Massey, "Shift-register synthesis and BCH decoding", same journal, 15
//! (1969), for its generating polynomial.
//!
//! For f(k) = c·M^k·v, the generating polynomial divides the minimal polynomial of M, which divides its characteristic
//! polynomial. So where its degree is the number of states it *is* the characteristic polynomial: nothing is left to
//! chance. Where it is less, the caller tries other vectors, and in the end another method.

// Only what is inlined into a function that enables AVX2 gets its instructions.
#![allow(clippy::inline_always)]

use super::super::prime::Prime;
use super::lanes::{Four, Lanes, Primes, from_number, to_number};
use super::program::{Input, Program, Sum};

/// Which vectors the determinant's sequence uses.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Plan {
    /// The first right side and the first output: they are wanted anyway.
    Direct,
    /// Arbitrary ones.
    Arbitrary,
}

/// Results modulo four primes.
pub(super) struct Images {
    /// The primes.
    pub(super) primes: [u64; 4],
    /// For each prime: the determinant, then for each right side and output its numerator, from the power 0 up.
    pub(super) images: Vec<Vec<Vec<u64>>>,
}

/// What a program's numbers are modulo four primes.
struct Constants {
    /// Residues of `Program::constants`; pivots are inverted.
    values: Vec<Four>,
    /// det L.
    lead: Four,
}

/// What is known after looking at four primes.
pub(super) enum Outcome {
    /// All there is.
    Done(Images),
    /// The generating polynomial's degree was less than the number of states.
    Short,
    /// A pivot vanishes modulo one of the primes: take others.
    Unlucky,
}

/// Determinant and numerators modulo four primes.
pub(super) fn images(program: &Program, primes: [u64; 4], plan: Plan) -> Outcome {
    let fields = primes.map(Prime::new);
    let Some(constants) = constants(program, &fields) else { return Outcome::Unlucky };
    let n = program.states;
    let mut sequences = Vec::new();
    let long = if plan == Plan::Direct { 2 * n } else { n };
    for r in 0..program.inputs.len() {
        let count = if r == 0 { long } else { n };
        sequences.push(run(program, &constants, primes, &Start::Right(r, &fields), count));
    }
    let own;
    let base = if plan == Plan::Direct {
        let Some(s) = sequences.first().and_then(|s| s.outputs.first()) else { return Outcome::Short };
        s
    } else {
        own = run(program, &constants, primes, &Start::Arbitrary, 2 * n);
        &own.mixed
    };
    let Some(connection) = generating(base, n, primes) else { return Outcome::Short };
    let all = polynomials(&connection, constants.lead, &sequences, primes);
    let number = |p: &[Four], lane: usize| p.iter().map(|m| to_number(m.0[lane], primes[lane])).collect();
    let images = (0..4).map(|lane| all.iter().map(|p| number(p, lane)).collect()).collect();
    Outcome::Done(Images { primes, images })
}

/// Determinant and numerators from the connection polynomial c, χ(s) = s^n·c(1/s), and the sequences.
fn polynomials(c: &[Four], lead: Four, sequences: &[Sequences], primes: [u64; 4]) -> Vec<Vec<Four>> {
    #[cfg(target_arch = "x86_64")]
    if super::lanes::avx::available() {
        // SAFETY: the instructions are there.
        return unsafe { polynomials_in_registers(c, lead, sequences, primes) };
    }
    polynomials_in::<super::lanes::Plain>(c, lead, sequences, primes)
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2,fma")]
unsafe fn polynomials_in_registers(
    c: &[Four],
    lead: Four,
    sequences: &[Sequences],
    primes: [u64; 4],
) -> Vec<Vec<Four>> {
    polynomials_in::<super::lanes::avx::Register>(c, lead, sequences, primes)
}

#[inline(always)]
fn polynomials_in<L: Lanes>(c: &[Four], lead: Four, sequences: &[Sequences], primes: [u64; 4]) -> Vec<Vec<Four>> {
    let field = Primes::<L>::new(&primes);
    let lead = L::load(&lead);
    let n = c.len() - 1;
    let mut det = Vec::with_capacity(n + 1);
    for x in c.iter().rev() {
        det.push(field.mul(L::load(x), lead).store());
    }
    let mut all = vec![det];
    for s in sequences {
        for (sequence, direct) in s.outputs.iter().zip(&s.direct) {
            // χ·(direct + Σ f(k)/s^(k+1)): the negative powers vanish; the coefficient of s^power has c_i·s^(n-i)
            // times f(k)·s^(-k-1) with i + k = n - 1 - power.
            let mut numerator = Vec::with_capacity(n + 1);
            for power in 0..=n {
                let product = field.mul(L::load(direct), L::load(&c[n - power]));
                let sum = field.reduce(discrepancy(field, c, &sequence[..n - power]).add(product));
                numerator.push(field.mul(sum, lead).store());
            }
            all.push(numerator);
        }
    }
    all
}

fn constants(program: &Program, fields: &[Prime; 4]) -> Option<Constants> {
    let mut values = vec![Four::default(); program.constants.len()];
    let mut lead = Four::default();
    for (lane, f) in fields.iter().enumerate() {
        let mut residues: Vec<u64> = program.constants.iter().map(|c| f.of_big(c)).collect();
        // All pivots inverted by one inversion.
        let mut running = f.one;
        let mut before = Vec::with_capacity(program.solves.len());
        for s in &program.solves {
            before.push(running);
            running = f.mul(running, residues[s.pivot as usize]);
        }
        if running == 0 {
            return None;
        }
        lead.0[lane] = from_number(f.value(if program.odd { f.sub(0, running) } else { running }), f.p);
        let mut inverse = f.inverse(running);
        for (s, b) in program.solves.iter().zip(before).rev() {
            let pivot = residues[s.pivot as usize];
            residues[s.pivot as usize] = f.mul(inverse, b);
            inverse = f.mul(inverse, pivot);
        }
        for (v, r) in values.iter_mut().zip(residues) {
            v.0[lane] = from_number(f.value(r), f.p);
        }
    }
    Some(Constants { values, lead })
}

/// Where a sequence starts.
enum Start<'a> {
    /// The states that a right side drives.
    Right(usize, &'a [Prime; 4]),
    /// Arbitrary states.
    Arbitrary,
}

/// The sequences of all outputs from one start.
struct Sequences {
    /// f(0), f(1), … for each output.
    outputs: Vec<Vec<Four>>,
    /// What each output gets of the right side directly.
    direct: Vec<Four>,
    /// The sequence of an arbitrary output, from an arbitrary start only.
    mixed: Vec<Four>,
}

/// Weights of the arbitrary output and values of the arbitrary start: 20 bits of splitmix64 (see [`Prime::scattered`]).
fn arbitrary(k: usize) -> f64 {
    (Prime::first().scattered(k as u64) & 0xf_ffff) as f64 + 1.0
}

fn run(program: &Program, constants: &Constants, primes: [u64; 4], start: &Start<'_>, count: usize) -> Sequences {
    #[cfg(target_arch = "x86_64")]
    if super::lanes::avx::available() {
        // SAFETY: the instructions are there.
        return unsafe { run_in_registers(program, constants, primes, start, count) };
    }
    run_in::<super::lanes::Plain>(program, constants, primes, start, count)
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2,fma")]
unsafe fn run_in_registers(
    program: &Program,
    constants: &Constants,
    primes: [u64; 4],
    start: &Start<'_>,
    count: usize,
) -> Sequences {
    run_in::<super::lanes::avx::Register>(program, constants, primes, start, count)
}

#[inline(always)]
fn run_in<L: Lanes>(
    program: &Program,
    constants: &Constants,
    primes: [u64; 4],
    start: &Start<'_>,
    count: usize,
) -> Sequences {
    let mut m = Machine::<L> {
        program,
        constants: &constants.values,
        field: Primes::new(&primes),
        states: vec![Four::default(); program.states],
        low: vec![Four::default(); program.ys],
        high: vec![Four::default(); program.ys],
    };
    let mut out = Sequences { outputs: vec![Vec::new(); program.outputs.len()], direct: Vec::new(), mixed: Vec::new() };
    match start {
        Start::Right(r, fields) => out.direct = m.drive(&program.inputs[*r], fields),
        Start::Arbitrary => {
            for (k, s) in m.states.iter_mut().enumerate() {
                *s = Four([arbitrary(2 * k); 4]);
            }
        }
    }
    let weights: Vec<f64> = match start {
        Start::Right(..) => Vec::new(),
        Start::Arbitrary => (0..program.ys).map(|k| arbitrary(2 * k + 1)).collect(),
    };
    for _ in 0..count {
        m.solve(None);
        if weights.is_empty() {
            for (sequence, sum) in out.outputs.iter_mut().zip(&program.outputs) {
                let value = m.reduce_sum(sum);
                sequence.push(value);
            }
        } else {
            let value = m.mixed(&weights);
            out.mixed.push(value);
        }
        m.update();
    }
    out
}

/// The program's registers.
struct Machine<'a, L> {
    program: &'a Program,
    constants: &'a [Four],
    field: Primes<L>,
    states: Vec<Four>,
    /// Lower halves of x.
    low: Vec<Four>,
    /// Upper halves of x.
    high: Vec<Four>,
}

impl<L: Lanes> Machine<'_, L> {
    /// `from` - Σ c·x, reduced.
    #[inline(always)]
    fn less(&self, sum: &Sum, from: L) -> L {
        let mut value = from;
        for chunk in &self.program.chunks[sum.chunks.start as usize..sum.chunks.end as usize] {
            let (mut low, mut high) = (L::splat(0.0), L::splat(0.0));
            for &(y, c) in &self.program.terms[chunk.start as usize..chunk.end as usize] {
                let c = L::splat(c);
                low = c.mul_add(L::load(&self.low[y as usize]), low);
                high = c.mul_add(L::load(&self.high[y as usize]), high);
            }
            value = self.field.reduce(value.sub(self.field.joined(low, high)));
        }
        for &(y, k) in &self.program.long[sum.long.start as usize..sum.long.end as usize] {
            let x =
                L::load(&self.high[y as usize]).mul_add(L::splat(super::lanes::SPLIT), L::load(&self.low[y as usize]));
            let product = self.field.mul(L::load(&self.constants[k as usize]), x);
            value = self.field.reduce(value.sub(product));
        }
        value
    }

    /// Σ c·x, reduced.
    #[inline(always)]
    fn reduce_sum(&self, sum: &Sum) -> Four {
        L::splat(0.0).sub(self.less(sum, L::splat(0.0))).store()
    }

    /// Σ weight·x over all x.
    #[inline(always)]
    fn mixed(&self, weights: &[f64]) -> Four {
        let mut value = L::splat(0.0);
        // 64 weights of 20 bits stay within what a chunk may hold.
        for (chunk, w) in weights.chunks(64).enumerate() {
            let (mut low, mut high) = (L::splat(0.0), L::splat(0.0));
            for (k, &c) in w.iter().enumerate() {
                let c = L::splat(c);
                low = c.mul_add(L::load(&self.low[64 * chunk + k]), low);
                high = c.mul_add(L::load(&self.high[64 * chunk + k]), high);
            }
            value = self.field.reduce(value.add(self.field.joined(low, high)));
        }
        value.store()
    }

    /// x from the states, and from inputs to the rows of L where there are some.
    #[inline(always)]
    fn solve(&mut self, tops: Option<&[Four]>) {
        for s in &self.program.solves {
            let mut value = s.state.map_or(L::splat(0.0), |w| L::load(&self.states[w as usize]));
            if let Some(tops) = tops {
                value = self.field.reduce(value.add(L::load(&tops[s.row as usize])));
            }
            value = self.less(&s.sum, value);
            let x = self.field.reduce(self.field.mul(value, L::load(&self.constants[s.pivot as usize])));
            let (low, high) = Primes::split(x);
            self.low[s.y as usize] = low.store();
            self.high[s.y as usize] = high.store();
        }
    }

    /// The next states from these and x.
    #[inline(always)]
    fn update(&mut self) {
        for u in &self.program.updates {
            let from = u.from.map_or(L::splat(0.0), |w| L::load(&self.states[w as usize]));
            self.states[u.to as usize] = self.less(&u.sum, from).store();
        }
    }

    /// Sets the states to what a right side drives, and gives what each output gets of it directly.
    #[inline(always)]
    fn drive(&mut self, inputs: &[Input], fields: &[Prime; 4]) -> Vec<Four> {
        let lanes = |c: &dashu_int::IBig| {
            let mut m = Four::default();
            for (slot, f) in m.0.iter_mut().zip(fields) {
                *slot = from_number(f.value(f.of_big(c)), f.p);
            }
            m
        };
        let mut tops = vec![Four::default(); self.program.ys];
        for i in inputs {
            if let Input::Top(row, c) = i {
                tops[*row as usize] = lanes(c);
            }
        }
        self.solve(Some(&tops));
        let direct = self.program.outputs.iter().map(|sum| self.reduce_sum(sum)).collect();
        self.update();
        for i in inputs {
            if let Input::State(w, c) = i {
                let sum = L::load(&self.states[*w as usize]).add(L::load(&lanes(c)));
                self.states[*w as usize] = self.field.reduce(sum).store();
            }
        }
        direct
    }
}

/// The connection polynomial c (c_0 = 1) of a sequence, where its degree is `n` modulo each of the primes.
fn generating(sequence: &[Four], n: usize, primes: [u64; 4]) -> Option<Vec<Four>> {
    #[cfg(target_arch = "x86_64")]
    let together = if super::lanes::avx::available() {
        // SAFETY: the instructions are there.
        unsafe { massey_in_registers(sequence, primes) }
    } else {
        massey::<super::lanes::Plain>(sequence, primes)
    };
    #[cfg(not(target_arch = "x86_64"))]
    let together = massey::<super::lanes::Plain>(sequence, primes);
    let (c, length) = match together {
        Some(t) => t,
        None => one_by_one(sequence, n, primes)?,
    };
    (length == n).then_some(c)
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2,fma")]
unsafe fn massey_in_registers(sequence: &[Four], primes: [u64; 4]) -> Option<(Vec<Four>, usize)> {
    massey::<super::lanes::avx::Register>(sequence, primes)
}

/// Massey's algorithm for four primes at once: the connection polynomial, of `length` + 1 coefficients. `None` where
/// the four would take different turns.
#[inline(always)]
fn massey<L: Lanes>(sequence: &[Four], primes: [u64; 4]) -> Option<(Vec<Four>, usize)> {
    let field = Primes::<L>::new(&primes);
    let one = Four([1.0; 4]);
    let (mut c, mut b) = (vec![one], vec![one]);
    let (mut length, mut gap, mut inverse) = (0, 1, L::splat(1.0));
    for at in 0..sequence.len() {
        let d = discrepancy(field, &c[..c.len().min(length + 1)], &sequence[..=at]).store();
        let zeros = d.0.iter().filter(|&&x| x == 0.0).count();
        if zeros == 4 {
            gap += 1;
            continue;
        }
        if zeros > 0 {
            return None;
        }
        let factor = field.reduce(field.mul(L::load(&d), inverse));
        // c - factor·x^gap·b, kept beside c where c is needed once more.
        let grows = 2 * length <= at;
        let mut new = c.clone();
        if new.len() < b.len() + gap {
            new.resize(b.len() + gap, Four::default());
        }
        for (slot, x) in new[gap..].iter_mut().zip(&b) {
            let product = field.mul(factor, L::load(x));
            *slot = field.reduce(L::load(slot).sub(product)).store();
        }
        if grows {
            length = at + 1 - length;
            inverse = field.inverse(L::load(&d), &primes);
            b = std::mem::replace(&mut c, new);
            gap = 1;
        } else {
            c = new;
            gap += 1;
        }
    }
    c.resize(length + 1, Four::default());
    Some((c, length))
}

/// Σ c_i·s_(last - i), reduced to 0 where it is 0.
#[inline(always)]
fn discrepancy<L: Lanes>(field: Primes<L>, c: &[Four], s: &[Four]) -> L {
    let count = c.len().min(s.len());
    let mut sum = L::splat(0.0);
    let mut i = 0;
    while i < count {
        // Four products below p each, and a sum below p, stay below 2^53.
        let end = (i + 4).min(count);
        while i < end {
            sum = sum.add(field.mul(L::load(&c[i]), L::load(&s[s.len() - 1 - i])));
            i += 1;
        }
        sum = field.reduce(sum);
    }
    field.reduce(sum)
}

/// Massey's algorithm for each prime by itself; `None` where one has a length other than `n`.
fn one_by_one(sequence: &[Four], n: usize, primes: [u64; 4]) -> Option<(Vec<Four>, usize)> {
    let mut out = vec![Four::default(); n + 1];
    for (lane, &p) in primes.iter().enumerate() {
        let f = Prime::new(p);
        let s: Vec<u64> = sequence.iter().map(|m| f.of(to_number(m.0[lane], p))).collect();
        let (mut c, mut b) = (vec![f.one], vec![f.one]);
        let (mut length, mut gap, mut inverse) = (0, 1, f.one);
        for at in 0..s.len() {
            let d = c.iter().take(length + 1).enumerate().fold(0, |d, (i, &x)| f.add(d, f.mul(x, s[at - i])));
            if d == 0 {
                gap += 1;
                continue;
            }
            let factor = f.mul(d, inverse);
            let old = c.clone();
            if c.len() < b.len() + gap {
                c.resize(b.len() + gap, 0);
            }
            for (slot, &x) in c[gap..].iter_mut().zip(&b) {
                *slot = f.sub(*slot, f.mul(factor, x));
            }
            if 2 * length <= at {
                length = at + 1 - length;
                inverse = f.inverse(d);
                b = old;
                gap = 1;
            } else {
                gap += 1;
            }
        }
        if length != n {
            return None;
        }
        c.resize(n + 1, 0);
        for (slot, x) in out.iter_mut().zip(c) {
            slot.0[lane] = from_number(f.value(x), p);
        }
    }
    Some((out, n))
}
