#!/usr/bin/python3
# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
"""Every input form of image files, pixel by pixel, against files that other programs wrote; and back.

Writers: python3-tifffile, tiffcp (libtiff-tools), convert (ImageMagick), as Debian packages them. The truth is the
numpy array that went in. dump_plane prints what Aimwell reads; our own files are read back by tifffile and tiffinfo.
"""
import json
import os
import shutil
import struct
import subprocess
import sys
import tempfile
import zlib

import numpy as np
import tifffile

BIN = os.environ.get('BIN', 'build')
DUMP = os.path.join(BIN, 'reference', 'dump_plane')
WRITE = os.path.join(BIN, 'reference', 'write_plane')
CONVERT = shutil.which('convert-im6.q16') or '/usr/bin/convert'
tests = []


def test(name, needs=None):
    def keep(function):
        tests.append((name, function, needs))
        return function
    return keep


class Plane:
    def __init__(self, path, page=0, channel=-1, rect=()):
        run = subprocess.run([DUMP, path, str(page), str(channel), *map(str, rect)], capture_output=True)
        self.error = run.stderr.decode()
        if run.returncode:
            self.info, self.pixels = None, None
            return
        head, raw = run.stdout.split(b'\n', 1)
        self.info = json.loads(head)
        assert not self.error, f'said on stderr: {self.error}'
        width = rect[2] - rect[0] if rect else self.info['width']
        self.pixels = np.frombuffer(raw, self.info['sample']).reshape(-1, width)


def same(plane, truth):
    assert plane.pixels is not None, plane.error
    assert plane.pixels.dtype == truth.dtype, f'{plane.pixels.dtype} instead of {truth.dtype}'
    assert plane.pixels.shape == truth.shape, f'{plane.pixels.shape} instead of {truth.shape}'
    bad = np.argwhere(plane.pixels != truth)
    assert len(bad) == 0, f'{len(bad)} pixels differ, the first at row, column {bad[0]}'


def refused(plane, *parts):
    assert plane.pixels is None, 'was read'
    for part in parts:
        assert part in plane.error, f'{plane.error!r} lacks {part!r}'


def picture(shape=(307, 411), dtype=np.uint16, seed=20310504):
    """Noise on a smooth slope: compressible, but every value occurs."""
    rng = np.random.default_rng(seed)
    y, x = np.indices(shape)
    smooth = (np.sin(x / 37) + np.cos(y / 23) + 2) / 4
    if dtype == np.float32:
        return (smooth * 1000 + rng.normal(0, 3, shape)).astype(np.float32)
    top = np.iinfo(dtype).max
    return np.clip(smooth * top + rng.normal(0, top / 20, shape), 0, top).astype(dtype)


def run(*command):
    done = subprocess.run(command, capture_output=True, text=True)
    assert done.returncode == 0, f'{command[0]}: {done.stderr.strip()}'


# ---- tifffile ----

FORMS = {
    'strips': {},
    'one row a strip': {'rowsperstrip': 1},
    '17 rows a strip': {'rowsperstrip': 17},
    'tiles 64 x 128': {'tile': (64, 128)},
    'big-endian': {'byteorder': '>'},
    'big-endian tiles': {'byteorder': '>', 'tile': (32, 48)},
    'BigTIFF': {'bigtiff': True},
    'BigTIFF big-endian tiles': {'bigtiff': True, 'byteorder': '>', 'tile': (64, 64)},
    'Deflate': {'compression': 'zlib'},
    'Deflate with predictor': {'compression': 'zlib', 'predictor': True, 'rowsperstrip': 50},
    'Deflate tiles with predictor': {'compression': 'zlib', 'predictor': True, 'tile': (64, 64)},
    'white is zero': {'photometric': 'miniswhite'},
}


def tifffile_form(options, dtype):
    def check(folder):
        truth = picture(dtype=dtype)
        path = os.path.join(folder, 'a.tif')
        tifffile.imwrite(path, truth, **options)
        plane = Plane(path)
        if options.get('photometric') == 'miniswhite':
            truth = np.iinfo(dtype).max - truth
        same(plane, truth)
        rect = (100, 33, 300, 204)
        same(Plane(path, rect=rect), truth[rect[1]:rect[3], rect[0]:rect[2]])
        full = {np.uint8: 255, np.uint16: 65535, np.float32: 0}[dtype]
        assert plane.info['full_scale'] == full, plane.info['full_scale']
    return check


for form, options in FORMS.items():
    for dtype in (np.uint8, np.uint16, np.float32):
        if dtype == np.float32 and (options.get('predictor') or 'photometric' in options):
            continue
        tests.append((f'tifffile: {form}, {np.dtype(dtype).name}', tifffile_form(options, dtype), None))


@test('tifffile: pages')
def pages(folder):
    path = os.path.join(folder, 'a.tif')
    stack = [picture((40 + i, 50), seed=i) for i in range(5)]
    with tifffile.TiffWriter(path) as writer:
        for page in stack:
            writer.write(page, contiguous=False, metadata=None)
    for i in (4, 0, 2):
        plane = Plane(path, page=i)
        same(plane, stack[i])
        assert plane.info['pages'] == 5
    refused(Plane(path, page=5), 'no page 5; it has 5')


@test('tifffile: resolution tags give the pixel size')
def resolution(folder):
    path = os.path.join(folder, 'a.tif')
    for unit, per_unit, um in (('CENTIMETER', (31007752, 1000), 0.3225), ('INCH', (7876, 1), 25400 / 7876),
                               ('NONE', (31, 10), 0), ('INCH', (72, 1), 0)):
        tifffile.imwrite(path, picture((9, 9)), resolution=(per_unit, per_unit), resolutionunit=unit, metadata=None)
        said = Plane(path).info['pixel_um']
        assert abs(said - um) < 1e-6, f'{said} instead of {um}'


@test('tifffile: RGB side by side and in planes')
def rgb(folder):
    path = os.path.join(folder, 'a.tif')
    grey, other = picture(seed=1), picture(seed=2)
    for planar, axis in (('contig', 2), ('separate', 0)):
        for tile in (None, (64, 64)):
            tifffile.imwrite(path, np.stack([grey] * 3, axis), photometric='rgb', planarconfig=planar, tile=tile)
            same(Plane(path), grey)
            tifffile.imwrite(path, np.stack([grey, other, grey], axis), photometric='rgb', planarconfig=planar, tile=tile)
            refused(Plane(path), path, 'channels differ', '--channel 0 to 2')
            same(Plane(path, channel=1), other)
            same(Plane(path, channel=2, rect=(5, 6, 200, 300)), grey[6:300, 5:200])


@test('tifffile: RGB with alpha needs a channel')
def rgba(folder):
    path = os.path.join(folder, 'a.tif')
    planes = np.stack([picture((20, 30), np.uint8, i) for i in range(4)], 2)
    tifffile.imwrite(path, planes, photometric='rgb', extrasamples=['unassalpha'])
    refused(Plane(path), 'has 4 channels', '--channel 0 to 3')
    same(Plane(path, channel=3), planes[:, :, 3])


@test('tifffile: unsupported pixel forms are named')
def unsupported(folder):
    path = os.path.join(folder, 'a.tif')
    for dtype, words in (('i2', '16-bit signed'), ('u4', '32-bit unsigned'), ('f2', '16-bit float'),
                         ('f8', '64-bit float'), ('c8', 'complex'), ('?', '1-bit')):
        tifffile.imwrite(path, np.zeros((20, 30), dtype))
        refused(Plane(path), words, 'not read')


@test('tifffile: OME-TIFF with channels, times and positions')
def ome(folder):
    path = os.path.join(folder, 'a.ome.tif')
    for axes in ('TCYX', 'CTYX', 'TCZYX', 'ZCTYX'):
        shape = {'T': 3, 'C': 2, 'Z': 4}
        outer = [shape[a] for a in axes[:-2]]
        n = int(np.prod(outer))
        planes = np.stack([picture((21, 34), seed=i) for i in range(n)]).reshape(*outer, 21, 34)
        tifffile.imwrite(path, planes, ome=True, photometric='minisblack', metadata={
            'axes': axes, 'PhysicalSizeX': 325.0, 'PhysicalSizeXUnit': 'nm', 'PhysicalSizeY': 0.5,
            'PhysicalSizeYUnit': 'µm', 'SignificantBits': 12, 'Channel': {'Name': ['blue', 'green']},
            'AcquisitionDate': '2031-05-04T12:00:00Z',
            'Plane': {'PositionX': [0.001 * i for i in range(n)], 'PositionXUnit': ['mm'] * n,
                      'PositionY': [-2.5 * i for i in range(n)], 'PositionYUnit': ['µm'] * n,
                      'DeltaT': [10.0 * i for i in range(n)], 'DeltaTUnit': ['s'] * n}})
        refused(Plane(path), 'has 2 channels', '0 blue, 1 green')
        steps = {a: int(np.prod(outer[i + 1:])) for i, a in enumerate(axes[:-2])}
        n_z = shape['Z'] if 'Z' in axes else 1
        for t in range(3):
            for z in range(n_z):
                for c in range(2):
                    at = t * steps['T'] + c * steps['C'] + z * steps.get('Z', 0)
                    plane = Plane(path, page=t * n_z + z, channel=c)
                    same(plane, planes.reshape(-1, 21, 34)[at])
                    info = plane.info
                    assert (info['pages'], info['channels']) == (3 * n_z, 2), info
                    assert abs(info['pixel_um'] - 0.325) < 1e-12 and info['pixel_y_um'] == 0.5, info
                    assert abs(info['stage_x_um'] - at) < 1e-9 and abs(info['stage_y_um'] + 2.5 * at) < 1e-9, info
                    assert info['taken_at'] == 1935662400 + 10 * at, info


@test('tifffile: OME-TIFF as BigTIFF in tiles, several images')
def ome_images(folder):
    path = os.path.join(folder, 'a.ome.tif')
    planes = [picture((100, 130), seed=i) for i in range(3)]
    with tifffile.TiffWriter(path, bigtiff=True, ome=True) as writer:
        for i, plane in enumerate(planes):
            writer.write(plane, tile=(32, 32), metadata={
                'axes': 'YX', 'PhysicalSizeX': 1 + i, 'Plane': {'PositionX': 5.0, 'PositionY': 6.0}})
    for i, truth in enumerate(planes):
        plane = Plane(path, page=i)
        same(plane, truth)
        assert plane.info['pixel_um'] == 1 + i
        assert plane.info['stage_x_um'] is None and plane.info['reference_frame']


@test('tifffile: OME-TIFF in colour')
def ome_rgb(folder):
    path = os.path.join(folder, 'a.ome.tif')
    planes = np.stack([picture((31, 42), np.uint8, i) for i in range(3)], 2)
    tifffile.imwrite(path, planes, photometric='rgb', ome=True, metadata={'axes': 'YXS'})
    for c in range(3):
        same(Plane(path, channel=c), planes[:, :, c])
    refused(Plane(path), 'channels differ', '--channel 0 to 2')


@test('floating point predictor by its specification, both byte orders')
def float_predictor(folder):
    """Adobe Photoshop TIFF Technical Note 3 (2005): bytes sorted by weight, then differenced along the row."""
    truth = picture((40, 50), np.float32)
    sorted_bytes = truth.astype('>f4').view('u1').reshape(40, 50, 4).transpose(0, 2, 1).reshape(40, 200)
    coded = zlib.compress(np.diff(sorted_bytes, axis=1, prepend=np.zeros((40, 1), np.uint8)).astype(np.uint8).tobytes())
    path = os.path.join(folder, 'a.tif')
    for mark, order in ((b'II', '<'), (b'MM', '>')):
        tags = ((256, 50), (257, 40), (258, 32), (259, 8), (262, 1), (273, 8), (277, 1), (278, 40), (279, len(coded)),
                (317, 3), (339, 3))
        with open(path, 'wb') as file:
            file.write(mark + struct.pack(order + 'HI', 42, 8 + len(coded)) + coded + struct.pack(order + 'H', len(tags)))
            for tag, value in tags:
                file.write(struct.pack(order + 'HHII', tag, 4, 1, value))
            file.write(bytes(4))
        same(Plane(path), truth)


# ---- tiffcp ----

TIFFCP = {
    'none in strips': ['-c', 'none', '-r', '13'],
    'LZW': ['-c', 'lzw'],
    'LZW with predictor': ['-c', 'lzw:2', '-r', '20'],
    'Deflate': ['-c', 'zip'],
    'Deflate with predictor in tiles': ['-c', 'zip:2', '-t', '-w', '64', '-l', '32'],
    'PackBits': ['-c', 'packbits'],
    'PackBits in tiles': ['-c', 'packbits', '-t', '-w', '32', '-l', '32'],
    'Zstandard': ['-c', 'zstd'],
    'Zstandard with predictor': ['-c', 'zstd:2', '-r', '64'],
    'big-endian LZW with predictor': ['-B', '-c', 'lzw:2'],
    'big-endian BigTIFF in tiles': ['-8', '-B', '-t', '-w', '128', '-l', '64'],
    'one strip': ['-r', '100000', '-c', 'lzw'],
    'bits from low to high': ['-f', 'lsb2msb', '-c', 'lzw'],
}


def tiffcp_form(options, dtype):
    def check(folder):
        truth = picture(dtype=dtype)
        a, b = os.path.join(folder, 'a.tif'), os.path.join(folder, 'b.tif')
        tifffile.imwrite(a, truth)
        run('tiffcp', *options, a, b)
        same(Plane(b), truth)
        same(Plane(b, rect=(11, 70, 12, 307)), truth[70:307, 11:12])
    return check


for form, options in TIFFCP.items():
    for dtype in (np.uint8, np.uint16, np.float32):
        if dtype == np.float32 and '-B' in options and 'lzw:2' in options:
            continue  # libtiff 4.5.0 reads the floating point predictor of big-endian files but writes it wrongly
        if dtype == np.float32:
            options = [o.replace(':2', ':3') for o in options]
        tests.append((f'tiffcp: {form}, {np.dtype(dtype).name}', tiffcp_form(options, dtype), 'tiffcp'))


@test('tiffcp: RGB in separate planes and back', 'tiffcp')
def tiffcp_planar(folder):
    a, b = os.path.join(folder, 'a.tif'), os.path.join(folder, 'b.tif')
    planes = np.stack([picture(dtype=np.uint8, seed=i) for i in range(3)], 2)
    tifffile.imwrite(a, planes, photometric='rgb')
    for options in (['-p', 'separate'], ['-p', 'separate', '-t', '-w', '64', '-l', '64'], ['-p', 'separate', '-c', 'zip:2']):
        run('tiffcp', *options, a, b)
        for c in range(3):
            same(Plane(b, channel=c), planes[:, :, c])


@test('tiffcp: a long compressed strip, read by rows', 'tiffcp')
def long_strip(folder):
    """16000 x 9000 16-bit pixels in one strip are 288 MB: too long to be held whole."""
    a, b = os.path.join(folder, 'a.tif'), os.path.join(folder, 'b.tif')
    truth = np.tile(picture((300, 400)), (30, 40))
    tifffile.imwrite(a, truth)
    for options in (['-c', 'lzw'], ['-c', 'zip:p1'], ['-c', 'packbits'], ['-c', 'none']):
        run('tiffcp', '-C', '-m', '1000', '-r', '100000', *options, a, b)
        same(Plane(b, rect=(0, 0, 16000, 10)), truth[:10])
        same(Plane(b, rect=(7000, 5000, 7900, 5600)), truth[5000:5600, 7000:7900])


@test('tiffcp: 8-bit RGB as JPEG is refused by name', 'tiffcp')
def jpeg(folder):
    a, b = os.path.join(folder, 'a.tif'), os.path.join(folder, 'b.tif')
    tifffile.imwrite(a, picture(dtype=np.uint8))
    run('tiffcp', '-c', 'jpeg', '-r', '16', a, b)
    refused(Plane(b), 'compression 7 (JPEG)', 'not read')


@test('tiffcp: bilevel fax is refused by name', 'tiffcp')
def fax(folder):
    a, b = os.path.join(folder, 'a.tif'), os.path.join(folder, 'b.tif')
    tifffile.imwrite(a, picture() > 30000)
    run('tiffcp', '-c', 'g4', a, b)
    refused(Plane(b), 'compression 4 (CCITT Group 4)', 'not read')


# ---- ImageMagick ----

def magick(folder, truth, name, *options):
    a, b = os.path.join(folder, 'a.tif'), os.path.join(folder, name)
    tifffile.imwrite(a, truth, metadata=None, photometric='rgb' if truth.ndim == 3 else 'minisblack')
    run(CONVERT, a, *options, b)
    return b


@test('ImageMagick: PNG of 8 and 16 bits', CONVERT)
def png(folder):
    for dtype in (np.uint8, np.uint16):
        truth = picture(dtype=dtype)
        path = magick(folder, truth, 'b.png', '-define', 'png:color-type=0', '-depth', str(8 * truth.itemsize))
        same(Plane(path), truth)
        same(Plane(path, rect=(3, 4, 99, 98)), truth[4:98, 3:99])


@test('ImageMagick: PNG of 1, 2 and 4 bits', CONVERT)
def png_few_bits(folder):
    for bits in (1, 2, 4):
        top = 2 ** bits - 1
        small = (picture((40, 51), np.uint8).astype(int) * (top + 1) // 256).astype(np.uint8)
        path = magick(folder, small * (255 // top), 'b.png', '-define', 'png:color-type=0', '-define',
                      f'png:bit-depth={bits}')
        plane = Plane(path)
        same(plane, small)
        assert plane.info['full_scale'] == top, plane.info


@test('ImageMagick: RGB PNG, grey and coloured', CONVERT)
def png_rgb(folder):
    grey, other = picture((60, 70), np.uint8, 1), picture((60, 70), np.uint8, 2)
    options = ['-define', 'png:color-type=2', '-depth', '8']
    same(Plane(magick(folder, np.stack([grey] * 3, 2), 'b.png', *options)), grey)
    path = magick(folder, np.stack([grey, grey, other], 2), 'c.png', *options)
    refused(Plane(path), path, 'channels differ', '--channel 0 to 2')
    same(Plane(path, channel=2), other)


@test('ImageMagick: palette, alpha and interlaced PNG are refused by name', CONVERT)
def png_refused(folder):
    grey = picture((60, 70), np.uint8)
    for options, words in ((['-define', 'png:color-type=3', '-colors', '9'], 'palette'),
                           (['-alpha', 'on', '-define', 'png:color-type=4'], 'transparency'),
                           (['-interlace', 'PNG', '-define', 'png:color-type=0'], 'interlaced')):
        refused(Plane(magick(folder, grey, 'b.png', *options)), words)


def magick_reads(path, shape):
    """The pixels as ImageMagick itself reads them, scaled to 16 bits."""
    done = subprocess.run([CONVERT, path, '-depth', '16', '-endian', 'LSB', 'gray:-'], capture_output=True, check=True)
    return np.frombuffer(done.stdout, '<u2').reshape(shape)


@test('ImageMagick: white-is-zero TIFF', CONVERT)
def white_is_zero(folder):
    """It sets the tag without turning the pixels round, so they are turned first; read back they are the truth."""
    truth = picture()
    path = magick(folder, truth, 'b.tif', '-negate', '-define', 'quantum:polarity=min-is-white', '-compress', 'LZW')
    with tifffile.TiffFile(path) as file:
        assert file.pages[0].photometric == 0, 'the file is not white-is-zero'
    assert np.array_equal(magick_reads(path, truth.shape), truth)
    same(Plane(path), truth)


@test('ImageMagick: packed 10, 12 and 14-bit TIFF', CONVERT)
def packed(folder):
    for bits in (10, 12, 14):
        top = 2 ** bits - 1
        path = magick(folder, picture((61, 73)), 'b.tif', '-depth', str(bits), '-compress', 'None')
        with tifffile.TiffFile(path) as file:
            assert file.pages[0].bitspersample == bits, f'the file has {file.pages[0].bitspersample} bits'
        plane = Plane(path)
        same(plane, np.round(magick_reads(path, (61, 73)) * (top / 65535)).astype(np.uint16))
        assert plane.info['full_scale'] == top and len(np.unique(plane.pixels)) > 500, plane.info


@test('ImageMagick: TIFF with Zip, big-endian, turned', CONVERT)
def magick_tiff(folder):
    truth = picture()
    same(Plane(magick(folder, truth, 'b.tif', '-compress', 'Zip', '-endian', 'MSB')), truth)
    refused(Plane(magick(folder, truth, 'c.tif', '-orient', 'RightTop')), 'orientation 6')


# ---- our own files, read by others ----

@test('Aimwell writes, tifffile and tiffinfo read', 'tiffinfo')
def written(folder):
    a, b = os.path.join(folder, 'a.tif'), os.path.join(folder, 'b.tif')
    for dtype in (np.uint8, np.uint16, np.float32):
        truth = picture((700, 411), dtype)
        tifffile.imwrite(a, truth)
        run(WRITE, a, b, '0.3225')
        with tifffile.TiffFile(b) as file:
            page = file.pages[0]
            assert page.compression == 8 and page.predictor == (1 if dtype == np.float32 else 2)
            bad = np.count_nonzero(page.asarray() != truth)
            assert bad == 0, f'{bad} pixels of {np.dtype(dtype).name} differ'
            x, y = page.tags['XResolution'].value, page.tags['YResolution'].value
            assert x == y and abs(1e4 * x[1] / x[0] - 0.3225) < 1e-7, (x, y)
            assert page.tags['ResolutionUnit'].value == 3
        run('tiffinfo', '-D', b)


@test('Aimwell writes labels of 16 and 32 bits, tifffile reads')
def labels(folder):
    path = os.path.join(folder, 'labels.tif')
    for top, bits in ((65535, 16), (70000, 32)):
        run(WRITE, '--labels', str(top), path)
        read = tifffile.imread(path)
        assert read.dtype.itemsize * 8 == bits, read.dtype
        expected = (np.arange(301 * 257, dtype=np.uint64) * 7 % (top + 1)).reshape(257, 301)
        assert np.array_equal(read, expected)


def version(*command):
    return (subprocess.run(command, capture_output=True, text=True).stdout.splitlines() or ['?'])[0]


def main():
    print('# tifffile', tifffile.__version__, '; numpy', np.__version__)
    print('#', version('dpkg-query', '-W', 'libtiff-tools'), '; tiffcp of', version('dpkg-query', '-W', 'libtiff6'))
    print('#', version(CONVERT, '-version'))
    for number, (name, function, needs) in enumerate(tests, 1):
        if needs and not shutil.which(needs):
            print(f'ok {number} - {name} # SKIP {needs} is not installed')
            continue
        with tempfile.TemporaryDirectory(prefix='aimwell-images-') as folder:
            try:
                function(folder)
                print(f'ok {number} - {name}')
            except AssertionError as error:
                print(f'not ok {number} - {name}: {error}')
        sys.stdout.flush()
    print(f'1..{len(tests)}')


main()
