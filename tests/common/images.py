# SPDX-License-Identifier: GPL-3.0-or-later
"""Grey-scale images written by hand from their specifications, without any imaging library."""
import struct
import zlib


def chunk(kind, data):
    return struct.pack(">I", len(data)) + kind + data + struct.pack(">I", zlib.crc32(kind + data))


def png(rows, bits=8, colour=0, width=None, height=None):
    """PNG (ISO/IEC 15948) of rows of integers, the top row first; colour 0 grey, 2 RGB, 4 grey + alpha.
    Rows of colour images are lists of tuples. width and height override what the header says."""
    code = ">B" if bits == 8 else ">H"
    flat = lambda value: value if isinstance(value, (tuple, list)) else (value,)
    body = b"".join(b"\0" + b"".join(struct.pack(code, s) for value in row for s in flat(value))
                    for row in rows)
    header = struct.pack(">IIBBBBB", width or len(rows[0]), height or len(rows), bits, colour, 0, 0, 0)
    return (b"\x89PNG\r\n\x1a\n" + chunk(b"IHDR", header) + chunk(b"IDAT", zlib.compress(body)) +
            chunk(b"IEND", b""))


def tiff(rows, bits=8, order="<", deflate=False, white_is_zero=False, samples=1):
    """TIFF 6.0 of rows of integers in one strip, the top row first."""
    code = order + ("B" if bits == 8 else "H")
    body = b"".join(struct.pack(code, value) for row in rows for value in row)
    if deflate:
        body = zlib.compress(body)
    entries = [(256, 4, len(rows[0])), (257, 4, len(rows)), (258, 3, bits), (259, 3, 8 if deflate else 1),
               (262, 3, 0 if white_is_zero else 1), (273, 4, 8), (277, 3, samples),
               (278, 4, len(rows)), (279, 4, len(body))]
    body += b"\0" * (len(body) % 2)
    directory = struct.pack(order + "H", len(entries))
    for tag, kind, value in entries:
        field = struct.pack(order + "I", value) if kind == 4 else struct.pack(order + "HH", value, 0)
        directory += struct.pack(order + "HHI", tag, kind, 1) + field
    directory += struct.pack(order + "I", 0)
    mark = b"II*\0" if order == "<" else b"MM\0*"
    return mark + struct.pack(order + "I", 8 + len(body)) + body + directory
