"""Makes the OIFITS fixtures of test/data/fits with astropy 5.2 (Debian 12, python3-astropy). All content is invented:

    double.oifits      OIFITS 2: 4 stations, 6 baselines, 4 triangles, 3 wavelengths; a double source of ratio 0.4
                       at (3, -1.5) mas
    two-arrays.oifits  OIFITS 1: two targets, two arrays, two tables of wavelengths, flags, a column of our own

    /usr/bin/python3 test/data/scripts/make-oifits-fixtures.py test/data/fits
"""
import os, sys
import numpy as np
from astropy.io import fits

out = sys.argv[1]
C = lambda n, f, a, u=None: fits.Column(name=n, format=f, array=a, unit=u)


def table(name, cols, **keywords):
    t = fits.BinTableHDU.from_columns(cols, name=name)
    for key, value in keywords.items():
        t.header['DATE-OBS' if key == 'DATE_OBS' else key] = value
    return t


def save(name, hdus):
    hdus = fits.HDUList(hdus)
    for h in hdus:
        h.add_checksum(when='fixed test HDU')
    hdus.writeto(os.path.join(out, name), overwrite=True, checksum=False, output_verify='exception')


def common(n):
    return [C('TARGET_ID', 'I', np.ones(n, 'i2')), C('TIME', 'D', np.zeros(n), 's'),
            C('MJD', 'D', np.full(n, 60310.25), 'd'), C('INT_TIME', 'D', np.full(n, 30.0), 's')]


def target(ids, names, ra, dec):
    n = len(ids)
    zero = lambda form: np.zeros(n)
    cols = [C('TARGET_ID', 'I', ids), C('TARGET', '16A', names), C('RAEP0', 'D', ra, 'deg'),
            C('DECEP0', 'D', dec, 'deg'), C('EQUINOX', 'E', [2000.0] * n, 'yr')]
    cols += [C(k, 'D', zero('D'), 'deg') for k in ('RA_ERR', 'DEC_ERR')]
    cols += [C('SYSVEL', 'D', zero('D'), 'm/s'), C('VELTYP', '8A', ['LSR'] * n), C('VELDEF', '8A', ['OPTICAL'] * n)]
    cols += [C(k, 'D', zero('D'), 'deg/yr') for k in ('PMRA', 'PMDEC', 'PMRA_ERR', 'PMDEC_ERR')]
    cols += [C(k, 'E', zero('E'), 'deg') for k in ('PARALLAX', 'PARA_ERR')]
    return cols + [C('SPECTYP', '16A', ['UNKNOWN'] * n)]


def double():
    mas = np.pi / 180 / 3.6e6
    xyz = np.array([[0.0, 0, 0], [60, 10, 0], [20, 80, 0], [-50, 40, 5]])
    wl = np.array([1.55e-6, 1.60e-6, 1.65e-6], dtype='f4')
    bw = np.full(3, 5e-8, 'f4')
    f, dl, dm = 0.4, 3.0 * mas, -1.5 * mas
    V = lambda u, v: (1 + f * np.exp(-2j * np.pi * (u * dl + v * dm))) / (1 + f)
    bas = [(i, j) for i in range(4) for j in range(i + 1, 4)]
    uvm = {(i, j): (xyz[j] - xyz[i])[:2] for i, j in bas}
    vis = np.array([[V(uvm[b][0] / float(l), uvm[b][1] / float(l)) for l in wl] for b in bas])
    tris = [(i, j, k) for i in range(4) for j in range(i + 1, 4) for k in range(j + 1, 4)]
    t3 = []
    for (i, j, k) in tris:
        u1, u2 = uvm[i, j], uvm[j, k]
        u3 = -(u1 + u2)
        t3.append([V(*(u1 / float(l))) * V(*(u2 / float(l))) * V(*(u3 / float(l))) for l in wl])
    t3 = np.array(t3)
    nb, nt = len(bas), len(tris)
    pri = fits.PrimaryHDU()
    for k, v in dict(ORIGIN='TEST', DATE='2024-01-01', DATE_OBS='2024-01-01', CONTENT='OIFITS2', TELESCOP='TESTARR',
                     INSTRUME='TESTINS', OBSERVER='NONE', OBJECT='TESTSRC', INSMODE='LOW').items():
        pri.header[k.replace('_', '-')] = v
    arr = table('OI_ARRAY', [C('TEL_NAME', '16A', ['A', 'B', 'C', 'D']), C('STA_NAME', '16A', ['S1', 'S2', 'S3', 'S4']),
                             C('STA_INDEX', 'I', [1, 2, 3, 4]), C('DIAMETER', 'E', [1.0] * 4, 'm'),
                             C('STAXYZ', '3D', xyz, 'm'), C('FOV', 'D', [1.0] * 4, 'arcsec'),
                             C('FOVTYPE', '6A', ['FWHM'] * 4)],
                OI_REVN=2, ARRNAME='TESTARR', FRAME='GEOCENTRIC', ARRAYX=0.0, ARRAYY=0.0, ARRAYZ=0.0)
    w = table('OI_WAVELENGTH', [C('EFF_WAVE', 'E', wl, 'm'), C('EFF_BAND', 'E', bw, 'm')], OI_REVN=2, INSNAME='TESTINS')
    sta2 = np.array([[i + 1, j + 1] for i, j in bas], 'i2')
    sta3 = np.array([[i + 1, j + 1, k + 1] for i, j, k in tris], 'i2')
    u = np.array([uvm[b][0] for b in bas])
    v = np.array([uvm[b][1] for b in bas])
    keys = dict(DATE_OBS='2024-01-01', INSNAME='TESTINS')
    flag = lambda n: C('FLAG', '3L', np.zeros((n, 3), bool))
    full = lambda n, x: np.full((n, 3), x)
    v1 = table('OI_VIS', common(nb) + [
        C('VISAMP', '3D', abs(vis)), C('VISAMPERR', '3D', full(nb, 0.01)),
        C('VISPHI', '3D', np.degrees(np.angle(vis)), 'deg'), C('VISPHIERR', '3D', full(nb, 1.0), 'deg'),
        C('UCOORD', 'D', u, 'm'), C('VCOORD', 'D', v, 'm'), C('STA_INDEX', '2I', sta2), flag(nb)],
        OI_REVN=2, ARRNAME='TESTARR', AMPTYP='absolute', PHITYP='absolute', **keys)
    v2 = table('OI_VIS2', common(nb) + [
        C('VIS2DATA', '3D', abs(vis) ** 2), C('VIS2ERR', '3D', full(nb, 0.02)),
        C('UCOORD', 'D', u, 'm'), C('VCOORD', 'D', v, 'm'), C('STA_INDEX', '2I', sta2), flag(nb)],
        OI_REVN=2, ARRNAME='TESTARR', **keys)
    tri = table('OI_T3', common(nt) + [
        C('T3AMP', '3D', abs(t3)), C('T3AMPERR', '3D', full(nt, 0.02)),
        C('T3PHI', '3D', np.degrees(np.angle(t3)), 'deg'), C('T3PHIERR', '3D', full(nt, 1.0), 'deg'),
        C('U1COORD', 'D', [uvm[i, j][0] for i, j, k in tris], 'm'), C('V1COORD', 'D', [uvm[i, j][1] for i, j, k in tris], 'm'),
        C('U2COORD', 'D', [uvm[j, k][0] for i, j, k in tris], 'm'), C('V2COORD', 'D', [uvm[j, k][1] for i, j, k in tris], 'm'),
        C('STA_INDEX', '3I', sta3), flag(nt)], OI_REVN=2, ARRNAME='TESTARR', **keys)
    fl = table('OI_FLUX', [
        C('TARGET_ID', 'I', [1]), C('MJD', 'D', [60310.25], 'd'), C('INT_TIME', 'D', [30.0], 's'),
        C('FLUXDATA', '3D', np.array([[1.0, 1.1, 1.2]]), 'Jy'), C('FLUXERR', '3D', np.array([[0.1, 0.1, 0.1]]), 'Jy'), flag(1)],
        OI_REVN=1, CALSTAT='C', FOV=1.0, FOVTYPE='FWHM', **keys)
    tgt = table('OI_TARGET', target([1], ['TESTSRC'], [10.0], [20.0]), OI_REVN=2)
    save('double.oifits', [pri, tgt, arr, w, v1, v2, tri, fl])


def two_arrays():
    stations = lambda name, indices, origin, frame: table('OI_ARRAY', [
        C('TEL_NAME', '16A', ['T%d' % i for i in indices]), C('STA_NAME', '16A', ['%s%d' % (name, i) for i in indices]),
        C('STA_INDEX', 'I', indices), C('DIAMETER', 'E', [2.0] * len(indices), 'm'),
        C('STAXYZ', '3D', np.array([[10.0 * i, i, -i] for i in indices]), 'm')],
        OI_REVN=1, ARRNAME=name, FRAME=frame, ARRAYX=origin[0], ARRAYY=origin[1], ARRAYZ=origin[2])
    waves = lambda name, values: table('OI_WAVELENGTH', [
        C('EFF_WAVE', 'E', np.array(values, 'f4'), 'm'), C('EFF_BAND', 'E', np.full(len(values), 1e-8, 'f4'), 'm')],
        OI_REVN=1, INSNAME=name)
    def vis2(ids, sta, values, flags, arrname, insname):
        n, m = np.shape(values)
        cols = common(n)
        cols[0] = C('TARGET_ID', 'I', ids)
        return table('OI_VIS2', cols + [
            C('VIS2DATA', '%dD' % m, values), C('VIS2ERR', '%dD' % m, np.full((n, m), 0.01)),
            C('UCOORD', 'D', np.arange(n) * 1.5, 'm'), C('VCOORD', 'D', -np.arange(n) * 2.5, 'm'),
            C('STA_INDEX', '2I', sta), C('FLAG', '%dL' % m, flags), C('NS_NOTE', '6A', ['row%d' % k for k in range(n)])],
            OI_REVN=1, DATE_OBS='2024-01-01', ARRNAME=arrname, INSNAME=insname)
    save('two-arrays.oifits', [
        fits.PrimaryHDU(),
        table('OI_TARGET', target([7, 3], ['ALPHA', 'BETA'], [10.0, 30.0], [20.0, -40.0]), OI_REVN=1),
        stations('NORTH', [1, 2, 5], (1000.0, 2000.0, 3000.0), 'GEOCENTRIC'),
        stations('SOUTH', [2, 9], (1.0, 1.0, 1.0), 'SKY'),
        waves('RED', [2e-6]), waves('BLUE', [4e-7, 5e-7]),
        vis2([3, 7], np.array([[1, 5], [2, 1]], 'i2'), [[0.5], [0.25]], [[False], [True]], 'NORTH', 'RED'),
        vis2([7], np.array([[9, 2]], 'i2'), [[0.125, np.nan]], [[False, True]], 'SOUTH', 'BLUE'),
    ])


double()
two_arrays()
