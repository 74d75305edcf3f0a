/** Known units of VOUnits 1.0 (IVOA Recommendation, 2014), as far as an imaging group meets them, each defined by
 *  others: `1 symbol = scale × pi^pi × unit`. Read by unit-grammar.ts only.
 *
 *  The plane angle is a dimension of its own, so that 160 uas is no pure number. Min, h, d, deg, arcmin take no prefix
 *  (VOUnits, table of known units). Besides the standard, `uas` is the microarcsecond, as the trade writes it. */

/** Powers of ten by symbol. */
export const prefixes: Readonly<Record<string, number>> = {
  da: 1,
  h: 2,
  k: 3,
  M: 6,
  G: 9,
  T: 12,
  P: 15,
  E: 18,
  Z: 21,
  Y: 24,
  d: -1,
  c: -2,
  m: -3,
  u: -6,
  n: -9,
  p: -12,
  f: -15,
  a: -18,
  z: -21,
  y: -24,
};

/** Symbols of the dimensions, in the order of a dimension vector, with the base unit of each. */
export const baseUnits = [
  'm',
  'g',
  's',
  'rad',
  'K',
  'A',
  'mol',
  'cd',
  'mag',
  'beam',
  'pix',
  'ct',
  'bit',
] as const;

/** Base units that take no prefix. */
export const plainBaseUnits: readonly string[] = ['beam', 'pix', 'ct'];

export interface UnitDefinition {
  /** A decimal, or two with a slash between. */
  readonly scale: string;
  readonly unit: string;
  /** Power of pi; 0 by default. */
  readonly pi?: number;
  readonly prefixed?: true;
}

const prefixed = true;

/** Defining constants: SI brochure, 9th edition; astronomical unit IAU 2012 B2, parsec IAU 2015 B2, nominal solar
 *  values IAU 2015 B3 (solMass is GM over CODATA 2018's G: good to 22 parts in a million); u CODATA 2018. */
export const definitions: Readonly<Record<string, UnitDefinition>> = {
  sr: { scale: '1', unit: 'rad**2', prefixed },
  deg: { scale: '1/180', pi: 1, unit: 'rad' },
  arcmin: { scale: '1/60', unit: 'deg' },
  arcsec: { scale: '1/3600', unit: 'deg', prefixed },
  mas: { scale: '1e-3', unit: 'arcsec' },
  uas: { scale: '1e-6', unit: 'arcsec' },

  min: { scale: '60', unit: 's' },
  h: { scale: '3600', unit: 's' },
  d: { scale: '86400', unit: 's' },
  yr: { scale: '365.25', unit: 'd', prefixed },
  a: { scale: '365.25', unit: 'd', prefixed },
  Hz: { scale: '1', unit: 's**-1', prefixed },

  AU: { scale: '149597870700', unit: 'm' },
  pc: { scale: '648000', pi: -1, unit: 'AU', prefixed },
  lyr: { scale: '9460730472580800', unit: 'm' },
  solRad: { scale: '6.957e8', unit: 'm' },
  solMass: { scale: '1.9884098707e30', unit: 'kg' },
  solLum: { scale: '3.828e26', unit: 'W' },
  u: { scale: '1.66053906660e-27', unit: 'kg' },

  N: { scale: '1', unit: 'kg.m.s**-2', prefixed },
  Pa: { scale: '1', unit: 'N.m**-2', prefixed },
  J: { scale: '1', unit: 'N.m', prefixed },
  eV: { scale: '1.602176634e-19', unit: 'J', prefixed },
  W: { scale: '1', unit: 'J.s**-1', prefixed },
  Jy: { scale: '1e-26', unit: 'W.m**-2.Hz**-1', prefixed },

  C: { scale: '1', unit: 'A.s', prefixed },
  V: { scale: '1', unit: 'W.A**-1', prefixed },
  Ohm: { scale: '1', unit: 'V.A**-1', prefixed },
  S: { scale: '1', unit: 'Ohm**-1', prefixed },
  F: { scale: '1', unit: 'C.V**-1', prefixed },
  Wb: { scale: '1', unit: 'V.s', prefixed },
  T: { scale: '1', unit: 'Wb.m**-2', prefixed },
  H: { scale: '1', unit: 'Wb.A**-1', prefixed },
  lm: { scale: '1', unit: 'cd.sr', prefixed },
  lx: { scale: '1', unit: 'lm.m**-2', prefixed },

  pixel: { scale: '1', unit: 'pix' },
  count: { scale: '1', unit: 'ct' },
  ph: { scale: '1', unit: 'ct' },
  photon: { scale: '1', unit: 'ct' },
  adu: { scale: '1', unit: 'ct' },
  byte: { scale: '8', unit: 'bit', prefixed },
  B: { scale: '8', unit: 'bit', prefixed },
  '%': { scale: '1/100', unit: '' },
};

/** Names of dimensions for messages, by a unit that has them; the first that fits is taken. */
export const dimensionNames: readonly (readonly [name: string, unit: string])[] = [
  ['dimensionless', ''],
  ['angle', 'rad'],
  ['solid angle', 'sr'],
  ['time', 's'],
  ['frequency', 'Hz'],
  ['length', 'm'],
  ['area', 'm**2'],
  ['speed', 'm.s**-1'],
  ['mass', 'kg'],
  ['temperature', 'K'],
  ['flux density', 'Jy'],
  ['flux density per beam', 'Jy/beam'],
  ['flux density per pixel', 'Jy/pixel'],
  ['surface brightness', 'Jy/sr'],
  ['power', 'W'],
  ['energy', 'J'],
  ['pressure', 'Pa'],
  ['angular rate', 'rad/s'],
  ['magnitude', 'mag'],
  ['count', 'ct'],
];

/** Units to suggest for a misspelt one, commonest first. */
export const commonUnits: readonly string[] = [
  ...[
    'uas',
    'mas',
    'arcsec',
    'arcmin',
    'deg',
    'rad',
    'Jy',
    'mJy',
    'uJy',
    'kJy',
    'Jy/beam',
    'Jy/pixel',
    'Jy/sr',
  ],
  ...[
    'GHz',
    'MHz',
    'kHz',
    'Hz',
    's',
    'ms',
    'us',
    'ns',
    'min',
    'h',
    'd',
    'yr',
    'm',
    'km',
    'cm',
    'mm',
    'um',
    'nm',
  ],
  ...[
    'K',
    'mK',
    'W',
    'm/s',
    'km/s',
    'pc',
    'kpc',
    'Mpc',
    'Gpc',
    'AU',
    'lyr',
    'solMass',
    'kg',
    'g',
    'hPa',
    'Pa',
  ],
  ...['mag', 'beam', 'pixel', 'ct', '%'],
];

/** What people write for a unit of the standard, in lower case. */
export const spelledOut: Readonly<Record<string, string>> = {
  microarcsec: 'uas',
  microarcsecond: 'uas',
  microarcseconds: 'uas',
  muas: 'uas',
  milliarcsec: 'mas',
  milliarcsecond: 'mas',
  milliarcseconds: 'mas',
  arcsecond: 'arcsec',
  arcseconds: 'arcsec',
  arcminute: 'arcmin',
  arcminutes: 'arcmin',
  degree: 'deg',
  degrees: 'deg',
  '°': 'deg',
  radian: 'rad',
  radians: 'rad',
  sec: 's',
  second: 's',
  seconds: 's',
  minute: 'min',
  minutes: 'min',
  hr: 'h',
  hrs: 'h',
  hour: 'h',
  hours: 'h',
  day: 'd',
  days: 'd',
  year: 'yr',
  years: 'yr',
  jansky: 'Jy',
  hertz: 'Hz',
  kelvin: 'K',
  metre: 'm',
  metres: 'm',
  meter: 'm',
  meters: 'm',
  micron: 'um',
  microns: 'um',
  parsec: 'pc',
  msun: 'solMass',
  percent: '%',
  pixels: 'pixel',
};
