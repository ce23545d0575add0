# SPDX-License-Identifier: GPL-3.0-or-later
"""What the frames of `isolate` show, found again without any of our code.

The written pictures are unpacked here, the codes become light by the spectra
in the record, and the light becomes contrasts by the tables of CIE 2006 2
degree fundamentals, rods and melanopsin as plain sums at 1 nm. They must be
the contrasts that the record reports for those codes.

usage: read_back.py EVENFIELD SPECTRA_FOLDER; prints TAP.
"""
import csv
import json
import os
import struct
import subprocess
import sys
import tempfile
import zlib

RECEPTORS = ['L', 'M', 'S', 'rod', 'mel']


def read_png(path):
    """Width, samples a picture's row holds per pixel times 3, rows of samples."""
    data = open(path, 'rb').read()
    at, packed, head = 8, b'', None
    while at < len(data):
        length, kind = struct.unpack('>I4s', data[at:at + 8])
        body = data[at + 8:at + 8 + length]
        assert zlib.crc32(kind + body) == struct.unpack(
            '>I', data[at + 8 + length:at + 12 + length])[0]
        assert kind in (b'IHDR', b'IDAT', b'IEND'), kind  # no tags
        if kind == b'IHDR':
            head = struct.unpack('>IIBBBBB', body)
        if kind == b'IDAT':
            packed += body
        at += 12 + length
    width, height, bits, colour = head[:4]
    assert colour == 2 and bits in (8, 16)
    step = 3 * bits // 8
    stride = width * step
    raw = zlib.decompress(packed)
    rows, above = [], bytearray(stride)
    for y in range(height):
        filtering = raw[y * (stride + 1)]
        row = bytearray(raw[y * (stride + 1) + 1:(y + 1) * (stride + 1)])
        for i in range(stride):
            a = row[i - step] if i >= step else 0
            b = above[i]
            c = above[i - step] if i >= step else 0
            if filtering == 1:
                row[i] = (row[i] + a) & 255
            elif filtering == 2:
                row[i] = (row[i] + b) & 255
            elif filtering == 3:
                row[i] = (row[i] + (a + b) // 2) & 255
            elif filtering == 4:
                p = a + b - c
                near = min((abs(p - a), 0, a), (abs(p - b), 1, b),
                           (abs(p - c), 2, c))
                row[i] = (row[i] + near[2]) & 255
        above = row
        rows.append(list(struct.unpack('>%d%s' % (3 * width,
                                                  'B' if bits == 8 else 'H'),
                                       bytes(row))))
    return rows


def read_table(path):
    """Columns by name, each a dict of wavelength to value."""
    lines = [x for x in open(path, encoding='utf-8') if not x.startswith('#')]
    rows = list(csv.reader(lines))
    return {name: {round(float(r[0])): float(r[k]) if r[k] else 0.0
                   for r in rows[1:]}
            for k, name in enumerate(rows[0]) if k > 0}


def functions(spectra):
    cones = read_table(os.path.join(spectra, 'cones', 'cie-2006-2.csv'))
    alpha = read_table(os.path.join(spectra, 'cones', 'cie-s026.csv'))
    rods = read_table(os.path.join(spectra, 'cmf', 'scotopic-1951.csv'))
    mel = [k for k in alpha if k.startswith('mel')][0]
    return list(cones.values())[:3] + [list(rods.values())[0], alpha[mel]]


def code_of(sample, bits):
    return sample >> 6 if bits == 10 else sample


def excite(record, codes, gamma, receptors):
    display = record['display']
    states = display['states']
    dark = states[-1]['radiance']
    most = 2 ** record['frames']['bits'] - 1
    total = list(dark)
    for state, code in zip(states, codes):
        amount = (code / most) ** gamma
        for k, value in enumerate(state['radiance']):
            total[k] += amount * (value - dark[k])
    return [sum(value * table.get(round(nm), 0.0)
                for nm, value in zip(display['wavelength_nm'], total))
            for table in receptors]


def check(evenfield, receptors, bits, gamma, change):
    """The largest difference between the contrasts found and reported."""
    with tempfile.TemporaryDirectory() as folder:
        frames = os.path.join(folder, 'frames')
        subprocess.run([evenfield, 'isolate', '--quiet', '--frames', frames,
                        '--frame-size', '60x40', '--pixels-per-mm', '1',
                        '--size-deg', '1.5', '--bits', str(bits), '--change',
                        change, '--tone', 'power:%g' % gamma],
                       check=True, stdout=subprocess.DEVNULL)
        with open(os.path.join(frames, 'stimulus.json'), encoding='utf-8') as f:
            record = json.load(f)
        rows = read_png(os.path.join(frames, record['pictures'][0]['file']))
    corner = [code_of(x, bits) for x in rows[0][:3]]
    middle = [code_of(x, bits) for x in rows[20][90:93]]
    low = excite(record, corner, gamma, receptors)
    high = excite(record, middle, gamma, receptors)
    answer = record['answer']
    if bits <= 10:  # beyond, frames have rounded codes and say so
        assert corner == answer['background_codes'], corner
        assert middle == answer['codes'], middle
    wanted = answer['contrast_codes'] if bits <= 10 else answer['contrast']
    return max(abs(b / a - 1 - wanted[name])
               for name, a, b in zip(RECEPTORS, low, high))


def main():
    evenfield, spectra = sys.argv[1:]
    receptors = functions(spectra)
    # Silent to the digits of sums; 16 bits are rounded to half a code.
    cases = [(8, 1.0, 'S', 1e-12), (8, 2.2, 'isoluminant red-green', 1e-12),
             (10, 2.2, 'L,-M', 1e-12), (16, 1.0, 'S', 1e-4)]
    failed = False
    print('1..%d' % len(cases))
    for number, (bits, gamma, change, most) in enumerate(cases, 1):
        worst = check(evenfield, receptors, bits, gamma, change)
        good = worst <= most
        failed = failed or not good
        print('%s %d - %s at %d bits, power %g: contrasts differ by %.2g' %
              ('ok' if good else 'not ok', number, change, bits, gamma, worst))
    sys.exit(failed)


main()
