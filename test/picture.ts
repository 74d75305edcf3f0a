/** Reading of pictures in tests, by other means than the program's own. */

export interface IndexedPicture {
  readonly width: number;
  readonly height: number;
  readonly indices: Uint8Array;
  readonly palette: Uint8Array;
}

/** Decodes a PNG file of 8-bit indexed colour whose rows have filter type None, Sub or Up (PNG third edition, 9.2). */
export function decodeIndexed(png: Uint8Array, inflate: (bytes: Uint8Array) => Uint8Array): IndexedPicture {
  const { width, height, chunks } = pngChunks(png);
  const rows = inflate(chunks.IDAT);
  const indices = new Uint8Array(width * height);
  for (let r = 0; r < height; r++) {
    const filter = rows[r * (width + 1)];
    if (filter > 2) throw new Error(`filter ${filter}`);
    for (let i = 0; i < width; i++) {
      const left = i > 0 ? indices[r * width + i - 1] : 0;
      const above = r > 0 ? indices[(r - 1) * width + i] : 0;
      indices[r * width + i] = rows[r * (width + 1) + 1 + i] + [0, left, above][filter];
    }
  }
  return { width, height, indices, palette: chunks.PLTE };
}

/** Decodes a PNG file of 8-bit colour with or without alpha into RGBA, any filter. */
export function decodeColour(png: Uint8Array, inflate: (bytes: Uint8Array) => Uint8Array) {
  const { width, height, chunks } = pngChunks(png);
  const channels = chunks.IHDR[9] === 6 ? 4 : 3;
  const rows = inflate(chunks.IDAT);
  const stride = width * channels;
  const out = new Uint8Array(stride * height);
  for (let r = 0; r < height; r++) {
    const filter = rows[r * (stride + 1)];
    for (let i = 0; i < stride; i++) {
      const a = i >= channels ? out[r * stride + i - channels] : 0;
      const b = r > 0 ? out[(r - 1) * stride + i] : 0;
      const c = i >= channels && r > 0 ? out[(r - 1) * stride + i - channels] : 0;
      const [pa, pb, pc] = [Math.abs(b - c), Math.abs(a - c), Math.abs(a + b - 2 * c)];
      const paeth = pa <= pb && pa <= pc ? a : pb <= pc ? b : c;
      out[r * stride + i] = rows[r * (stride + 1) + 1 + i] + [0, a, b, (a + b) >> 1, paeth][filter];
    }
  }
  return { width, height, channels, pixels: out };
}

function pngChunks(png: Uint8Array) {
  const view = new DataView(png.buffer, png.byteOffset, png.length);
  const chunks: Record<string, Uint8Array> = {};
  for (let at = 8; at < png.length; at += 12 + view.getUint32(at)) {
    const type = Buffer.from(png.subarray(at + 4, at + 8)).toString('latin1');
    const data = png.subarray(at + 8, at + 8 + view.getUint32(at));
    chunks[type] = type in chunks ? Buffer.concat([chunks[type], data]) : data;
  }
  return { width: view.getUint32(16), height: view.getUint32(20), chunks };
}
