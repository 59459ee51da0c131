/** Complex linear equations by LU with partial pivoting, on an augmented row-major matrix. */

/**
 * A pivot this many units of rounding above nothing, after every row has entries of order 1, is nothing: the lossless
 * loop on its resonance leaves sin(2π·k) of a rounded angle.
 */
const LEAST_PIVOT = 16 * Number.EPSILON;

function swapRows(a: Float64Array, width: number, i: number, j: number): void {
  for (let k = 0; k < width; k++) {
    const kept = a[i * width + k]!;
    a[i * width + k] = a[j * width + k]!;
    a[j * width + k] = kept;
  }
}

function pivotRow(re: Float64Array, im: Float64Array, n: number, column: number): number {
  const width = n + 1;
  let best = column;
  let greatest = -1;
  for (let i = column; i < n; i++) {
    const size = Math.hypot(re[i * width + column]!, im[i * width + column]!);
    if (size > greatest) {
      greatest = size;
      best = i;
    }
  }
  return greatest > LEAST_PIVOT ? best : -1;
}

function eliminate(re: Float64Array, im: Float64Array, n: number, column: number): void {
  const width = n + 1;
  const base = column * width;
  const pRe = re[base + column]!;
  const pIm = im[base + column]!;
  const norm = pRe * pRe + pIm * pIm;
  for (let i = column + 1; i < n; i++) {
    const row = i * width;
    const aRe = re[row + column]!;
    const aIm = im[row + column]!;
    if (aRe === 0 && aIm === 0) continue;
    const fRe = (aRe * pRe + aIm * pIm) / norm;
    const fIm = (aIm * pRe - aRe * pIm) / norm;
    for (let k = column + 1; k < width; k++) {
      const bRe = re[base + k]!;
      const bIm = im[base + k]!;
      re[row + k]! -= fRe * bRe - fIm * bIm;
      im[row + k]! -= fRe * bIm + fIm * bRe;
    }
  }
}

function substituteBack(re: Float64Array, im: Float64Array, n: number): void {
  const width = n + 1;
  for (let i = n - 1; i >= 0; i--) {
    const row = i * width;
    let sRe = re[row + n]!;
    let sIm = im[row + n]!;
    for (let k = i + 1; k < n; k++) {
      const aRe = re[row + k]!;
      const aIm = im[row + k]!;
      const xRe = re[k * width + n]!;
      const xIm = im[k * width + n]!;
      sRe -= aRe * xRe - aIm * xIm;
      sIm -= aRe * xIm + aIm * xRe;
    }
    const pRe = re[row + i]!;
    const pIm = im[row + i]!;
    const norm = pRe * pRe + pIm * pIm;
    re[row + n] = (sRe * pRe + sIm * pIm) / norm;
    im[row + n] = (sIm * pRe - sRe * pIm) / norm;
  }
}

/**
 * Solves A·x = b in place; the last column of the n × (n + 1) matrix is b on entry and x on return.
 * @returns −1, or the column in which no pivot was left
 */
export function factorAndSolve(re: Float64Array, im: Float64Array, n: number): number {
  const width = n + 1;
  for (let column = 0; column < n; column++) {
    const pivot = pivotRow(re, im, n, column);
    if (pivot < 0) return column;
    if (pivot !== column) {
      swapRows(re, width, pivot, column);
      swapRows(im, width, pivot, column);
    }
    eliminate(re, im, n, column);
  }
  substituteBack(re, im, n);
  return -1;
}
