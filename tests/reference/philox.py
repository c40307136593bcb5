# SPDX-License-Identifier: GPL-3.0-or-later
"""Philox4x32-10 in plain Python: J. Salmon, M. Moraes, R. Dror, D. Shaw, SC'11,
doi:10.1145/2063384.2063405. Written from the paper's description, apart from the C headers."""

MASK = 0xFFFFFFFF


def philox(counter, key, rounds=10):
    """Four 32-bit words of one block."""
    c0, c1, c2, c3 = counter
    k0, k1 = key
    for _ in range(rounds):
        p0, p1 = 0xD2511F53 * c0, 0xCD9E8D57 * c2
        c0, c1, c2, c3 = (p1 >> 32) ^ c1 ^ k0, p1 & MASK, (p0 >> 32) ^ c3 ^ k1, p0 & MASK
        k0, k1 = (k0 + 0x9E3779B9) & MASK, (k1 + 0xBB67AE85) & MASK
    return c0, c1, c2, c3
