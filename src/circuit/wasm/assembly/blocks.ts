/**
 * The inner loops of src/circuit/blocks.ts in AssemblyScript: 128-bit vectors of two numbers, two vectors in flight.
 * Same arguments, positions counted in numbers. Built by `npm run build:kernel` into ../binary.generated.ts.
 *
 * Every n is a multiple of 4. The half angle must stay below 2²⁰·π/2; the caller sees to it.
 */

/** Numbers a block, as BLOCK in src/circuit/blocks.ts. */
const BLOCK_BYTES: usize = 256 * 8;
/** Numbers a ring, as HEAP_RING there. */
const RING_BYTES: usize = 6 * 8;

// π/2 in two parts, the first of 33 bits so that k times it is exact (the split of fdlibm's e_rem_pio2.c, 1993)
const TWO_OVER_PI: f64 = 0.6366197723675814;
const PIO2_HIGH: f64 = 1.5707963267341256;
const PIO2_LOW: f64 = 6.077100506506192e-11;
// 1.5·2⁵² rounds to the nearest whole number, which is then the low bits of the sum
const ROUNDER: f64 = 6755399441055744;

// minimax polynomials on [−π/4, π/4] (fdlibm k_sin.c and k_cos.c, 1993)
const S1: f64 = -0.16666666666666632;
const S2: f64 = 0.00833333333332249;
const S3: f64 = -0.0001984126982985795;
const S4: f64 = 2.7557313707070068e-6;
const S5: f64 = -2.5050760253406863e-8;
const S6: f64 = 1.58969099521155e-10;
const C1: f64 = 0.0416666666666666;
const C2: f64 = -0.001388888888887411;
const C3: f64 = 2.480158728947673e-5;
const C4: f64 = -2.7557314351390663e-7;
const C5: f64 = 2.087572321298175e-9;
const C6: f64 = -1.1359647557788195e-11;

/** One vector of sines and cosines. */
function sineCosine(x: v128, cosAt: usize, sinAt: usize): void {
  const magic = f64x2.splat(ROUNDER);
  const shifted = f64x2.add(f64x2.mul(x, f64x2.splat(TWO_OVER_PI)), magic);
  const k = f64x2.sub(shifted, magic);
  const r = f64x2.sub(
    f64x2.sub(x, f64x2.mul(k, f64x2.splat(PIO2_HIGH))),
    f64x2.mul(k, f64x2.splat(PIO2_LOW)),
  );
  const z = f64x2.mul(r, r);
  let p = f64x2.add(f64x2.splat(S5), f64x2.mul(z, f64x2.splat(S6)));
  p = f64x2.add(f64x2.splat(S4), f64x2.mul(z, p));
  p = f64x2.add(f64x2.splat(S3), f64x2.mul(z, p));
  p = f64x2.add(f64x2.splat(S2), f64x2.mul(z, p));
  p = f64x2.add(f64x2.splat(S1), f64x2.mul(z, p));
  const sine = f64x2.add(r, f64x2.mul(f64x2.mul(z, r), p));
  let q = f64x2.add(f64x2.splat(C5), f64x2.mul(z, f64x2.splat(C6)));
  q = f64x2.add(f64x2.splat(C4), f64x2.mul(z, q));
  q = f64x2.add(f64x2.splat(C3), f64x2.mul(z, q));
  q = f64x2.add(f64x2.splat(C2), f64x2.mul(z, q));
  q = f64x2.add(f64x2.splat(C1), f64x2.mul(z, q));
  const one = f64x2.splat(1.0);
  const half = f64x2.mul(z, f64x2.splat(0.5));
  const w = f64x2.sub(one, half);
  const rest = f64x2.add(f64x2.sub(f64x2.sub(one, w), half), f64x2.mul(f64x2.mul(z, z), q));
  const cosine = f64x2.add(w, rest);
  // quadrant: swap on odd k, signs from bit 1 of k and of k + 1
  const two = i64x2.splat(2);
  const odd = i64x2.shr_s(i64x2.shl(shifted, 63), 63);
  const sinSign = i64x2.shl(v128.and(shifted, two), 62);
  const cosSign = i64x2.shl(v128.and(i64x2.add(shifted, i64x2.splat(1)), two), 62);
  v128.store(cosAt, v128.xor(v128.bitselect(sine, cosine, odd), cosSign));
  v128.store(sinAt, v128.xor(v128.bitselect(cosine, sine, odd), sinSign));
}

export function halfAngles(n: i32, omega: i32, half: f64, cos: i32, sin: i32): void {
  let x = (<usize>omega) << 3;
  let c = (<usize>cos) << 3;
  let s = (<usize>sin) << 3;
  const end = x + ((<usize>n) << 3);
  const h = f64x2.splat(half);
  while (x < end) {
    sineCosine(f64x2.mul(v128.load(x), h), c, s);
    sineCosine(f64x2.mul(v128.load(x, 16), h), c + 16, s + 16);
    x += 32;
    c += 32;
    s += 32;
  }
}

export function rotate(
  n: i32,
  omega: i32,
  steps: i32,
  half: f64,
  cosStep: i32,
  c0: f64,
  s0: f64,
  cos: i32,
): f64 {
  let x = (<usize>omega) << 3;
  let away = (<usize>steps) << 3;
  let step = (<usize>cosStep) << 3;
  let to = (<usize>cos) << 3;
  const end = x + ((<usize>n) << 3);
  const first = v128.load_splat<f64>(x);
  const h = f64x2.splat(half);
  const cosStart = f64x2.splat(c0);
  const sinStart = f64x2.splat(s0);
  let worst = f64x2.splat(0.0);
  while (x < end) {
    const stray = f64x2.sub(f64x2.sub(v128.load(x), first), v128.load(away));
    worst = f64x2.max(worst, f64x2.abs(stray));
    const turn = f64x2.mul(stray, h);
    const a = v128.load(step);
    const b = v128.load(step + BLOCK_BYTES);
    const c = f64x2.sub(f64x2.mul(cosStart, a), f64x2.mul(sinStart, b));
    const s = f64x2.add(f64x2.mul(sinStart, a), f64x2.mul(cosStart, b));
    v128.store(to, f64x2.sub(c, f64x2.mul(turn, s)));
    v128.store(to + BLOCK_BYTES, f64x2.add(s, f64x2.mul(turn, c)));
    x += 16;
    away += 16;
    step += 16;
    to += 16;
  }
  return max(f64x2.extract_lane(worst, 0), f64x2.extract_lane(worst, 1));
}

export function fillArm(n: i32, re: i32, im: i32, valueRe: f64, valueIm: f64): void {
  let r = (<usize>re) << 3;
  let i = (<usize>im) << 3;
  const end = r + ((<usize>n) << 3);
  const vRe = f64x2.splat(valueRe);
  const vIm = f64x2.splat(valueIm);
  while (r < end) {
    v128.store(r, vRe);
    v128.store(i, vIm);
    r += 16;
    i += 16;
  }
}

export function delayArm(n: i32, cos: i32, sin: i32, re: i32, im: i32, valueRe: f64, valueIm: f64): void {
  let cAt = (<usize>cos) << 3;
  let sAt = (<usize>sin) << 3;
  let r = (<usize>re) << 3;
  let i = (<usize>im) << 3;
  const end = r + ((<usize>n) << 3);
  const vRe = f64x2.splat(valueRe);
  const vIm = f64x2.splat(valueIm);
  const minusTwo = f64x2.splat(-2.0);
  while (r < end) {
    const c = v128.load(cAt);
    const s = v128.load(sAt);
    const eRe = f64x2.sub(f64x2.mul(c, c), f64x2.mul(s, s));
    const eIm = f64x2.mul(f64x2.mul(minusTwo, c), s);
    v128.store(r, f64x2.sub(f64x2.mul(vRe, eRe), f64x2.mul(vIm, eIm)));
    v128.store(i, f64x2.add(f64x2.mul(vRe, eIm), f64x2.mul(vIm, eRe)));
    cAt += 16;
    sAt += 16;
    r += 16;
    i += 16;
  }
}

/** arm ← arm·sign·conj(P)²/|P|². */
function applyAllPass(pRe: v128, pIm: v128, sign: v128, re: usize, im: usize): void {
  const rr = f64x2.mul(pRe, pRe);
  const ii = f64x2.mul(pIm, pIm);
  const norm = f64x2.div(sign, f64x2.add(rr, ii));
  const qRe = f64x2.mul(f64x2.sub(rr, ii), norm);
  const cross = f64x2.mul(pRe, pIm);
  const qIm = f64x2.neg(f64x2.mul(f64x2.add(cross, cross), norm));
  const aRe = v128.load(re);
  const aIm = v128.load(im);
  v128.store(re, f64x2.sub(f64x2.mul(aRe, qRe), f64x2.mul(aIm, qIm)));
  v128.store(im, f64x2.add(f64x2.mul(aRe, qIm), f64x2.mul(aIm, qRe)));
}

export function allPassRings(n: i32, cos: i32, sin: i32, rings: i32, count: i32, re: i32, im: i32): void {
  let cAt = (<usize>cos) << 3;
  let sAt = (<usize>sin) << 3;
  let reAt = (<usize>re) << 3;
  let imAt = (<usize>im) << 3;
  const end = cAt + ((<usize>n) << 3);
  const first = (<usize>rings) << 3;
  const last = first + <usize>count * RING_BYTES;
  const sign = f64x2.splat(count & 1 ? -1.0 : 1.0);
  while (cAt < end) {
    const c0 = v128.load(cAt);
    const s0 = v128.load(sAt);
    const c1 = v128.load(cAt, 16);
    const s1 = v128.load(sAt, 16);
    let p0Re = f64x2.splat(1.0);
    let p0Im = f64x2.splat(0.0);
    let p1Re = f64x2.splat(1.0);
    let p1Im = f64x2.splat(0.0);
    for (let ring = first; ring < last; ring += RING_BYTES) {
      const m0 = v128.load_splat<f64>(ring);
      const m1 = v128.load_splat<f64>(ring, 8);
      const m2 = v128.load_splat<f64>(ring, 16);
      const m3 = v128.load_splat<f64>(ring, 24);
      const b0Re = f64x2.sub(f64x2.mul(m0, c0), f64x2.mul(m1, s0));
      const b0Im = f64x2.add(f64x2.mul(m2, s0), f64x2.mul(m3, c0));
      const b1Re = f64x2.sub(f64x2.mul(m0, c1), f64x2.mul(m1, s1));
      const b1Im = f64x2.add(f64x2.mul(m2, s1), f64x2.mul(m3, c1));
      const next0 = f64x2.sub(f64x2.mul(p0Re, b0Re), f64x2.mul(p0Im, b0Im));
      p0Im = f64x2.add(f64x2.mul(p0Re, b0Im), f64x2.mul(p0Im, b0Re));
      p0Re = next0;
      const next1 = f64x2.sub(f64x2.mul(p1Re, b1Re), f64x2.mul(p1Im, b1Im));
      p1Im = f64x2.add(f64x2.mul(p1Re, b1Im), f64x2.mul(p1Im, b1Re));
      p1Re = next1;
    }
    applyAllPass(p0Re, p0Im, sign, reAt, imAt);
    applyAllPass(p1Re, p1Im, sign, reAt + 16, imAt + 16);
    cAt += 32;
    sAt += 32;
    reAt += 32;
    imAt += 32;
  }
}

/** arm ← a·conj(p)/|p|². */
function applyLossy(aRe: v128, aIm: v128, pRe: v128, pIm: v128, re: usize, im: usize): void {
  const norm = f64x2.div(f64x2.splat(1.0), f64x2.add(f64x2.mul(pRe, pRe), f64x2.mul(pIm, pIm)));
  v128.store(re, f64x2.mul(f64x2.add(f64x2.mul(aRe, pRe), f64x2.mul(aIm, pIm)), norm));
  v128.store(im, f64x2.mul(f64x2.sub(f64x2.mul(aIm, pRe), f64x2.mul(aRe, pIm)), norm));
}

export function lossyRings(n: i32, cos: i32, sin: i32, rings: i32, count: i32, re: i32, im: i32): void {
  let cAt = (<usize>cos) << 3;
  let sAt = (<usize>sin) << 3;
  let reAt = (<usize>re) << 3;
  let imAt = (<usize>im) << 3;
  const end = cAt + ((<usize>n) << 3);
  const first = (<usize>rings) << 3;
  const last = first + <usize>count * RING_BYTES;
  while (cAt < end) {
    const c0 = v128.load(cAt);
    const s0 = v128.load(sAt);
    const c1 = v128.load(cAt, 16);
    const s1 = v128.load(sAt, 16);
    let p0Re = f64x2.splat(1.0);
    let p0Im = f64x2.splat(0.0);
    let p1Re = f64x2.splat(1.0);
    let p1Im = f64x2.splat(0.0);
    let a0Re = v128.load(reAt);
    let a0Im = v128.load(imAt);
    let a1Re = v128.load(reAt, 16);
    let a1Im = v128.load(imAt, 16);
    for (let ring = first; ring < last; ring += RING_BYTES) {
      const ch = v128.load_splat<f64>(ring, 32);
      const sh = v128.load_splat<f64>(ring, 40);
      const cd0 = f64x2.sub(f64x2.mul(c0, ch), f64x2.mul(s0, sh));
      const sd0 = f64x2.add(f64x2.mul(s0, ch), f64x2.mul(c0, sh));
      const cd1 = f64x2.sub(f64x2.mul(c1, ch), f64x2.mul(s1, sh));
      const sd1 = f64x2.add(f64x2.mul(s1, ch), f64x2.mul(c1, sh));
      const nCos = v128.load_splat<f64>(ring);
      const nSin = v128.load_splat<f64>(ring, 8);
      const n0Re = f64x2.mul(nCos, cd0);
      const n0Im = f64x2.mul(nSin, sd0);
      const n1Re = f64x2.mul(nCos, cd1);
      const n1Im = f64x2.mul(nSin, sd1);
      const next0 = f64x2.sub(f64x2.mul(a0Re, n0Re), f64x2.mul(a0Im, n0Im));
      a0Im = f64x2.add(f64x2.mul(a0Re, n0Im), f64x2.mul(a0Im, n0Re));
      a0Re = next0;
      const next1 = f64x2.sub(f64x2.mul(a1Re, n1Re), f64x2.mul(a1Im, n1Im));
      a1Im = f64x2.add(f64x2.mul(a1Re, n1Im), f64x2.mul(a1Im, n1Re));
      a1Re = next1;
      const dCos = v128.load_splat<f64>(ring, 16);
      const dSin = v128.load_splat<f64>(ring, 24);
      const b0Re = f64x2.mul(dCos, cd0);
      const b0Im = f64x2.mul(dSin, sd0);
      const b1Re = f64x2.mul(dCos, cd1);
      const b1Im = f64x2.mul(dSin, sd1);
      const down0 = f64x2.sub(f64x2.mul(p0Re, b0Re), f64x2.mul(p0Im, b0Im));
      p0Im = f64x2.add(f64x2.mul(p0Re, b0Im), f64x2.mul(p0Im, b0Re));
      p0Re = down0;
      const down1 = f64x2.sub(f64x2.mul(p1Re, b1Re), f64x2.mul(p1Im, b1Im));
      p1Im = f64x2.add(f64x2.mul(p1Re, b1Im), f64x2.mul(p1Im, b1Re));
      p1Re = down1;
    }
    applyLossy(a0Re, a0Im, p0Re, p0Im, reAt, imAt);
    applyLossy(a1Re, a1Im, p1Re, p1Im, reAt + 16, imAt + 16);
    cAt += 32;
    sAt += 32;
    reAt += 32;
    imAt += 32;
  }
}

export function combine(n: i32, arms: i32, k: i32, from: i32, to: i32): void {
  const kAt = (<usize>k) << 3;
  const barBar = v128.load_splat<f64>(kAt);
  const crossCross = v128.load_splat<f64>(kAt, 8);
  const barCross = v128.load_splat<f64>(kAt, 16);
  const crossBar = v128.load_splat<f64>(kAt, 24);
  let a = (<usize>arms) << 3;
  let f = (<usize>from) << 3;
  let t = (<usize>to) << 3;
  const end = a + ((<usize>n) << 3);
  const given = from >= 0;
  while (a < end) {
    const a0Re = v128.load(a);
    const a0Im = v128.load(a + BLOCK_BYTES);
    const a1Re = v128.load(a + 2 * BLOCK_BYTES);
    const a1Im = v128.load(a + 3 * BLOCK_BYTES);
    const bRe = f64x2.sub(f64x2.mul(barBar, a0Re), f64x2.mul(crossCross, a1Re));
    const bIm = f64x2.sub(f64x2.mul(barBar, a0Im), f64x2.mul(crossCross, a1Im));
    const cRe = f64x2.add(f64x2.mul(barCross, a0Im), f64x2.mul(crossBar, a1Im));
    const cIm = f64x2.neg(f64x2.add(f64x2.mul(barCross, a0Re), f64x2.mul(crossBar, a1Re)));
    if (given) {
      const fRe = v128.load(f);
      const fIm = v128.load(f + BLOCK_BYTES);
      v128.store(t, f64x2.sub(f64x2.mul(bRe, fRe), f64x2.mul(bIm, fIm)));
      v128.store(t + BLOCK_BYTES, f64x2.add(f64x2.mul(bRe, fIm), f64x2.mul(bIm, fRe)));
      v128.store(t + 2 * BLOCK_BYTES, f64x2.sub(f64x2.mul(cRe, fRe), f64x2.mul(cIm, fIm)));
      v128.store(t + 3 * BLOCK_BYTES, f64x2.add(f64x2.mul(cRe, fIm), f64x2.mul(cIm, fRe)));
      f += 16;
    } else {
      v128.store(t, bRe);
      v128.store(t + BLOCK_BYTES, bIm);
      v128.store(t + 2 * BLOCK_BYTES, cRe);
      v128.store(t + 3 * BLOCK_BYTES, cIm);
    }
    a += 16;
    t += 16;
  }
}

export function combineSecond(n: i32, arms: i32, k: i32, from: i32, to: i32): void {
  const kAt = (<usize>k) << 3;
  const barBar = v128.load_splat<f64>(kAt);
  const crossCross = v128.load_splat<f64>(kAt, 8);
  const barCross = v128.load_splat<f64>(kAt, 16);
  const crossBar = v128.load_splat<f64>(kAt, 24);
  let a = (<usize>arms) << 3;
  let f = (<usize>from) << 3;
  let t = (<usize>to) << 3;
  const end = a + ((<usize>n) << 3);
  while (a < end) {
    const a0Re = v128.load(a);
    const a0Im = v128.load(a + BLOCK_BYTES);
    const a1Re = v128.load(a + 2 * BLOCK_BYTES);
    const a1Im = v128.load(a + 3 * BLOCK_BYTES);
    const cRe = f64x2.add(f64x2.mul(crossBar, a0Im), f64x2.mul(barCross, a1Im));
    const cIm = f64x2.neg(f64x2.add(f64x2.mul(crossBar, a0Re), f64x2.mul(barCross, a1Re)));
    const bRe = f64x2.sub(f64x2.mul(barBar, a1Re), f64x2.mul(crossCross, a0Re));
    const bIm = f64x2.sub(f64x2.mul(barBar, a1Im), f64x2.mul(crossCross, a0Im));
    const fRe = v128.load(f);
    const fIm = v128.load(f + BLOCK_BYTES);
    const t0 = v128.load(t);
    const t1 = v128.load(t + BLOCK_BYTES);
    const t2 = v128.load(t + 2 * BLOCK_BYTES);
    const t3 = v128.load(t + 3 * BLOCK_BYTES);
    v128.store(t, f64x2.add(t0, f64x2.sub(f64x2.mul(cRe, fRe), f64x2.mul(cIm, fIm))));
    v128.store(t + BLOCK_BYTES, f64x2.add(t1, f64x2.add(f64x2.mul(cRe, fIm), f64x2.mul(cIm, fRe))));
    v128.store(t + 2 * BLOCK_BYTES, f64x2.add(t2, f64x2.sub(f64x2.mul(bRe, fRe), f64x2.mul(bIm, fIm))));
    v128.store(t + 3 * BLOCK_BYTES, f64x2.add(t3, f64x2.add(f64x2.mul(bRe, fIm), f64x2.mul(bIm, fRe))));
    a += 16;
    f += 16;
    t += 16;
  }
}
