/** The mean of repeats. */

/**
 * Mean of repeats, and the standard deviation of one element of the mean: the scatter
 * about it, pooled over the elements.
 * @param {number[][]} matrices
 * @param {boolean} exactFirst whether the first element has no error
 * @returns {{ mean: number[], sigma: number }}
 */
export function meanOf(matrices, exactFirst) {
  const count = matrices.length;
  const mean = Array.from({ length: 16 }, (_, k) => matrices.reduce((sum, matrix) => sum + (matrix[k] ?? 0), 0) / count);
  let squares = 0;
  for (const matrix of matrices) matrix.forEach((value, k) => (squares += (value - (mean[k] ?? 0)) ** 2));
  const elements = exactFirst ? 15 : 16;
  return { mean, sigma: Math.sqrt(squares / (elements * (count - 1)) / count) };
}
