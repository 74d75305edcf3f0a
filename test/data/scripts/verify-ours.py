"""Reads the files that our writers wrote with astropy 5.2 and fitsverify 4.20 (Debian 12) and records, beside the
digest of each file, whether its checksums hold, what fitsverify says, and what astropy reads. Run:

    node test/data/scripts/write-ours.ts DIRECTORY
    /usr/bin/python3 test/data/scripts/verify-ours.py DIRECTORY > test/data/fits/ours-verified.json
"""
import hashlib, json, os, pathlib, subprocess, sys, warnings
import numpy as np
from astropy.io import fits

where = sys.argv[1]
warnings.simplefilter('error')  # astropy warns of a wrong checksum; a warning ends this script


def plain(x):
    if isinstance(x, np.ndarray):
        return [plain(y) for y in x.tolist()]
    if isinstance(x, complex):
        return [x.real, x.imag]
    if isinstance(x, list):
        return [plain(y) for y in x]
    if isinstance(x, (float, np.floating)) and x != x:
        return None  # undefined; JSON has no word for it
    return x.item() if isinstance(x, np.generic) else x


def content(hdu):
    if isinstance(hdu, fits.GroupsHDU):
        return dict(parameters={n: plain(hdu.data.par(n)) for n in hdu.data.parnames}, data=plain(hdu.data.data.ravel()))
    if hdu.data is None:
        return None
    if hdu.is_image:
        return dict(shape=list(hdu.data.shape), data=plain(hdu.data.ravel()))
    return {c.name: plain(np.asarray(hdu.data[c.name])) for c in hdu.columns}


result = {}
for name in sorted(os.listdir(where)):
    path = os.path.join(where, name)
    with fits.open(path, checksum=True) as f:
        f.verify('exception')
        hdus = [dict(extname=h.name, keywords=[str(h.header.get(k, '')) for k in ('CHECKSUM', 'DATASUM')],
                     header={k: plain(h.header[k]) for k in h.header if k in (
                         'REMARK', 'OBJECT', 'CDELT1', 'CDELT2', 'RESOLUTN', 'TOTVAR', 'NCOMP', 'AMPTYP', 'CONTENT')},
                     content=content(h)) for h in f]
    said = subprocess.run(['fitsverify', path], stdout=subprocess.PIPE).stdout.decode()
    found = [line.strip(' *\n') for line in said.splitlines()
             if 'Warning:' in line or 'Error:' in line or 'Verification found' in line]
    result[name] = dict(sha256=hashlib.sha256(pathlib.Path(path).read_bytes()).hexdigest(), fitsverify=found, hdus=hdus)
json.dump(result, sys.stdout, indent=1, sort_keys=True)
print()
