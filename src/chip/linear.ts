/**
 * Small dense linear systems, LU with partial pivoting.
 * Source: G. H. Golub, C. F. Van Loan, "Matrix Computations", 4th ed. (2013), algorithm 3.4.1 and section 2.6.2 (from memory).
 */

/** Inverse and 1-norm condition number of an n × n matrix given row by row; null where it is singular. Cost O(n³). */
export function invert(
  matrix: Float64Array,
  n: number,
): { readonly inverse: Float64Array; readonly condition: number } | null {
  const lu = Float64Array.from(matrix);
  const order = Int32Array.from({ length: n }, (_, i) => i);
  for (let k = 0; k < n; k++) {
    let pivot = k;
    for (let i = k + 1; i < n; i++) if (Math.abs(lu[i * n + k]!) > Math.abs(lu[pivot * n + k]!)) pivot = i;
    if (!(Math.abs(lu[pivot * n + k]!) > 0)) return null;
    if (pivot !== k) swapRows(lu, order, n, pivot, k);
    for (let i = k + 1; i < n; i++) {
      const factor = lu[i * n + k]! / lu[k * n + k]!;
      lu[i * n + k] = factor;
      for (let j = k + 1; j < n; j++) lu[i * n + j]! -= factor * lu[k * n + j]!;
    }
  }
  const inverse = new Float64Array(n * n);
  const column = new Float64Array(n);
  for (let j = 0; j < n; j++) {
    for (let i = 0; i < n; i++) {
      let sum = order[i] === j ? 1 : 0;
      for (let k = 0; k < i; k++) sum -= lu[i * n + k]! * column[k]!;
      column[i] = sum;
    }
    for (let i = n - 1; i >= 0; i--) {
      let sum = column[i]!;
      for (let k = i + 1; k < n; k++) sum -= lu[i * n + k]! * column[k]!;
      column[i] = sum / lu[i * n + i]!;
      inverse[i * n + j] = column[i]!;
    }
  }
  return { inverse, condition: norm1(matrix, n) * norm1(inverse, n) };
}

function swapRows(lu: Float64Array, order: Int32Array, n: number, a: number, b: number): void {
  for (let j = 0; j < n; j++) {
    const held = lu[a * n + j]!;
    lu[a * n + j] = lu[b * n + j]!;
    lu[b * n + j] = held;
  }
  const held = order[a]!;
  order[a] = order[b]!;
  order[b] = held;
}

/** Largest column sum of absolute values. */
function norm1(matrix: Float64Array, n: number): number {
  let largest = 0;
  for (let j = 0; j < n; j++) {
    let sum = 0;
    for (let i = 0; i < n; i++) sum += Math.abs(matrix[i * n + j]!);
    largest = Math.max(largest, sum);
  }
  return largest;
}

/** out = matrix · vector, rows × columns given row by row; allocates nothing. */
export function multiplyInto(out: Float64Array, matrix: Float64Array, vector: Float64Array): void {
  const columns = vector.length;
  for (let i = 0; i < out.length; i++) {
    let sum = 0;
    for (let j = 0; j < columns; j++) sum += matrix[i * columns + j]! * vector[j]!;
    out[i] = sum;
  }
}
