# SPDX-License-Identifier: GPL-3.0-or-later
"""The CIE data sets among the tables, digit by digit.

The CIE prints, in the metadata of a data set, a checksum of its file. Our rows,
written in the byte form of that file, must give the same sum: then no figure
differs from the official one. All these files have lines "wavelength,values"
that end in CR LF, the last one too, and no header.

usage: pub_checksums.py SPECTRA_FOLDER; prints TAP.
"""
import hashlib
import sys
from decimal import ROUND_HALF_UP, Decimal


def as_typed(cell):
    return cell


def without_zeros(cell):
    return cell.rstrip('0').rstrip('.') if '.' in cell else cell


def two_decimals(cell):
    return str(Decimal(cell).quantize(Decimal('0.01'), ROUND_HALF_UP))


# Files whose columns stand side by side in the data set, byte form of a
# figure, checksum, identifier (doi) of the data set.
DATA_SETS = [
    (['illuminants/cie-c'], as_typed,
     'bb325f040bab332d91f8d9447aa47b78', '10.25039/CIE.DS.mjdd2enu'),
    (['illuminants/cie-d50'], without_zeros,
     'b23049c6f7b266c1c1fbe147aa271e8930ca02d6e569c5ae1804c036faea4193',
     '10.25039/CIE.DS.etgmuqt5'),
    (['illuminants/cie-d55'], as_typed,
     '8b5678358f265567a0759b9800f17d7f', '10.25039/CIE.DS.qewfb3kp'),
    (['illuminants/cie-d65'], without_zeros,
     'e76f210bffff3d552ef7113025da5f325d5dfec200dd4b878b1a2f3a507032cb',
     '10.25039/CIE.DS.hjfjmt59'),
    (['illuminants/cie-d75'], as_typed,
     'fc2ae36ece39ad1729696ab2833bd013', '10.25039/CIE.DS.9fvcmrk4'),
    (['illuminants/daylight-components'], as_typed,
     '3068737bc5e8561bd8b3ef9639578d18', '10.25039/CIE.DS.w7zunnny'),
    (['illuminants/cie-fl', 'illuminants/cie-fl3'], as_typed,
     '24303adacbfee5e19b2123ea2c3208a993577a054abaf55ea7e19517f98e4d55',
     '10.25039/CIE.DS.ukaymjdn'),
    # The table has the digits of the 1 nm set; this is the printed 5 nm one.
    (['illuminants/cie-led'], two_decimals,
     '91a73557fe319a085dd598ce96fa8ace', '10.25039/CIE.DS.vgssnyfg'),
    (['surfaces/cie-tcs'], without_zeros,
     '6ad6522831a844edb8484e884d05c9e9', '10.25039/CIE.DS.wuiuu9cz'),
]
ALGORITHMS = {32: 'md5', 64: 'sha256'}


def read_rows(path):
    with open(path, encoding='ascii', newline='') as file:
        lines = [line for line in file.read().split('\n')[:-1]
                 if not line.startswith('#')]
    return [line.split(',') for line in lines[1:]]


def official_bytes(folder, names, form):
    tables = [read_rows(f'{folder}/{name}.csv') for name in names]
    lines = []
    for rows in zip(*tables, strict=True):
        if len({row[0] for row in rows}) != 1:
            raise ValueError(f'{names}: different wavelengths')
        cells = [form(cell) for row in rows for cell in row[1:]]
        lines.append(','.join([rows[0][0]] + cells) + '\r\n')
    return ''.join(lines).encode('ascii')


def main():
    folder = sys.argv[1]
    n_bad = 0
    print(f'1..{len(DATA_SETS)}')
    for i, (names, form, checksum, doi) in enumerate(DATA_SETS, 1):
        algorithm = ALGORITHMS[len(checksum)]
        data = official_bytes(folder, names, form)
        same = hashlib.new(algorithm, data).hexdigest() == checksum
        n_bad += not same
        verdict = 'ok' if same else 'not ok'
        print(f'{verdict} {i} - {" ".join(names)}: {algorithm} of {doi}')
    return 1 if n_bad else 0


sys.exit(main())
