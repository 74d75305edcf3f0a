/** The place where a function of one variable changes its sign. */

/** Steps after which the bracket is as it is. */
const MOST_STEPS = 60;

/** Where a function that is positive at `low` and not at `high` changes sign (Illinois variant of false position:
 *  Dowell and Jarratt 1971, BIT 11, 168).
 *  @param tolerance  of the bracket. Cost: five to ten calls. */
export function signChange(f: (x: number) => number, low: number, high: number, tolerance: number): number {
  const near = (high - low) * tolerance;
  let [a, b] = [low, high];
  let [fa, fb] = [f(a), f(b)];
  let side = 0;
  for (let k = 0; k < MOST_STEPS && b - a > near; k++) {
    const secant = (a * fb - b * fa) / (fb - fa);
    const x = secant > a && secant < b ? secant : (a + b) / 2;
    const fx = f(x);
    if (fx > 0) {
      if (x - a < near / 10) return x;
      [a, fa] = [x, fx];
      if (side > 0) fb /= 2;
      side = 1;
    } else {
      if (b - x < near / 10) return x;
      [b, fb] = [x, fx];
      if (side < 0) fa /= 2;
      side = -1;
    }
  }
  return (a + b) / 2;
}
