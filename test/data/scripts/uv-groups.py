# Writes test/data/uv/groups.fits and groups.json: uv data as random groups with antenna and frequency table, made with
# Debian's python3-astropy 5.2.1, and the numbers that went in. Invented data: four invented stations, a point source off
# the centre. Run: /usr/bin/python3 test/data/scripts/uv-groups.py test/data/uv
# u, v, w lie on disk in wavelengths with PSCAL = 1/frequency; the date is split; hands have unlike weights, one is
# flagged, one has infinite weight; station numbers are not row numbers; one station of the table is not in the data.
# astropy 5.2: raw parameter values and keywords set afterwards, since parbscales can leave bytes uninitialised.
import json, sys
import numpy as np
from astropy.io import fits

out = sys.argv[1]
c = 299792458.0
freq, width = 2.2e11, 2e9
ra, dec = 187.5, 12.25
jd0, gst0, rate = 2466100.5, 201.3, 360.985647
stations = [('ALFA', 3, (2225000.0, -5440000.0, -2481000.0)), ('BRAVO', 1, (-1828800.0, -5054400.0, 3427900.0)),
            ('CHARLIE', 7, (5088900.0, -301700.0, 3825000.0)), ('DELTA', 4, (-768700.0, -5988500.0, 2063300.0)),
            ('ECHO', 9, (0.0, 0.0, -6359600.0))]
point = (30e-6 / 206264.806247, -15e-6 / 206264.806247, 0.8)  # x east, y north (radians), Jy
rng = np.random.default_rng(11)

rows = []
for t in (0.25, 0.2505, 0.75):
    h = np.radians(gst0 + rate * t - ra)
    d = np.radians(dec)
    east = np.array([np.sin(h), np.cos(h), 0.0])
    north = np.array([-np.sin(d) * np.cos(h), np.sin(d) * np.sin(h), np.cos(d)])
    pole = np.array([np.cos(d) * np.cos(h), -np.cos(d) * np.sin(h), np.sin(d)])
    used = sorted(stations[:4], key=lambda s: s[1])
    for a in range(4):
        for b in range(a + 1, 4):
            r = np.array(used[a][2]) - np.array(used[b][2])
            u, v, w = (r @ axis / c for axis in (east, north, pole))
            V = point[2] * np.exp(2j * np.pi * freq * (u * point[0] + v * point[1]))
            hands = [V + complex(*rng.normal(0, 0.01, 2)) for _ in range(2)]
            k = len(rows)
            weights = [4.0e3, 0.0 if k == 2 else float('inf') if k == 5 else -1.0 if k == 7 else 8.0e3]
            rows.append(dict(number1=used[a][1], number2=used[b][1], jd=[jd0, t], u=u, v=v, w=w,
                             re=[x.real for x in hands], im=[x.imag for x in hands], weight=weights))

n = len(rows)
data = np.zeros((n, 1, 1, 1, 1, 2, 3), dtype='>f4')
for k, row in enumerate(rows):
    data[k, 0, 0, 0, 0, :, 0] = row['re']
    data[k, 0, 0, 0, 0, :, 1] = row['im']
    data[k, 0, 0, 0, 0, :, 2] = row['weight']
column = lambda f: np.array([f(row) for row in rows], dtype=float)
par = [column(lambda r: r['u'] * freq), column(lambda r: r['v'] * freq), column(lambda r: r['w'] * freq),
       column(lambda r: 256 * r['number1'] + r['number2']), np.zeros(n), column(lambda r: r['jd'][1]), np.full(n, 10.0)]
names = ['UU---SIN', 'VV---SIN', 'WW---SIN', 'BASELINE', 'DATE', 'DATE', 'INTTIM']
hdu = fits.GroupsHDU(fits.GroupData(data, bitpix=-32, parnames=names, pardata=par))
h = hdu.header
for k in range(1, 8):
    h[f'PSCAL{k}'] = 1 / freq if k <= 3 else 1.0
    h[f'PZERO{k}'] = jd0 if k == 5 else 0.0
h['OBJECT'] = 'INVENTED'
h['TELESCOP'] = 'TESTARRAY'
for k, (name, value, step) in enumerate([('COMPLEX', 1, 1), ('STOKES', -1, -1), ('FREQ', freq, width), ('IF', 1, 1),
                                         ('RA', ra, 1), ('DEC', dec, 1)], 2):
    h[f'CTYPE{k}'], h[f'CRVAL{k}'], h[f'CDELT{k}'], h[f'CRPIX{k}'] = name, float(value), float(step), 1.0

an = fits.BinTableHDU.from_columns([
    fits.Column('ANNAME', '8A', array=[s[0] for s in stations]),
    fits.Column('STABXYZ', '3D', unit='METERS', array=np.array([s[2] for s in stations])),
    fits.Column('NOSTA', '1J', array=[s[1] for s in stations])])
an.header['EXTNAME'] = 'TEST AN'
for key, value in dict(ARRAYX=0.0, ARRAYY=0.0, ARRAYZ=0.0, GSTIA0=gst0, DEGPDY=rate, FREQ=freq, RDATE='2039-11-08',
                       TIMSYS='UTC', FRAME='ITRF').items():
    an.header[key] = value
fq = fits.BinTableHDU.from_columns([
    fits.Column('FRQSEL', '1J', array=[1]), fits.Column('IF FREQ', '1D', unit='HZ', array=[0.0]),
    fits.Column('CH WIDTH', '1E', unit='HZ', array=[width]), fits.Column('TOTAL BANDWIDTH', '1E', unit='HZ', array=[width]),
    fits.Column('SIDEBAND', '1J', array=[1])])
fq.header['EXTNAME'] = 'TEST FQ'
hdus = [hdu, fq, an]
for each in hdus:
    each.add_checksum(when='fixed text')
fits.HDUList(hdus).writeto(f'{out}/groups.fits', overwrite=True, checksum=False)

with fits.open(f'{out}/groups.fits', checksum=True) as f:  # reads back what was meant
    g = f[0].data
    assert np.allclose(g.par('UU---SIN'), [r['u'] for r in rows], rtol=1e-6, atol=0)
    assert np.max(np.abs(g.par('date') - [sum(r['jd']) for r in rows])) * 86400 < 2e-3
for row in rows:
    row['weight'] = [str(w) for w in row['weight']]
with open(f'{out}/groups.json', 'w') as f:
    json.dump(dict(frequencyHz=freq, widthHz=width, raDegrees=ra, decDegrees=dec,
                   stations=[dict(name=s[0].strip(), number=s[1], xyz=s[2]) for s in stations], rows=rows), f, indent=1)
    f.write('\n')
