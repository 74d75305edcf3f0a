"""Makes the FITS fixtures of test/data/fits with astropy 5.2 (Debian 12, python3-astropy), an implementation that is
not ours, and `expected.json` with what numpy says is in them. All content is invented. Run:

    /usr/bin/python3 test/data/scripts/make-fits-fixtures.py test/data/fits
"""
import io, json, os, sys
import numpy as np
from astropy.io import fits

out = sys.argv[1]
expected = {}
WHEN = 'fixed text'


def save(name, hdus):
    hdus = fits.HDUList(hdus)
    for hdu in hdus:
        hdu.add_checksum(when=WHEN)
    hdus.writeto(os.path.join(out, name), overwrite=True, checksum=False)


def listed(array):
    flat = np.asarray(array).ravel()
    return [None if isinstance(x, float) and np.isnan(x) else x for x in flat.tolist()]


# Images of every BITPIX; stored integers are set by hand, so that the scaling is ours to apply.
def image(values, dtype, first=False, **keywords):
    kind = fits.PrimaryHDU if first else fits.ImageHDU
    hdu = kind(np.array(values, dtype=dtype).reshape(2, 3), do_not_scale_image_data=True)
    for key, value in keywords.items():
        hdu.header[key.replace('_', '-')] = value
    return hdu


images = [
    image([0, 1, 2, 127, 128, 255], 'u1', first=True, OBJECT="INVENTED 'DATA'"),
    image([-32768, -1, 0, 1, 2, 32767], 'i2', EXTNAME='SCALED', BSCALE=0.5, BZERO=10.0, BLANK=-32768),
    image([-2147483648, -1, 0, 1, 2, 2147483647], 'i4', EXTNAME='LONG'),
    image([-9007199254740992, -1, 0, 1, 2, 9007199254740992], 'i8', EXTNAME='LONGLONG'),
    image([0.1, -0.5, 1e-38, 3.0e38, np.nan, 2.5], 'f4', EXTNAME='SINGLE'),
    image([0.1, -0.5, 1e-300, 1e300, np.nan, 2.5], 'f8', EXTNAME='DOUBLE'),
    image([-32768, -32767, -1, 0, 1, 32767], 'i2', EXTNAME='UNSIGNED', BSCALE=1.0, BZERO=32768.0),
    image([-128, -1, 0, 1, 2, 127], 'i2', EXTNAME='PLAIN'),
]
save('images.fits', images)
with fits.open(os.path.join(out, 'images.fits'), checksum=True) as f:
    expected['images'] = [
        dict(extname=h.header.get('EXTNAME', ''), bitpix=h.header.get('BITPIX'), values=listed(h.data.astype('f8')))
        for h in f
    ]

# A table with every form.
n = 3
cols = [
    fits.Column('LOGICAL', '2L', array=np.array([[True, False], [False, False], [True, True]])),
    fits.Column('BITS', '11X', array=np.array([[i % (k + 2) == 0 for i in range(11)] for k in range(n)])),
    fits.Column('BYTE', 'B', array=np.array([0, 127, 255], 'u1')),
    fits.Column('SHORT', 'I', array=np.array([-32768, 5, 32767], 'i2'), null=5),
    fits.Column('INT', '2J', array=np.array([[1, -2], [3, -4], [2147483647, -2147483648]], 'i4'), unit='m'),
    fits.Column('LONG', 'K', array=np.array([9007199254740992, -1, 7], 'i8')),
    fits.Column('NAME', '8A', array=['A', 'station', "it's"]),
    fits.Column('SINGLE', 'E', array=np.array([0.1, np.nan, -3.5e20], 'f4')),
    fits.Column('DOUBLE', '3D', array=np.arange(9).reshape(3, 3) / 7.0, unit='Jy'),
    fits.Column('CSINGLE', 'C', array=np.array([1 + 2j, -0.5j, 3], 'c8')),
    fits.Column('CDOUBLE', '2M', array=(np.arange(6) * (1 - 0.1j)).reshape(3, 2)),
    fits.Column('EMPTY', '0D', array=np.zeros((3, 0))),
    fits.Column('UNSIGNED', 'I', bzero=32768, array=np.array([0, 40000, 65535], 'u2')),
    fits.Column('UNSIGNED4', 'J', bzero=2147483648, array=np.array([0, 3000000000, 4294967295], 'u4')),
    fits.Column('UNSIGNED8', 'K', bzero=9223372036854775808, array=np.array([0, 5, 9007199254740992], 'u8')),
]
table = fits.BinTableHDU.from_columns(cols, name='FORMS')
lists = fits.BinTableHDU.from_columns([
    fits.Column('LIST', 'PE()', array=np.array([np.array([1.5, 2.5], 'f4'), np.array([], 'f4'),
                                               np.array([-1.0, 0.25, 8.0], 'f4')], dtype=object)),
    fits.Column('LONGLIST', 'QJ()', array=np.array([np.array([1], 'i4'), np.array([2, 3], 'i4'),
                                                   np.array([], 'i4')], dtype=object)),
], name='LISTS')
# A scaled column: stored 0, 1, 2 with TSCAL 0.25, TZERO -1.
scaled = fits.BinTableHDU.from_columns([fits.Column('SCALED', 'I', array=np.array([0, 1, 2], 'i2'))], name='SCALED')
scaled.header['TSCAL1'] = 0.25
scaled.header['TZERO1'] = -1.0
save('table.fits', [fits.PrimaryHDU(), table, scaled, lists])
# astropy sums a heap rightly only when it has read it from a file: put those sums in place of the others.
path = os.path.join(out, 'table.fits')
with fits.open(path) as f:
    wrong = [c.image.encode() for c in f['LISTS'].header.cards if c.keyword in ('CHECKSUM', 'DATASUM')]
    f['LISTS'].add_checksum(when=WHEN)
    right = [c.image.encode() for c in f['LISTS'].header.cards if c.keyword in ('CHECKSUM', 'DATASUM')]
with open(path, 'rb') as f:
    raw = f.read()
for old, new in zip(wrong, right):
    assert raw.count(old) == 1
    raw = raw.replace(old, new)
with open(path, 'wb') as f:
    f.write(raw)
with fits.open(os.path.join(out, 'table.fits'), checksum=True) as f:
    d = f['FORMS'].data
    e = {}
    for name in ['LOGICAL', 'BITS']:
        e[name] = listed(d[name].astype(int))
    for name in ['BYTE', 'SHORT', 'INT', 'LONG', 'SINGLE', 'DOUBLE', 'UNSIGNED', 'UNSIGNED4', 'UNSIGNED8']:
        e[name] = listed(d[name].astype('f8'))
    e['SHORT'][1] = None  # TNULL = 5: undefined
    e['NAME'] = list(d['NAME'])
    for name in ['CSINGLE', 'CDOUBLE']:
        e[name] = dict(re=listed(d[name].real.astype('f8')), im=listed(d[name].imag.astype('f8')))
    for name in ['LIST', 'LONGLIST']:
        e[name] = [listed(np.asarray(x, 'f8')) for x in f['LISTS'].data[name]]
    e['SCALED'] = listed(f['SCALED'].data['SCALED'].astype('f8'))
    expected['table'] = e

# Headers: long strings, exponents, free format, HIERARCH, commentary.
h = fits.PrimaryHDU().header
hdu = fits.PrimaryHDU()
h = hdu.header
long = 'A long string that needs more than one card, and blanks  where the card is cut; ' * 3
h['LONG'] = long.strip()
h['HIERARCH invented deep keyword'] = 4.5
h['QUOTE'] = "it''s"
h['EMPTY'] = ''
h['NOVALUE'] = None
h['REAL'] = (-1.5e-7, 'a real number')
h['COUNT'] = 42
h['LOGIC'] = False
h['COMMENT'] = 'invented data'
h['HISTORY'] = 'first line'
h['HISTORY'] = 'second line'
save('header.fits', [hdu])
with fits.open(os.path.join(out, 'header.fits'), checksum=True) as f:
    g = f[0].header
    expected['header'] = {k: g[k] for k in ['LONG', 'QUOTE', 'EMPTY', 'REAL', 'COUNT', 'LOGIC']}
    expected['header']['INVENTED DEEP KEYWORD'] = g['HIERARCH invented deep keyword']
    expected['header']['history'] = list(g['HISTORY'])

# Random groups with scaled parameters in wavelengths (PSCAL = 1/frequency) and integers as data.
freq = 2.3e11
rng = np.random.default_rng(11)
count, length = 5, 2 * 3
raw = np.round(rng.normal(size=(count, length)) * 1000).astype('i2')
pars = [np.arange(count) * 1000.0 + 2e9, -np.arange(count) * 500.0, np.full(count, 258.0), np.full(count, 0.0),
        np.arange(count) * 0.125]
gd = fits.GroupData(raw.astype('f4').reshape(count, 1, 1, 1, 2, 3), bitpix=-32,
                    parnames=['UU---SIN', 'VV---SIN', 'BASELINE', 'DATE', 'DATE'], pardata=pars)
hdu = fits.GroupsHDU(gd)
for k, (scale, zero) in enumerate([(1 / freq, 0.0), (1 / freq, 0.0), (1.0, 0.0), (1.0, 2460000.5), (1.0, 0.0)], 1):
    hdu.header[f'PSCAL{k}'] = scale
    hdu.header[f'PZERO{k}'] = zero
for k, (name, value, step) in enumerate([('COMPLEX', 1.0, 1.0), ('STOKES', -1.0, -1.0), ('FREQ', freq, 1e9),
                                         ('RA', 10.0, 1.0), ('DEC', 20.0, 1.0)], 2):
    hdu.header[f'CTYPE{k}'] = name
    hdu.header[f'CRVAL{k}'] = value
    hdu.header[f'CRPIX{k}'] = 1.0
    hdu.header[f'CDELT{k}'] = step
save('groups-scaled.fits', [hdu])
expected['groups-scaled'] = dict(
    count=count, ctypes=['COMPLEX', 'STOKES', 'FREQ', 'RA', 'DEC'],
    uSeconds=listed(np.asarray(pars[0], 'f4').astype('f8') / freq),
    vSeconds=listed(np.asarray(pars[1], 'f4').astype('f8') / freq),
    date=listed(2460000.5 + pars[4]), data=listed(raw.astype('f8')))

# Random groups as uv data lie on disk: 4 stations, 2 times, 2 hands of which the second is flagged (weight -1).
rng = np.random.default_rng(7)
c, freq, jd0 = 299792458.0, 2.2e11, 2458100.5
rows = []
for t in (jd0 + 0.25, jd0 + 0.26):
    for i in range(1, 5):
        for j in range(i + 1, 5):
            u, v, w = rng.normal(size=3) * 5e6 / c
            rows.append((u, v, w, 256 * i + j, t, rng.normal(size=2) + 1j * rng.normal(size=2)))
data = np.zeros((len(rows), 1, 1, 1, 1, 2, 3), dtype='>f4')
for k, r in enumerate(rows):
    data[k, 0, 0, 0, 0, :, 0] = r[5].real
    data[k, 0, 0, 0, 0, :, 1] = r[5].imag
    data[k, 0, 0, 0, 0, :, 2] = [4.0, -1.0]
par = [np.array([r[0] for r in rows]), np.array([r[1] for r in rows]), np.array([r[2] for r in rows]),
       np.array([r[3] for r in rows], dtype=float), np.full(len(rows), 0.0), np.array([r[4] - jd0 for r in rows]),
       np.full(len(rows), 10.0)]
# parbscales and parbzeros of astropy 5.2 can leave stored parameters undefined: raw values, and keywords by hand.
hdu = fits.GroupsHDU(fits.GroupData(data, bitpix=-32, pardata=par,
                                    parnames=['UU---SIN', 'VV---SIN', 'WW---SIN', 'BASELINE', 'DATE', 'DATE', 'INTTIM']))
h = hdu.header
for k in range(1, 8):
    h[f'PSCAL{k}'] = 1.0
    h[f'PZERO{k}'] = 0.0
h['PZERO5'] = jd0
h.set('OBJECT', 'TESTSRC')
h.set('TELESCOP', 'TESTARR')
h.set('BUNIT', 'JY')
for k, (name, value, step, pixel) in enumerate([('COMPLEX', 1, 1, 1), ('STOKES', -1, -1, 1), ('FREQ', freq, 1e9, 1),
                                                ('IF', 1, 1, 1), ('RA', 10.0, 1, 1), ('DEC', 20.0, 1, 1)], 2):
    h[f'CTYPE{k}'] = name
    h[f'CRVAL{k}'] = float(value)
    h[f'CDELT{k}'] = float(step)
    h[f'CRPIX{k}'] = float(pixel)
    h[f'CROTA{k}'] = 0.0
hdu.add_checksum(when='fixed test HDU')
hdu.writeto(os.path.join(out, 'groups.fits'), overwrite=True, checksum=False)

# The smallest legal primary HDU; its sums were computed by a Python implementation of Appendix J of the standard.
cards = ['SIMPLE  =                    T', 'BITPIX  =                    8', 'NAXIS   =                    0',
         "CHECKSUM= 'BpFiDoFgBoFgBoFg'", "DATASUM = '0       '", 'END']
with open(os.path.join(out, 'minimal.fits'), 'wb') as f:
    f.write(''.join(card.ljust(80) for card in cards).ljust(2880).encode('ascii'))
fits.open(os.path.join(out, 'minimal.fits'), checksum=True).close()

with open(os.path.join(out, 'expected.json'), 'w') as f:
    json.dump(expected, f, indent=1, sort_keys=True)
    f.write('\n')
