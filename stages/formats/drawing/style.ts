/** Colours, line widths and type sizes that all figures share. Colours are stated in CIELAB; those that meet in one
 *  picture differ in lightness by 15 or more, so they stay apart in a grey copy. */

import { hexOfLab } from './colour.ts';

export const ink = hexOfLab([12, 0, -2]);
/** Secondary text and thin lines. */
export const grey = hexOfLab([45, 0, -4]);
export const paleGrey = hexOfLab([80, 0, -2]);
export const faint = hexOfLab([92, 0, -1]);
/** What was measured. */
export const measured = hexOfLab([28, -2, -26]);
/** The model, the reconstruction, the posterior. */
export const modelled = hexOfLab([60, 42, 56]);
/** Bands of the posterior, 95 % and 68 %. */
export const paleModelled = hexOfLab([91, 7, 12]);
export const softModelled = hexOfLab([81, 16, 25]);
/** The truth of synthetic data. */
export const truthColour = hexOfLab([38, -26, 4]);
/** Lines over a false-colour picture. */
export const overlay = hexOfLab([97, 0, 3]);
export const warning = hexOfLab([38, 50, 36]);

export const type = { label: 14, tick: 13, small: 12, heading: 14 } as const;
