/**
 * Orthogonal factorisation of small dense least-squares systems, row-major.
 * Source: G. H. Golub and C. F. Van Loan, "Matrix Computations", 4th ed. (2013), algorithms 5.1.1 and 5.2.1 (Householder QR).
 */

/**
 * Reduces the m × n matrix (m ≥ n, row by row) to upper triangular form in place, below the diagonal zero, and applies
 * the same reflections to `right` (length m). O(mn²).
 */
export function triangulariseInto(matrix: Float64Array, m: number, n: number, right: Float64Array): void {
  for (let column = 0; column < n; column++) {
    let norm = 0;
    for (let i = column; i < m; i++) norm = Math.hypot(norm, matrix[i * n + column]!);
    if (norm === 0) continue;
    const head = matrix[column * n + column]!;
    const alpha = head > 0 ? -norm : norm;
    const scale = 1 / (norm * (norm + Math.abs(head)));
    matrix[column * n + column] = head - alpha;
    for (let k = column + 1; k < n; k++) {
      let dot = 0;
      for (let i = column; i < m; i++) dot += matrix[i * n + column]! * matrix[i * n + k]!;
      dot *= scale;
      for (let i = column; i < m; i++) matrix[i * n + k] = matrix[i * n + k]! - dot * matrix[i * n + column]!;
    }
    let dot = 0;
    for (let i = column; i < m; i++) dot += matrix[i * n + column]! * right[i]!;
    dot *= scale;
    for (let i = column; i < m; i++) right[i] = right[i]! - dot * matrix[i * n + column]!;
    matrix[column * n + column] = alpha;
    for (let i = column + 1; i < m; i++) matrix[i * n + column] = 0;
  }
}

/** Solves R·x = right for the upper triangle of the first n rows. A zero on the diagonal gives a zero component. */
export function backSubstituteInto(
  matrix: Float64Array,
  n: number,
  right: Float64Array,
  x: Float64Array,
): void {
  for (let i = n - 1; i >= 0; i--) {
    let sum = right[i]!;
    for (let k = i + 1; k < n; k++) sum -= matrix[i * n + k]! * x[k]!;
    const pivot = matrix[i * n + i]!;
    x[i] = pivot === 0 ? 0 : sum / pivot;
  }
}

/** Solves Rᵀ·x = right. */
export function forwardSubstituteInto(
  matrix: Float64Array,
  n: number,
  right: Float64Array,
  x: Float64Array,
): void {
  for (let i = 0; i < n; i++) {
    let sum = right[i]!;
    for (let k = 0; k < i; k++) sum -= matrix[k * n + i]! * x[k]!;
    const pivot = matrix[i * n + i]!;
    x[i] = pivot === 0 ? 0 : sum / pivot;
  }
}
