/**
 * The inner loops of the kernel over one block of frequencies, on one heap of numbers; all arguments are positions in
 * that heap. This is the plain version: the reference for src/circuit/wasm/blocks.ts and its stand-in where WebAssembly
 * SIMD is missing.
 */

/** Frequencies a block: tables and fields of one block stay in the first-level cache. */
export const BLOCK = 256;

/** Heap of 4 WebAssembly pages. */
export const HEAP_SIZE = 32_768;

export interface BlockRoutines {
  readonly heap: Float64Array;
  /** cos, sin ← of half·Ω, n values. */
  halfAngles(n: number, omega: number, half: number, cos: number, sin: number): void;
  /**
   * cos, sin (a block apart) ← of half·Ω for frequencies that stand almost evenly: those of the first (c0, s0) turned by
   * a step table (cosStep, a block apart) and, to first order, by what Ω strays from Ω₀ + steps. Returns the greatest
   * such distance; the caller discards the result where its square is not negligible.
   */
  rotate(
    n: number,
    omega: number,
    steps: number,
    half: number,
    cosStep: number,
    c0: number,
    s0: number,
    cos: number,
  ): number;
  /** arm ← amplitude·e^(−jφ), given as cosine and sine parts. */
  fillArm(n: number, re: number, im: number, valueRe: number, valueIm: number): void;
  /** arm ← value·e^(−jδΩ) from the half-angle tables of δ. */
  delayArm(
    n: number,
    cos: number,
    sin: number,
    re: number,
    im: number,
    valueRe: number,
    valueIm: number,
  ): void;
  /**
   * arm ← arm·Π rings, all lossless. HEAP_RING numbers a ring, of which the denominator's four are used: its cosine part
   * times cos(φ/2) and sin(φ/2), its sine part times the same.
   */
  allPassRings(
    n: number,
    cos: number,
    sin: number,
    rings: number,
    count: number,
    re: number,
    im: number,
  ): void;
  /** The same for rings with loss: the first six of their constants (src/circuit/elements.ts). */
  lossyRings(n: number, cos: number, sin: number, rings: number, count: number, re: number, im: number): void;
  /**
   * Outputs of a cell from its arms (`arms`: re0, im0, re1, im1, a block apart) and the field at in1 (`from`: re, im, a
   * block apart; negative: 1). `k`: barBar, crossCross, barCross, crossBar. `to`: out1 re, im, out2 re, im.
   */
  combine(n: number, arms: number, k: number, from: number, to: number): void;
  /** Adds what in2 (`from`) contributes. */
  combineSecond(n: number, arms: number, k: number, from: number, to: number): void;
}

/** Numbers a ring occupies in the heap. */
export const HEAP_RING = 6;

export function createPlainBlocks(): BlockRoutines {
  const heap = new Float64Array(HEAP_SIZE);
  return {
    heap,
    halfAngles(n, omega, half, cos, sin) {
      for (let i = 0; i < n; i++) {
        const angle = half * heap[omega + i]!;
        heap[cos + i] = Math.cos(angle);
        heap[sin + i] = Math.sin(angle);
      }
    },
    rotate: (n, omega, steps, half, cosStep, c0, s0, cos) =>
      plainRotate(heap, n, omega, steps, half, cosStep, c0, s0, cos),
    fillArm(n, re, im, valueRe, valueIm) {
      heap.fill(valueRe, re, re + n);
      heap.fill(valueIm, im, im + n);
    },
    delayArm(n, cos, sin, re, im, valueRe, valueIm) {
      for (let i = 0; i < n; i++) {
        const c = heap[cos + i]!;
        const s = heap[sin + i]!;
        const eRe = c * c - s * s;
        const eIm = -2 * c * s;
        heap[re + i] = valueRe * eRe - valueIm * eIm;
        heap[im + i] = valueRe * eIm + valueIm * eRe;
      }
    },
    allPassRings: (n, cos, sin, rings, count, re, im) =>
      plainAllPass(heap, n, cos, sin, rings, count, re, im),
    lossyRings: (n, cos, sin, rings, count, re, im) => plainLossy(heap, n, cos, sin, rings, count, re, im),
    combine: (n, arms, k, from, to) => plainCombine(heap, n, arms, k, from, to),
    combineSecond: (n, arms, k, from, to) => plainCombineSecond(heap, n, arms, k, from, to),
  };
}

function plainRotate(
  heap: Float64Array,
  n: number,
  omega: number,
  steps: number,
  half: number,
  cosStep: number,
  c0: number,
  s0: number,
  cos: number,
): number {
  const block = BLOCK;
  const first = heap[omega]!;
  let worst = 0;
  for (let i = 0; i < n; i++) {
    const stray = heap[omega + i]! - first - heap[steps + i]!;
    worst = Math.max(worst, Math.abs(stray));
    const turn = stray * half;
    const a = heap[cosStep + i]!;
    const b = heap[cosStep + block + i]!;
    const c = c0 * a - s0 * b;
    const s = s0 * a + c0 * b;
    heap[cos + i] = c - turn * s;
    heap[cos + block + i] = s + turn * c;
  }
  return worst;
}

/** A lossless ring is −conj(B)/B: one product of all B, one division at the end. */
function plainAllPass(
  heap: Float64Array,
  n: number,
  cos: number,
  sin: number,
  rings: number,
  count: number,
  re: number,
  im: number,
): void {
  const sign = count % 2 === 0 ? 1 : -1;
  const stride = HEAP_RING;
  const end = rings + count * stride;
  for (let i = 0; i < n; i++) {
    const c = heap[cos + i]!;
    const s = heap[sin + i]!;
    let pRe = 1;
    let pIm = 0;
    for (let r = rings; r < end; r += stride) {
      const bRe = heap[r]! * c - heap[r + 1]! * s;
      const bIm = heap[r + 2]! * s + heap[r + 3]! * c;
      const next = pRe * bRe - pIm * bIm;
      pIm = pRe * bIm + pIm * bRe;
      pRe = next;
    }
    const rr = pRe * pRe;
    const ii = pIm * pIm;
    const norm = sign / (rr + ii);
    const qRe = (rr - ii) * norm;
    const qIm = -2 * pRe * pIm * norm;
    const aRe = heap[re + i]!;
    const aIm = heap[im + i]!;
    heap[re + i] = aRe * qRe - aIm * qIm;
    heap[im + i] = aRe * qIm + aIm * qRe;
  }
}

function plainLossy(
  heap: Float64Array,
  n: number,
  cos: number,
  sin: number,
  rings: number,
  count: number,
  re: number,
  im: number,
): void {
  const stride = HEAP_RING;
  const end = rings + count * stride;
  for (let i = 0; i < n; i++) {
    const c = heap[cos + i]!;
    const s = heap[sin + i]!;
    let pRe = 1;
    let pIm = 0;
    let aRe = heap[re + i]!;
    let aIm = heap[im + i]!;
    for (let r = rings; r < end; r += stride) {
      const ch = heap[r + 4]!;
      const sh = heap[r + 5]!;
      const cd = c * ch - s * sh;
      const sd = s * ch + c * sh;
      const bRe = heap[r + 2]! * cd;
      const bIm = heap[r + 3]! * sd;
      const nRe = heap[r]! * cd;
      const nIm = heap[r + 1]! * sd;
      const p = pRe * bRe - pIm * bIm;
      pIm = pRe * bIm + pIm * bRe;
      pRe = p;
      const a = aRe * nRe - aIm * nIm;
      aIm = aRe * nIm + aIm * nRe;
      aRe = a;
    }
    const norm = 1 / (pRe * pRe + pIm * pIm);
    heap[re + i] = (aRe * pRe + aIm * pIm) * norm;
    heap[im + i] = (aIm * pRe - aRe * pIm) * norm;
  }
}

function plainCombine(
  heap: Float64Array,
  n: number,
  arms: number,
  k: number,
  from: number,
  to: number,
): void {
  const block = BLOCK;
  const barBar = heap[k]!;
  const crossCross = heap[k + 1]!;
  const barCross = heap[k + 2]!;
  const crossBar = heap[k + 3]!;
  for (let i = 0; i < n; i++) {
    const a0Re = heap[arms + i]!;
    const a0Im = heap[arms + block + i]!;
    const a1Re = heap[arms + 2 * block + i]!;
    const a1Im = heap[arms + 3 * block + i]!;
    const bRe = barBar * a0Re - crossCross * a1Re;
    const bIm = barBar * a0Im - crossCross * a1Im;
    const cRe = barCross * a0Im + crossBar * a1Im;
    const cIm = -(barCross * a0Re + crossBar * a1Re);
    const fRe = from < 0 ? 1 : heap[from + i]!;
    const fIm = from < 0 ? 0 : heap[from + block + i]!;
    heap[to + i] = bRe * fRe - bIm * fIm;
    heap[to + block + i] = bRe * fIm + bIm * fRe;
    heap[to + 2 * block + i] = cRe * fRe - cIm * fIm;
    heap[to + 3 * block + i] = cRe * fIm + cIm * fRe;
  }
}

function plainCombineSecond(
  heap: Float64Array,
  n: number,
  arms: number,
  k: number,
  from: number,
  to: number,
): void {
  const block = BLOCK;
  const barBar = heap[k]!;
  const crossCross = heap[k + 1]!;
  const barCross = heap[k + 2]!;
  const crossBar = heap[k + 3]!;
  for (let i = 0; i < n; i++) {
    const a0Re = heap[arms + i]!;
    const a0Im = heap[arms + block + i]!;
    const a1Re = heap[arms + 2 * block + i]!;
    const a1Im = heap[arms + 3 * block + i]!;
    const cRe = crossBar * a0Im + barCross * a1Im;
    const cIm = -(crossBar * a0Re + barCross * a1Re);
    const bRe = barBar * a1Re - crossCross * a0Re;
    const bIm = barBar * a1Im - crossCross * a0Im;
    const fRe = heap[from + i]!;
    const fIm = heap[from + block + i]!;
    heap[to + i]! += cRe * fRe - cIm * fIm;
    heap[to + block + i]! += cRe * fIm + cIm * fRe;
    heap[to + 2 * block + i]! += bRe * fRe - bIm * fIm;
    heap[to + 3 * block + i]! += bRe * fIm + bIm * fRe;
  }
}
