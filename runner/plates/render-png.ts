/** Rendering of SVG figures to PNG by a WebAssembly renderer, the same bytes on every machine. Figures carry their text
 *  as outlines, so no font is loaded. */

import { readFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import { initWasm, Resvg } from '@resvg/resvg-wasm';

let ready: Promise<void> | null = null;

/** Returns a PNG file of an SVG document on white.
 *  @param scale  PNG pixels per px of the drawing, default 2
 *  @throws Error of the renderer when the document is not SVG. The first call loads the renderer, about 0.1 s. */
export async function renderPng(svg: Uint8Array | string, scale = 2): Promise<Uint8Array> {
  ready ??= loadRenderer();
  await ready;
  const text = typeof svg === 'string' ? svg : Buffer.from(svg).toString('utf8');
  const renderer = new Resvg(text, {
    fitTo: { mode: 'zoom', value: scale },
    background: '#ffffff',
    font: { loadSystemFonts: false },
  });
  try {
    const image = renderer.render();
    try {
      return image.asPng();
    } finally {
      image.free();
    }
  } finally {
    renderer.free();
  }
}

async function loadRenderer(): Promise<void> {
  const path = createRequire(import.meta.url).resolve('@resvg/resvg-wasm/index_bg.wasm');
  try {
    await initWasm(new Uint8Array(readFileSync(path)));
  } catch (error) {
    // The renderer keeps one instance per process; another copy of this module may have loaded it before.
    if (!(error instanceof Error && /already initialized/i.test(error.message))) throw error;
  }
}
