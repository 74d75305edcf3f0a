/** Angles in headers: radians in memory, degrees or arcseconds in the file. */

const radiansPerDegree = Math.PI / 180;
const radiansPerArcsec = Math.PI / 648_000;

export function fromDegrees(degrees: number): number {
  return degrees * radiansPerDegree;
}

export function toDegrees(radians: number): number {
  return thatReadsBack(radians, radiansPerDegree);
}

export function fromArcsec(arcsec: number): number {
  return arcsec * radiansPerArcsec;
}

export function toArcsec(radians: number): number {
  return thatReadsBack(radians, radiansPerArcsec);
}

/** The quotient, or a neighbour of it whose product with `unit` is `value` to the last bit. About one value in twenty
 *  has none; but a value that was read (a product) always has one, so files are stable from the first reading on. */
function thatReadsBack(value: number, unit: number): number {
  const quotient = value / unit;
  const tries = [0, 1, -1, 2, -2].map((steps) => quotient + steps * quotient * Number.EPSILON * 0.5);
  return tries.find((each) => each * unit === value) ?? quotient;
}
