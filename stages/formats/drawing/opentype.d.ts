/** The part of opentype.js that text.ts uses; the package carries no types. */
declare module 'opentype.js' {
  interface PathCommand {
    readonly type: 'M' | 'L' | 'Q' | 'C' | 'Z';
    readonly x?: number;
    readonly y?: number;
    readonly x1?: number;
    readonly y1?: number;
    readonly x2?: number;
    readonly y2?: number;
  }
  interface Glyph {
    readonly index: number;
    readonly advanceWidth: number;
    readonly path: { readonly commands: readonly PathCommand[] };
  }
  interface Font {
    readonly unitsPerEm: number;
    /** Kerning in font units by `left,right` glyph indices. */
    readonly kerningPairs: Readonly<Record<string, number>>;
    charToGlyph(character: string): Glyph;
  }
  const opentype: { parse(buffer: ArrayBuffer, options?: { lowMemory?: boolean }): Font };
  export default opentype;
  export type { Font, Glyph, PathCommand };
}
