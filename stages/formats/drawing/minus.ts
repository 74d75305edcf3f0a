/** The minus sign of typeset numbers. */

/** Returns text in which the hyphen of a negative number is a minus sign. */
export function withMinus(text: string): string {
  return text.replaceAll('-', '−');
}
